"""What the outage of a hop leaves open: rain that was not given, and k below what the statistics reach."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from profiler.availability.model import OutageModel
from profiler.availability.notes import Notes
from profiler.remarks import db_text, k_text
from profiler.units import Float

__all__ = ["holds_at_low_k", "obstruction_notes", "reasons_open"]

_RAIN_MATTERS_HZ = 5e9


def holds_at_low_k(model: OutageModel, margin_db: Float) -> NDArray[np.bool_]:
    """Whether each margin holds the hop at the low k of the rules, or the statistics of k count the time of it."""
    beyond_db = -np.inf if model.beyond_db is None else model.beyond_db
    return np.asarray(beyond_db <= margin_db)


def _cut_off(model: OutageModel, margin_db: float) -> tuple[str, ...]:
    """Say that the hop is cut off at the low k of the rules, for a time that nobody gave."""
    if margin_db < 0.0 or holds_at_low_k(model, np.asarray(margin_db)):
        return ()
    return (
        f"diffraction at the low k of the rules, {k_text(model.low_k or 0.0)}, takes {db_text(model.beyond_db or 0.0)}"
        f" more than the budget counts, over the fade margin of {db_text(margin_db)}: the hop is cut off then, for a"
        " time not counted; give statistics of k that reach it",
    )


def reasons_open(model: OutageModel, margin_db: float) -> tuple[str, ...]:
    """Name what matters to the total outage and could not be computed, one line each.

    Examples
    --------
    >>> from profiler.availability import PathFacts, outage_model
    >>> from profiler.models import AvailabilityChoice
    >>> path = PathFacts(40e3, 4e9, 300.0, 400.0, latitude=45.0)
    >>> model = outage_model(
    ...     path, AvailabilityChoice("p530-17-quick", dn1_n_km=-300.0), low_k=0.7, low_k_excess_db=30.0
    ... )
    >>> len(reasons_open(model, 20.0)), len(reasons_open(model, 40.0))
    (1, 0)
    """
    rain: tuple[str, ...] = ()
    if model.rain_fade_001_db is None and model.path.frequency_hz > _RAIN_MATTERS_HZ:
        rain = (
            "rain is not counted, and above 5 GHz Rec. ITU-R P.530 §2.4 wants it in the design: give the rain rate",
        )
    return rain + _cut_off(model, margin_db)


def obstruction_notes(model: OutageModel, margin_db: float) -> Notes:
    """Say what the statistics of k, or the lack of them, leave open at a margin of 0 dB or more."""
    notes = Notes(warnings=_cut_off(model, margin_db))
    statistics = model.k_statistics
    if statistics is None:
        return notes
    lowest, highest = float(statistics.percent[0]), float(statistics.percent[-1])
    if statistics.excess_db[-1] > margin_db:
        line = f"obstruction: cut off at the highest k given, {highest:g} %; counted as cut off at every k above it too"
        return notes + Notes(warnings=(line,))
    if statistics.excess_db[0] > margin_db:
        return notes
    held = f"obstruction: not cut off at the lowest k given, not exceeded {lowest:g} % of the time"
    if model.beyond_db is not None and model.beyond_db <= margin_db:
        low = k_text(model.low_k or 0.0)
        rest = f"nor at the low k of the rules, {low}; below that counted as 0 (Rec. ITU-R P.530-18 §2.2)"
    else:
        rest = f"below it counted as 0, and it could be up to {lowest:g} %"
    return notes + Notes(assumptions=(f"{held}; {rest}",))
