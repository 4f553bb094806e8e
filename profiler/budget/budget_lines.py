"""The link budget of one hop, both directions, one row per radio mode."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Literal, get_args

import numpy as np
from numpy.typing import ArrayLike

from profiler.budget.antenna import antenna_gain, near_field_warnings
from profiler.checks import finite, positive
from profiler.models import Radio, RadioMode, Terminal
from profiler.receiver import Line, Threshold, mode_threshold
from profiler.remarks import Remark
from profiler.units import Float, wavelength

__all__ = [
    "AIMED",
    "Budget",
    "Direction",
    "ModeBudget",
    "Way",
    "diameters",
    "ends_of",
    "free_space_loss",
    "link_budget",
    "path_lines",
    "table",
    "total",
    "way_name",
]

Way = Literal["a_to_b", "b_to_a"]
"""A direction of the hop, by the end that sends and the end that receives."""

FREE_SPACE = "free space"
FREE_SPACE_NOTE = "20·log10(4π·d/λ), Rec. ITU-R P.525-4 §2.3"
AIMED = "antennas aimed at each other and matched in polarization: full gain at both ends"


@dataclass(frozen=True, slots=True)
class ModeBudget:
    """One mode's row: ``lines`` add up to ``received_dbm``, ``threshold_lines`` to ``threshold_dbm``.

    ``eirp_dbm`` is the equivalent isotropically radiated power. Threshold and fade margin are None where the mode gives
    no data for a threshold.
    """

    name: str
    lines: tuple[Line, ...]
    eirp_dbm: float
    received_dbm: float
    threshold_lines: tuple[Line, ...]
    threshold_dbm: float | None
    fade_margin_db: float | None


@dataclass(frozen=True, slots=True)
class Direction:
    """One direction of the hop. The levels and the margin are those of the first mode; ``modes`` has them all.

    ``overload_dbm`` is the greatest level that the receiver takes, None where that is not known.
    """

    transmitter: str
    receiver: str
    frequency_hz: float
    eirp_dbm: float
    overload_dbm: float | None
    free_space_db: float
    gas_db: float
    diffraction_db: float
    received_dbm: float
    threshold_dbm: float | None
    fade_margin_db: float | None
    modes: tuple[ModeBudget, ...]


@dataclass(frozen=True, slots=True)
class Budget:
    """Both directions, what was assumed, and where a method's stated range is left."""

    a_to_b: Direction
    b_to_a: Direction
    assumptions: tuple[Remark, ...]
    warnings: tuple[Remark, ...]

    def weaker(self, mode: int = 0) -> tuple[Way, ModeBudget]:
        """Give the direction in which a mode has less level, and so less fade margin, and the mode's row there."""
        rows: tuple[tuple[Way, ModeBudget], ...] = (
            ("a_to_b", self.a_to_b.modes[mode]),
            ("b_to_a", self.b_to_a.modes[mode]),
        )
        return min(rows, key=lambda each: each[1].received_dbm)


def way_name(way: Way) -> str:
    """Write a direction as people read it.

    Examples
    --------
    >>> way_name("b_to_a")
    'B to A'
    """
    return " to ".join(ends_of(way))


def ends_of(way: Way) -> tuple[str, str]:
    """Name the end that sends and the end that receives."""
    return ("A", "B") if way == "a_to_b" else ("B", "A")


def free_space_loss(distance_m: ArrayLike, frequency_hz: ArrayLike) -> Float:
    """Free-space basic transmission loss, 20·log10(4π·d/λ).

    Parameters
    ----------
    distance_m
        Distance, m, above 0, any shape; long against the wavelength and beyond the antennas' near field.
    frequency_hz
        Frequency, Hz, above 0, broadcast against the distance.

    Returns
    -------
    ndarray
        Loss in dB between isotropic antennas.

    Raises
    ------
    InputError
        For a distance or frequency not above 0.

    Examples
    --------
    >>> round(float(free_space_loss(1000.0, 1e9)), 2)
    92.45
    >>> free_space_loss([10e3, 20e3], 6e9).round(1).tolist()
    [128.0, 134.0]

    Notes
    -----
    Source: Rec. ITU-R P.525-4 §2.3 (from memory of the section); Friis, Proceedings of the IRE 34(5), 1946.
    """
    distance, frequency = positive("distance_m", distance_m, "m"), positive("frequency_hz", frequency_hz, "Hz")
    return np.asarray(20.0 * np.log10(4.0 * np.pi * distance / wavelength(frequency)))


def link_budget(
    radio: Radio,
    distance_m: float,
    frequency_hz: float,
    *,
    gas_db: float,
    diffraction_db: float,
    gas_note: Remark = "",
    diffraction_note: Remark = "",
    back: tuple[float, float, float] | None = None,
) -> Budget:
    """Link budget in both directions for every mode of the radio.

    Received level = power − line losses + antenna gains − free space − gases − diffraction − other losses; fade margin
    = received level − threshold.

    Parameters
    ----------
    radio
        Both terminals, the modes (a radio without any gets one nameless row) and the named other losses.
    distance_m
        Length of the path, m, above 0.
    frequency_hz
        Frequency from A to B, and of both directions unless ``back`` is given, Hz, above 0.
    gas_db, diffraction_db
        Losses of the whole path in dB, diffraction at the median k.
    gas_note, diffraction_note
        Method and edition of each, for the notes of their lines.
    back
        Frequency from B to A where it is another, Hz, with the losses by gases and diffraction at it, dB.

    Returns
    -------
    Budget
        The tables, with assumptions and warnings.

    Raises
    ------
    InputError
        For a terminal without a gain, contradicting statements, or a mode that lacks part of its threshold.

    Examples
    --------
    >>> from profiler.models import Terminal
    >>> end = Terminal(power_dbm=28.0, line_loss_db=1.5, gain_dbi=38.7)
    >>> radio = Radio(end, end, (RadioMode("QPSK", threshold_dbm=-85.0),), (("radome", 1.0),))
    >>> budget = link_budget(radio, 40e3, 6.175e9, gas_db=0.4, diffraction_db=0.0)
    >>> for line in budget.a_to_b.modes[0].lines:
    ...     print(f"{line.name:18}{line.value:8.2f} {line.unit}")
    transmit power A     28.00 dBm
    line loss A          -1.50 dB
    antenna gain A       38.70 dBi
    free space         -140.30 dB
    gases                -0.40 dB
    diffraction           0.00 dB
    radome               -1.00 dB
    antenna gain B       38.70 dBi
    line loss B          -1.50 dB
    >>> round(budget.a_to_b.received_dbm, 2), round(budget.a_to_b.fade_margin_db, 2)
    (-39.3, 45.7)

    Notes
    -----
    Sources: Rec. ITU-R P.525-4 (free space), P.341-7 (what the losses are between); see `mode_threshold`, `dish_gain`.
    """
    each_way: dict[Way, tuple[float, float, float]] = {"a_to_b": (frequency_hz, gas_db, diffraction_db)}
    each_way["b_to_a"] = back or each_way["a_to_b"]
    modes = radio.modes or (RadioMode(name=""),)
    thresholds = [mode_threshold(mode) for mode in modes]
    a_to_b, b_to_a = (
        _direction(
            radio,
            way,
            each_way[way][0],
            path_lines(distance_m, *each_way[way], gas_note, diffraction_note),
            list(zip(modes, thresholds, strict=True)),
        )
        for way in get_args(Way)
    )
    highest_hz = max(found[0] for found in each_way.values())
    warnings: tuple[Remark, ...] = near_field_warnings(diameters(radio), distance_m, highest_hz)
    warnings += (*_overloads("a_to_b", a_to_b), *_overloads("b_to_a", b_to_a))
    return Budget(a_to_b, b_to_a, _assumptions(modes, thresholds, both_alike=back is None), warnings)


def _overloads(way: Way, direction: Direction) -> tuple[str, ...]:
    """Warn of a receiver that gets more than it takes, in any mode."""
    level_dbm = max(mode.received_dbm for mode in direction.modes)
    if direction.overload_dbm is None or level_dbm <= direction.overload_dbm:
        return ()
    more = f"{level_dbm:.1f} dBm is more than the {direction.overload_dbm:g} dBm that the receiver takes"
    return (f"{way_name(way)}: the received level of {more}; less power or an attenuator is needed",)


def table(radio: Radio, way: Way, mode: RadioMode, frequency_hz: float, path: tuple[Line, ...]) -> tuple[Line, ...]:
    """Lines of one direction from power to received level, the ``path``'s and the other losses between the antennas."""
    sender, receiver = ends_of(way)
    ends = radio.terminals
    power_dbm = ends[sender].power_dbm if mode.power_dbm is None else mode.power_dbm
    power_note = "as given" if mode.power_dbm is None else f"as given for mode {mode.name}"
    return (
        Line(f"transmit power {sender}", float(power_dbm), "dBm", power_note),
        *_line_losses(ends[sender], sender),
        antenna_gain(ends[sender], frequency_hz, sender),
        *path,
        *(loss_line(name, loss_db, "as given") for name, loss_db in radio.other_losses_db),
        antenna_gain(ends[receiver], frequency_hz, receiver),
        *_line_losses(ends[receiver], receiver),
    )


def _line_losses(terminal: Terminal, end: str) -> tuple[Line, ...]:
    """Enter what is lost between radio and antenna: as given, and in the length of the line where that is given."""
    found = (loss_line(f"line loss {end}", terminal.line_loss_db, "as given"),)
    if terminal.line_length_m is None or terminal.line_loss_db_per_m is None:
        return found
    lost_db = terminal.line_length_m * terminal.line_loss_db_per_m
    kind = f"{terminal.line}, " if terminal.line else ""
    note = f"{kind}{terminal.line_length_m:g} m at {100.0 * terminal.line_loss_db_per_m:g} dB per 100 m"
    return (*found, loss_line(f"line by length {end}", lost_db, note))


def path_lines(
    distance_m: float,
    frequency_hz: float,
    gas_db: float,
    diffraction_db: float,
    gas_note: Remark = "",
    diffraction_note: Remark = "",
) -> tuple[Line, Line, Line]:
    """Lines of the path itself: free space, gases, diffraction."""
    return (
        loss_line(FREE_SPACE, float(free_space_loss(distance_m, frequency_hz)), FREE_SPACE_NOTE),
        loss_line("gases", gas_db, gas_note),
        loss_line("diffraction", diffraction_db, diffraction_note),
    )


def loss_line(name: str, loss_db: float, note: Remark) -> Line:
    """Enter a loss as a negative line (0, not −0, for none)."""
    return Line(name, 0.0 - float(finite(f"{name} loss", loss_db, "dB")), "dB", note)


def total(lines: tuple[Line, ...]) -> float:
    """Sum of a table's lines, correctly rounded, so that the order of the lines does not matter."""
    return math.fsum(line.value for line in lines)


def diameters(radio: Radio) -> dict[str, float | None]:
    """Dish diameter of each end, where it is given."""
    return {end: terminal.diameter_m for end, terminal in radio.terminals.items()}


def _direction(
    radio: Radio,
    way: Way,
    frequency_hz: float,
    path: tuple[Line, Line, Line],
    modes: list[tuple[RadioMode, Threshold]],
) -> Direction:
    rows = tuple(_row(mode, threshold, table(radio, way, mode, frequency_hz, path)) for mode, threshold in modes)
    first, (sender, receiver) = rows[0], ends_of(way)
    free_space_db, gas_db, diffraction_db = (0.0 - line.value for line in path)
    return Direction(
        transmitter=sender,
        receiver=receiver,
        frequency_hz=frequency_hz,
        eirp_dbm=first.eirp_dbm,
        overload_dbm=radio.terminals[receiver].overload_dbm,
        free_space_db=free_space_db,
        gas_db=gas_db,
        diffraction_db=diffraction_db,
        received_dbm=first.received_dbm,
        threshold_dbm=first.threshold_dbm,
        fade_margin_db=first.fade_margin_db,
        modes=rows,
    )


def _row(mode: RadioMode, threshold: Threshold, lines: tuple[Line, ...]) -> ModeBudget:
    received_dbm = total(lines)
    margin_db = None if threshold.level_dbm is None else received_dbm - threshold.level_dbm
    sent = lines[: next(index for index, line in enumerate(lines) if line.name == FREE_SPACE)]
    return ModeBudget(mode.name, lines, total(sent), received_dbm, threshold.lines, threshold.level_dbm, margin_db)


def _assumptions(modes: tuple[RadioMode, ...], thresholds: list[Threshold], *, both_alike: bool) -> tuple[Remark, ...]:
    """Collect what the budget assumed, each thing once."""
    alike = "the same frequency and path losses in both directions"
    lines: list[Remark] = [
        AIMED,
        alike if both_alike else "each direction at its own frequency, with the path losses at it",
    ]
    if len(modes) > 1:
        lines.append(f"level, threshold and fade margin of a direction are those of its first mode, {modes[0].name}")
    for threshold in thresholds:
        lines += threshold.assumptions
    return tuple(dict.fromkeys(lines))
