"""The budget turned round: how far, with how little power, with how small a dish."""

from __future__ import annotations

import math
from collections.abc import Iterable
from dataclasses import dataclass, replace
from typing import Literal

from profiler.budget.antenna import dish_diameter, near_field_warnings
from profiler.budget.budget_lines import AIMED, Way, diameters, ends_of, free_space_loss, path_lines, table, total
from profiler.checks import finite
from profiler.errors import InputError
from profiler.models import Radio, RadioMode, Terminal
from profiler.receiver import Line, Threshold, mode_threshold
from profiler.remarks import Remark
from profiler.units import wavelength

__all__ = ["InverseAnswer", "least_gain", "least_power", "longest_free_space_range", "smallest_dish"]

Resized = Literal["both", "transmitter", "receiver"]


@dataclass(frozen=True, slots=True)
class InverseAnswer:
    """InverseAnswer to an inverse question: ``value`` in ``unit``.

    ``lines`` add up to what was solved for, named by ``solved_for``, in dB, dBm or dBi; one that stands on the other
    side of the budget has its sign turned and is named "less …". ``threshold_lines`` add up to the threshold.
    """

    value: float
    unit: Literal["m", "dBm", "dBi"]
    solved_for: str
    lines: tuple[Line, ...]
    threshold_lines: tuple[Line, ...]
    assumptions: tuple[Remark, ...]
    warnings: tuple[Remark, ...]


def longest_free_space_range(
    radio: Radio,
    frequency_hz: float,
    *,
    direction: Way = "a_to_b",
    mode: str | None = None,
    bit_error_ratio: float | None = None,
    fade_margin_db: float = 0.0,
) -> InverseAnswer:
    """Longest distance over which a mode still works in free space: no gases, no obstacles.

    Bit error ratio → Eb/N0 → C/N0 → received level → free-space loss → distance, d = λ/(4π)·10^(loss/20).

    Parameters
    ----------
    radio
        Terminals, modes and other losses.
    frequency_hz
        Frequency, Hz, above 0.
    direction
        Which end sends.
    mode
        Name of the mode; None for the first.
    bit_error_ratio
        Wanted ratio, in place of the mode's own ratio and threshold; None keeps them.
    fade_margin_db
        Margin to keep above the threshold, dB.

    Returns
    -------
    InverseAnswer
        In m; its lines add up to the free-space loss that may be spent.

    Raises
    ------
    InputError
        For an unknown mode, a mode without a threshold, or anything that `link_budget` refuses.

    Examples
    --------
    >>> end = Terminal(power_dbm=20.0, gain_dbi=30.0)
    >>> mode = RadioMode("QPSK", noise_figure_db=6.0, bit_rate_bps=10e6, modulation="QPSK")
    >>> answer = longest_free_space_range(Radio(end, end, (mode,)), 10e9, bit_error_ratio=1e-6, fade_margin_db=30)
    >>> round(answer.value / 1e3)
    18

    Notes
    -----
    Source: Rec. ITU-R P.525-4 §2.3, and those of `mode_threshold`.
    """
    chosen, threshold, wanted = _wanted(radio, mode, bit_error_ratio, fade_margin_db)
    lines = (*table(radio, direction, chosen, frequency_hz, ()), *_negated(wanted))
    per_metre_db = float(free_space_loss(1.0, frequency_hz))
    distance_m = float(10.0 ** ((total(lines) - per_metre_db) / 20.0))
    return InverseAnswer(
        distance_m,
        "m",
        "free-space loss that may be spent",
        lines,
        threshold.lines,
        (AIMED, "free space: no gases, no obstacles", *threshold.assumptions),
        near_field_warnings(diameters(radio), distance_m, frequency_hz),
    )


def least_power(
    radio: Radio,
    distance_m: float,
    frequency_hz: float,
    *,
    gas_db: float,
    diffraction_db: float,
    direction: Way = "a_to_b",
    mode: str | None = None,
    bit_error_ratio: float | None = None,
    fade_margin_db: float = 0.0,
) -> InverseAnswer:
    """Least transmit power that leaves a mode the wanted fade margin.

    Parameters
    ----------
    radio
        Terminals, modes and other losses; its powers are not used.
    distance_m, frequency_hz, gas_db, diffraction_db
        The path, as `link_budget`.
    direction, mode, bit_error_ratio, fade_margin_db
        The question, as `longest_free_space_range`.

    Returns
    -------
    InverseAnswer
        In dBm; its lines add up to it.

    Raises
    ------
    InputError
        As `longest_free_space_range`.

    Examples
    --------
    >>> end = Terminal(power_dbm=28.0, line_loss_db=1.5, gain_dbi=38.7)
    >>> radio = Radio(end, end, (RadioMode("QPSK", threshold_dbm=-85.0),))
    >>> round(least_power(radio, 40e3, 6.175e9, gas_db=0.4, diffraction_db=0.0, fade_margin_db=40.0).value, 2)
    21.3

    Notes
    -----
    Source: as `link_budget`.
    """
    chosen, threshold, wanted = _wanted(radio, mode, bit_error_ratio, fade_margin_db)
    path = path_lines(distance_m, frequency_hz, gas_db, diffraction_db)
    known = [line for line in table(radio, direction, chosen, frequency_hz, path) if line.unit != "dBm"]
    lines = (*wanted, *_negated(known))
    return InverseAnswer(
        total(lines),
        "dBm",
        f"transmit power {ends_of(direction)[0]}",
        lines,
        threshold.lines,
        (AIMED, *threshold.assumptions),
        near_field_warnings(diameters(radio), distance_m, frequency_hz),
    )


def least_gain(
    radio: Radio,
    distance_m: float,
    frequency_hz: float,
    *,
    gas_db: float,
    diffraction_db: float,
    resized: Resized = "both",
    direction: Way = "a_to_b",
    mode: str | None = None,
    bit_error_ratio: float | None = None,
    fade_margin_db: float = 0.0,
) -> InverseAnswer:
    """Least antenna gain, the same at both ends or at one of them, that leaves a mode the wanted fade margin.

    Parameters
    ----------
    radio
        Terminals, modes and other losses; the antennas to be resized give no gain here.
    distance_m, frequency_hz, gas_db, diffraction_db
        The path, as `link_budget`.
    resized
        Which antennas get the new gain.
    direction, mode, bit_error_ratio, fade_margin_db
        The question, as `longest_free_space_range`.

    Returns
    -------
    InverseAnswer
        Gain of one antenna in dBi; its lines add up to what the resized antennas need together.

    Raises
    ------
    InputError
        As `longest_free_space_range`.

    Examples
    --------
    >>> end = Terminal(power_dbm=28.0, line_loss_db=1.5, gain_dbi=38.7)
    >>> radio = Radio(end, end, (RadioMode("QPSK", threshold_dbm=-85.0),))
    >>> path = {"distance_m": 40e3, "frequency_hz": 6.175e9, "gas_db": 0.4, "diffraction_db": 0.0}
    >>> round(least_gain(radio, **path, fade_margin_db=40.0).value, 2)
    35.35
    >>> round(least_gain(radio, **path, fade_margin_db=40.0, resized="receiver").value, 2)
    32.0

    Notes
    -----
    Source: as `link_budget`.
    """
    chosen, threshold, wanted = _wanted(radio, mode, bit_error_ratio, fade_margin_db)
    new = _new(direction, resized)
    path = path_lines(distance_m, frequency_hz, gas_db, diffraction_db)
    forward = table(_isotropic(radio, new), direction, chosen, frequency_hz, path)
    lines = (*wanted, *_negated(line for line in forward if line.unit != "dBi" or line.name[-1] not in new))
    return InverseAnswer(
        total(lines) / len(new),
        "dBi",
        "gain of both antennas together" if resized == "both" else f"antenna gain {new[0]}",
        lines,
        threshold.lines,
        (AIMED, *threshold.assumptions),
        near_field_warnings(diameters(radio) | dict.fromkeys(new), distance_m, frequency_hz),
    )


def smallest_dish(
    radio: Radio,
    distance_m: float,
    frequency_hz: float,
    *,
    gas_db: float,
    diffraction_db: float,
    resized: Resized = "both",
    efficiency: float | None = None,
    direction: Way = "a_to_b",
    mode: str | None = None,
    bit_error_ratio: float | None = None,
    fade_margin_db: float = 0.0,
) -> InverseAnswer:
    """Smallest dish, the same at both ends or at one of them, that leaves a mode the wanted fade margin.

    Parameters
    ----------
    efficiency
        Of the dish, above 0 and at most 1; None takes that of each terminal.
    radio, distance_m, frequency_hz, gas_db, diffraction_db, resized, direction, mode, bit_error_ratio, fade_margin_db
        As `least_gain`.

    Returns
    -------
    InverseAnswer
        Diameter in m; its lines add up to the gain in dBi that the resized antennas need together.

    Raises
    ------
    InputError
        If no efficiency is given; else as `longest_free_space_range`.

    Examples
    --------
    >>> end = Terminal(power_dbm=28.0, line_loss_db=1.5, gain_dbi=38.7)
    >>> radio = Radio(end, end, (RadioMode("QPSK", threshold_dbm=-85.0),))
    >>> path = {"distance_m": 40e3, "frequency_hz": 6.175e9, "gas_db": 0.4, "diffraction_db": 0.0}
    >>> round(smallest_dish(radio, **path, efficiency=0.55, fade_margin_db=40.0).value, 2)
    1.22
    >>> round(smallest_dish(radio, **path, efficiency=0.55, fade_margin_db=40.0, resized="receiver").value, 2)
    0.83

    Notes
    -----
    Source: as `link_budget` and `dish_gain`.
    """
    gain = least_gain(
        radio,
        distance_m,
        frequency_hz,
        gas_db=gas_db,
        diffraction_db=diffraction_db,
        resized=resized,
        direction=direction,
        mode=mode,
        bit_error_ratio=bit_error_ratio,
        fade_margin_db=fade_margin_db,
    )
    # Equal dishes differ by their efficiencies alone: each counts as one of mean gain and of mean efficiency in dB.
    new = _new(direction, resized)
    efficiencies = [_efficiency(radio, end, efficiency) for end in new]
    mean_efficiency = math.prod(efficiencies) ** (1.0 / len(efficiencies))
    diameter_m = float(dish_diameter(gain.value, mean_efficiency, frequency_hz))
    across = diameter_m / float(wavelength(frequency_hz))
    aperture = f"gain of a dish many wavelengths across, 10·log10(η·(π·D/λ)²); this one is {across:.3g} wavelengths"
    return replace(
        gain,
        value=diameter_m,
        unit="m",
        assumptions=(AIMED, aperture, *gain.assumptions[1:]),
        warnings=near_field_warnings(diameters(radio) | dict.fromkeys(new, diameter_m), distance_m, frequency_hz),
    )


def _new(way: Way, resized: Resized) -> tuple[str, ...]:
    """Give the ends that get a new antenna."""
    sender, receiver = ends_of(way)
    return {"both": (sender, receiver), "transmitter": (sender,), "receiver": (receiver,)}[resized]


def _wanted(
    radio: Radio, name: str | None, bit_error_ratio: float | None, fade_margin_db: float
) -> tuple[RadioMode, Threshold, tuple[Line, Line]]:
    """Find the mode, its threshold, and the lines of the level that must arrive."""
    finite("fade_margin_db", fade_margin_db, "dB")
    mode = _mode(radio, name)
    if bit_error_ratio is not None:
        mode = replace(mode, threshold_dbm=None, bit_error_ratio=bit_error_ratio)
    threshold = mode_threshold(mode)
    if threshold.level_dbm is None:
        raise InputError(
            f"mode {mode.name}: no threshold: give it in dBm, or noise figure or temperature, bit rate or bandwidth, "
            "modulation and bit error ratio"
        )
    wanted = (
        Line("threshold", threshold.level_dbm, "dBm", f"mode {mode.name}"),
        Line("fade margin", float(fade_margin_db), "dB", "as wanted"),
    )
    return mode, threshold, wanted


def _mode(radio: Radio, name: str | None) -> RadioMode:
    if not radio.modes:
        raise InputError("radio modes = none: must be at least one, with a threshold")
    if name is None:
        return radio.modes[0]
    for mode in radio.modes:
        if mode.name == name:
            return mode
    raise InputError(f"mode = {name}: must be one of {', '.join(mode.name for mode in radio.modes)}")


def _isotropic(radio: Radio, ends: tuple[str, ...]) -> Radio:
    """Put an isotropic antenna at each of the ends, a stand-in for an unknown one whose line is then left out."""

    def blank(end: str) -> Terminal:
        terminal = radio.terminals[end]
        return replace(terminal, gain_dbi=0.0, diameter_m=None, efficiency=None) if end in ends else terminal

    return replace(radio, terminal_a=blank("A"), terminal_b=blank("B"))


def _efficiency(radio: Radio, end: str, given: float | None) -> float:
    efficiency = radio.terminals[end].efficiency if given is None else given
    if efficiency is None:
        raise InputError(f"terminal {end}: no antenna efficiency: give it (0 to 1), the diameter follows from it")
    return efficiency


def _negated(lines: Iterable[Line]) -> tuple[Line, ...]:
    """Move lines to the other side of the equation."""
    return tuple(replace(line, name=f"less {line.name}", value=0.0 - line.value) for line in lines)
