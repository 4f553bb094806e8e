"""The least level a mode needs, with the lines that it adds up from."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Literal

from profiler.errors import InputError, under
from profiler.models import RadioMode
from profiler.receiver.modulation import Modulation, parse_modulation, required_eb_n0_db
from profiler.receiver.noise import NOISE_REFERENCE_K, noise_density_dbm_hz
from profiler.remarks import Remark
from profiler.units import AGREEMENT_DB

__all__ = ["Line", "Threshold", "mode_threshold"]


@dataclass(frozen=True, slots=True)
class Line:
    """One line of a table that adds up: gains positive, losses negative; ``note`` says where the number comes from."""

    name: str
    value: float
    unit: Literal["dBm", "dBi", "dB", "dBm/Hz", "dBHz"]
    note: Remark = ""


@dataclass(frozen=True, slots=True)
class Threshold:
    """A mode's threshold. ``level_dbm`` is the sum of ``lines``, or None (and no lines) where the mode has no data."""

    level_dbm: float | None
    lines: tuple[Line, ...]
    assumptions: tuple[Remark, ...]


def mode_threshold(mode: RadioMode) -> Threshold:
    """Threshold of one mode: as given, or N0 + 10·log10(bit rate) + Eb/N0 − coding gain + implementation loss.

    N0 is k_B·T of the system temperature, or k_B·290 K times the noise figure. Without a bit rate, the bandwidth times
    the bits per symbol stands for it (one symbol per second and hertz), so that Eb/N0 plus 10·log10(bits) is C/N.

    Parameters
    ----------
    mode
        The mode. A given threshold is used as it stands; if the rest of the mode also gives one, they must agree.

    Returns
    -------
    Threshold
        The level in dBm with its lines, which add up to it, and what was assumed. The level is None if the mode gives
        no threshold and asks for none: no noise, error ratio, coding gain or implementation loss.

    Raises
    ------
    InputError
        If something is missing for a threshold from noise; if threshold and noise, or noise figure and temperature,
        disagree by more than 0.05 dB; if the bit rate is more than the bandwidth can carry; for an unknown modulation.

    Examples
    --------
    >>> mode = RadioMode("64-QAM", noise_figure_db=5, bandwidth_hz=28e6, modulation="64-QAM", bit_error_ratio=1e-6)
    >>> for line in mode_threshold(mode).lines:
    ...     print(f"{line.name:28}{line.value:9.2f} {line.unit}")
    noise density                 -173.98 dBm/Hz
    noise figure                     5.00 dB
    bit rate                        82.25 dBHz
    required Eb/N0                  18.78 dB
    >>> round(mode_threshold(mode).level_dbm, 2)
    -67.94
    >>> mode_threshold(RadioMode("64-QAM", modulation="64-QAM")).level_dbm is None
    True

    Notes
    -----
    Sources: Proakis, Digital Communications, 5th ed., ch. 4 (Eb/N0 to C/N0; from memory); see `required_eb_n0_db` and
    `noise_density_dbm_hz`.
    """
    missing = _missing(mode)
    if mode.threshold_dbm is None:
        if not _asks_for_noise_route(mode):
            return Threshold(None, (), ())
        if missing:
            raise InputError(
                f"mode {mode.name}: {', '.join(missing)} not given: the threshold from noise needs noise figure or "
                "temperature, bit rate or bandwidth, modulation and bit error ratio; give them, or the threshold"
            )
        return _noise_threshold(mode)
    if not missing:
        _require_agreement(mode, _noise_threshold(mode))
    given = Line("threshold", float(mode.threshold_dbm), "dBm", "as given")
    return Threshold(given.value, (given,), ())


def _asks_for_noise_route(mode: RadioMode) -> bool:
    """Whether the mode states anything that only a threshold from noise would use."""
    stated = (mode.noise_figure_db, mode.noise_temperature_k, mode.bit_error_ratio)
    return any(value is not None for value in stated) or mode.coding_gain_db > 0 or mode.implementation_loss_db > 0


def _missing(mode: RadioMode) -> list[str]:
    have = {
        "noise figure or temperature": mode.noise_figure_db is not None or mode.noise_temperature_k is not None,
        "bit rate or bandwidth": mode.bit_rate_bps is not None or mode.bandwidth_hz is not None,
        "modulation": mode.modulation is not None,
        "bit error ratio": mode.bit_error_ratio is not None,
    }
    return [name for name, given in have.items() if not given]


def _noise_threshold(mode: RadioMode) -> Threshold:
    """Threshold of a mode that lacks nothing for it."""
    assert mode.modulation is not None
    assert mode.bit_error_ratio is not None
    with under(f"mode {mode.name}"):
        modulation = parse_modulation(mode.modulation)
        eb_n0_db = float(required_eb_n0_db(modulation, mode.bit_error_ratio))
    rate_bps, rate_note, rate_assumptions = _bit_rate(mode, modulation)
    wanted = f"{modulation.name} at bit error ratio {mode.bit_error_ratio:g}; {modulation.method}"
    lines = [
        *_noise_lines(mode),
        Line("bit rate", 10.0 * math.log10(rate_bps), "dBHz", rate_note),
        Line("required Eb/N0", eb_n0_db, "dB", wanted),
    ]
    if mode.coding_gain_db:
        lines.append(Line("coding gain", -float(mode.coding_gain_db), "dB", "as given, in Eb/N0"))
    if mode.implementation_loss_db:
        lines.append(Line("implementation loss", float(mode.implementation_loss_db), "dB", "as given"))
    assumptions = ("coherent detection in white Gaussian noise, without fading or interference", *rate_assumptions)
    return Threshold(math.fsum(line.value for line in lines), tuple(lines), assumptions)


def _noise_lines(mode: RadioMode) -> list[Line]:
    figure_db, temperature_k = mode.noise_figure_db, mode.noise_temperature_k
    from_figure_dbm = None if figure_db is None else float(noise_density_dbm_hz()) + figure_db
    if temperature_k is not None:
        from_temperature_dbm = float(noise_density_dbm_hz(temperature_k))
        if from_figure_dbm is not None and abs(from_figure_dbm - from_temperature_dbm) > AGREEMENT_DB:
            system_k = NOISE_REFERENCE_K * 10 ** ((figure_db or 0.0) / 10)
            raise InputError(
                f"mode {mode.name}: noise figure {figure_db:g} dB and noise temperature {temperature_k:g} K disagree: "
                f"the temperature is that of antenna and receiver together, {system_k:.0f} K for this figure; give one"
            )
        note = f"k_B·T of the receiving system at {temperature_k:g} K"
        return [Line("noise density", from_temperature_dbm, "dBm/Hz", note)]
    return [
        Line("noise density", float(noise_density_dbm_hz()), "dBm/Hz", "k_B·T at 290 K (SI Brochure, 9th ed.)"),
        Line("noise figure", float(figure_db or 0.0), "dB", "as given, behind an antenna at 290 K"),
    ]


def _bit_rate(mode: RadioMode, modulation: Modulation) -> tuple[float, str, tuple[str, ...]]:
    """Bit rate in bit/s, where it comes from, and what that assumes."""
    bits, bandwidth_hz = modulation.bits_per_symbol, mode.bandwidth_hz
    if mode.bit_rate_bps is None:
        assert bandwidth_hz is not None
        note = f"{bandwidth_hz / 1e6:g} MHz × {bits} bit per symbol"
        return bandwidth_hz * bits, note, ("one symbol per second and hertz of bandwidth (no roll-off, no code bits)",)
    if bandwidth_hz is not None and mode.bit_rate_bps > bandwidth_hz * bits * (1 + 1e-9):
        raise InputError(
            f"mode {mode.name}: bit rate {mode.bit_rate_bps / 1e6:g} Mbit/s: must be at most "
            f"{bandwidth_hz * bits / 1e6:g} Mbit/s, what {modulation.name} carries in {bandwidth_hz / 1e6:g} MHz "
            "(Nyquist); give the rate on the air of one carrier"
        )
    return mode.bit_rate_bps, f"{mode.bit_rate_bps / 1e6:g} Mbit/s as given", ()


def _require_agreement(mode: RadioMode, computed: Threshold) -> None:
    assert computed.level_dbm is not None
    assert mode.threshold_dbm is not None
    if abs(computed.level_dbm - mode.threshold_dbm) > AGREEMENT_DB:
        raise InputError(
            f"mode {mode.name}: threshold {mode.threshold_dbm:g} dBm as given and {computed.level_dbm:.2f} dBm from "
            f"noise, rate, modulation and error ratio: must agree within {AGREEMENT_DB:g} dB; leave one of them out"
        )
