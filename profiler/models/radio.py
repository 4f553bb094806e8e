"""The radio: terminals, modes, losses."""

from dataclasses import dataclass
from typing import Annotated, ClassVar

from profiler.models.availability import Objective
from profiler.models.stated import Forms, Key, Stated, require

__all__ = ["Radio", "RadioMode", "Signature", "Terminal"]


@dataclass(frozen=True, slots=True)
class Terminal(Stated):
    """The radio and antenna of one end: the gain is given, or follows from dish diameter and efficiency.

    ``model`` names the antenna, for the note of its gain.
    """

    FORMS: ClassVar = (
        Forms((("gain_dbi",), ("diameter_m", "efficiency")), only=False),
        Forms((("line_length_m", "line_loss_db_per_m"),), needed=False),
    )

    power_dbm: Annotated[
        float, Key("of the transmitter", example=27, also=("power", "tx_power", "transmit_power", "output_power"))
    ]
    line_loss_db: Annotated[
        float,
        Key(
            "between radio and antenna, beside that of a line by its length",
            least=0,
            example=1.2,
            also=("feeder_loss", "cable_loss", "waveguide_loss", "connector_loss"),
        ),
    ] = 0.0
    line: Annotated[str, Key("type of the line, in words", left_out="not said", example="invented waveguide")] = ""
    line_length_m: Annotated[
        float | None, Key("of the line", least=0, below=5000, left_out="no line by its length", example=40)
    ] = None
    line_loss_db_per_m: Annotated[
        float | None,
        Key("of the line, per length", least=0, most=100, usual="100m", left_out="no line by its length", example=4.5),
    ] = None
    gain_dbi: Annotated[
        float | None,
        Key("of the antenna", left_out="from its diameter and efficiency", example=36.8, also=("gain", "antenna_gain")),
    ] = None
    diameter_m: Annotated[
        float | None,
        Key("of the dish", above=0, left_out="not known", example=1.2, also=("dish", "dish_size", "antenna_diameter")),
    ] = None
    efficiency: Annotated[
        float | None,
        Key("of the dish", above=0, most=1, left_out="not known", example=0.6),
    ] = None
    model: Annotated[str, Key("of the antenna", left_out="not named", example="invented 1.2 m dish")] = ""
    equipment: Annotated[str, Key("the radio, in words", left_out="not said", example="invented radio")] = ""
    overload_dbm: Annotated[
        float | None,
        Key(
            "greatest level that the receiver takes",
            left_out="not known",
            example=-20,
            also=("max_input", "saturation"),
        ),
    ] = None


@dataclass(frozen=True, slots=True)
class Signature(Stated):
    """A radio's selective-fading signature (Rec. ITU-R F.1093): width, depths and the reference delay."""

    width_hz: Annotated[float, Key("of the signature", above=0, usual="mhz", example=24)]
    depth_minimum_phase_db: Annotated[float, Key("for minimum-phase fading", example=20)]
    depth_nonminimum_phase_db: Annotated[float, Key("for non-minimum-phase fading", example=21)]
    delay_s: Annotated[float, Key("of the reflected ray", above=0, usual="ns", example=6.3)] = 6.3e-9


@dataclass(frozen=True, slots=True)
class RadioMode(Stated):
    """One modulation state of the radio. The threshold is given, or follows from noise, rate, modulation and ratio.

    ``noise_temperature_k`` is that of the whole receiving system (antenna and receiver), so N0 = k_B·T; a noise figure
    F means 290 K·F. ``bit_rate_bps`` is the rate of information bits and ``coding_gain_db`` is in Eb/N0 of those bits.
    ``power_dbm`` replaces the power of both terminals in this mode. ``objective`` is what this mode must meet, in place
    of the hop's.
    """

    name: Annotated[str, Key("what the mode is called", example="128-QAM")]
    threshold_dbm: Annotated[
        float | None,
        Key("of the receiver", left_out="from what stands below", example=-70.0, also=("sensitivity", "rx_threshold")),
    ] = None
    noise_figure_db: Annotated[float | None, Key("of the receiver", least=0, left_out="not known", example=5.0)] = None
    noise_temperature_k: Annotated[
        float | None, Key("of the whole receiving system", above=0, left_out="from the noise figure", example=917)
    ] = None
    bandwidth_hz: Annotated[
        float | None, Key("of the receiver", above=0, usual="mhz", left_out="not known", example=28)
    ] = None
    bit_rate_bps: Annotated[
        float | None, Key("of information bits", above=0, usual="mbps", left_out="not known", example=155)
    ] = None
    modulation: Annotated[str | None, Key("by name", left_out="not known", example="128-QAM")] = None
    bit_error_ratio: Annotated[
        float | None, Key("at the threshold", above=0, below=0.5, left_out="not known", example=1e-6)
    ] = None
    coding_gain_db: Annotated[float, Key("in Eb/N0 of information bits", least=0, example=3.0)] = 0.0
    implementation_loss_db: Annotated[float, Key("of the receiver", least=0, example=1.5)] = 0.0
    power_dbm: Annotated[float | None, Key("in this mode, both ends", left_out="that of the terminals", example=24)] = (
        None
    )
    signature: Annotated[
        Signature | None, Key("of selective fading, Rec. ITU-R F.1093", left_out="no selective fading is counted")
    ] = None
    objective: Annotated[Objective | None, Key("of this mode", left_out="that of the hop")] = None


@dataclass(frozen=True, slots=True)
class Radio(Stated):
    """Both terminals, the modes (most robust first or in any order) and named extra losses of the path."""

    terminal_a: Annotated[Terminal, Key("the terminal at site A", name="a")]
    terminal_b: Annotated[Terminal, Key("the terminal at site B", name="b")]
    modes: Annotated[
        tuple[RadioMode, ...],
        Key(
            "the first mode is the one that the hop is judged by; the others are listed beside it",
            name="mode",
            left_out="no threshold, so no margin",
        ),
    ] = ()
    other_losses_db: Annotated[
        tuple[tuple[str, float], ...],
        Key(
            "more losses of the path, by names of your own, dB",
            least=0,
            name="losses",
            left_out="none",
            example={"connectors and aging": 0.5},
        ),
    ] = ()
    emission: Annotated[
        str, Key("emission designator", left_out="not said", example="28M0D7W", also=("emission_designator",))
    ] = ""
    channel: Annotated[str, Key("of the plan", left_out="not said", example="none")] = ""

    @property
    def terminals(self) -> dict[str, Terminal]:
        """Both terminals by the letter of their end."""
        return {"A": self.terminal_a, "B": self.terminal_b}

    def _agree(self) -> None:
        names = [mode.name for mode in self.modes]
        for index, name in enumerate(names):
            other = f"another name than that of mode[{names.index(name)}]"
            require(name not in names[:index], f"mode[{index}].name", name, other)
