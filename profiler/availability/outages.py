"""Outage by mechanism at one fade margin or many: the one forward model behind the point, the curve and the solver."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Generic, Literal, TypeVar

import numpy as np
from numpy.typing import ArrayLike

from profiler.availability.diversity import add_diversity_outages
from profiler.availability.model import OutageModel
from profiler.availability.months import worst_month_from_year, year_from_worst_month
from profiler.availability.multipath import fade_percent
from profiler.availability.obstruction import obstruction_percent, unknown_percent
from profiler.availability.rain_outage import rain_percent
from profiler.checks import not_negative
from profiler.models import frozen_array
from profiler.units import Float

__all__ = ["MECHANISMS", "Mechanism", "Outages", "outages_at"]

Mechanism = Literal["multipath", "selective", "rain", "obstruction"]
MECHANISMS: tuple[Mechanism, ...] = ("multipath", "selective", "rain", "obstruction")

T = TypeVar("T", float, Float)


@dataclass(frozen=True, slots=True, eq=False)
class Outages(Generic[T]):
    """Outage in percent of a period, by mechanism; None where nothing was given to compute it from.

    ``multipath`` is flat fading, ``selective`` the distortion by the same echoes, ``clear_air`` both together: their
    sum, or with diversity the 3/4-power law of Rec. ITU-R P.530-17 §6.2. ``total`` is clear air, rain and obstruction
    added in time, at most 100. ``obstruction_up_to`` is what obstruction could be at most, as the statistics of k end,
    and ``total_up_to`` the total with it. A hop without any margin is down without fading: it has totals only.
    """

    multipath: T | None
    selective: T | None
    rain: T | None
    obstruction: T | None
    clear_air: T | None
    total: T
    obstruction_up_to: T | None
    total_up_to: T

    def part(self, mechanism: Mechanism) -> T | None:
        """Outage by one mechanism."""
        value: T | None = getattr(self, mechanism)
        return value


def _joined(
    model: OutageModel,
    multipath: Float,
    selective: Float | None,
    rain: Float | None,
    obstruction: tuple[Float, Float] | None,
) -> Outages[Float]:
    """Outages of one period with their total; of obstruction what is counted, and what it could be at most."""
    clear_air = multipath
    if selective is not None:
        diverse = model.improvement_at_0_db is not None
        clear_air = add_diversity_outages(multipath, selective) if diverse else multipath + selective
    fading = clear_air if rain is None else clear_air + rain
    counted, most = (None, None) if obstruction is None else obstruction

    def frozen(part: Float | None) -> Float | None:
        return None if part is None else frozen_array(part)

    def total(part: Float | None) -> Float:
        return frozen_array(np.minimum(fading if part is None else fading + part, 100.0))

    return Outages(
        multipath=frozen_array(multipath),
        selective=frozen(selective),
        rain=frozen(rain),
        obstruction=frozen(counted),
        clear_air=frozen_array(np.minimum(clear_air, 100.0)),
        total=total(counted),
        obstruction_up_to=frozen(most),
        total_up_to=total(most),
    )


def _periods_of_obstruction(
    model: OutageModel, margin_db: Float
) -> tuple[tuple[Float, Float] | None, tuple[Float, Float] | None]:
    """Obstruction outage of the worst month and of the year: counted, and at most."""
    statistics = model.k_statistics
    if statistics is None:
        return None, None
    counted = obstruction_percent(statistics, margin_db)
    most = counted + unknown_percent(statistics, margin_db, beyond_db=model.beyond_db)
    if model.choice.k_period == "year":
        return (worst_month_from_year(counted), worst_month_from_year(most)), (counted, most)
    return (counted, most), (year_from_worst_month(counted), year_from_worst_month(most))


def outages_at(model: OutageModel, margin_db: ArrayLike) -> tuple[Outages[Float], Outages[Float]]:
    """Outage of the worst month and of the year at one fade margin or many.

    Parameters
    ----------
    model
        From `outage_model`.
    margin_db
        Fade margin, 0 dB or more, any shape.

    Returns
    -------
    tuple of Outages
        Worst month and year, percent, each array of the shape of the margin.

    Raises
    ------
    InputError
        If a margin is below 0 dB: such a hop is down without any fading.

    Examples
    --------
    >>> from profiler.availability import PathFacts, outage_model
    >>> from profiler.models import AvailabilityChoice
    >>> choice = AvailabilityChoice("p530-17-quick", dn1_n_km=-300.0)
    >>> model = outage_model(PathFacts(40e3, 7e9, 300.0, 400.0, latitude=45.0), choice)
    >>> month, year = outages_at(model, [30.0, 40.0])
    >>> month.multipath.round(5).tolist(), month.rain is None, bool((year.total < month.total).all())
    ([0.00765, 0.00076], True, True)
    """
    margin = not_negative("margin_db", margin_db, "dB")
    p0, share = model.fading.occurrence_percent, model.fading.year_share
    improvement = np.asarray(1.0)
    if model.improvement_at_0_db is not None:
        improvement = np.maximum(model.improvement_at_0_db * 10.0 ** (margin / 10.0), 1.0)
    selective = None
    if model.selective_percent is not None:
        selective = np.full(margin.shape, model.selective_percent)
    rain = None
    if model.rain_fade_001_db is not None:
        rain = rain_percent(model.rain_fade_001_db, model.path.frequency_hz, margin)
    month_obstruction, year_obstruction = _periods_of_obstruction(model, margin)
    month_rain = None if rain is None else worst_month_from_year(rain)
    year_selective = None if selective is None else selective * share
    month = _joined(model, fade_percent(p0, margin) / improvement, selective, month_rain, month_obstruction)
    year = _joined(model, fade_percent(p0 * share, margin) / improvement, year_selective, rain, year_obstruction)
    return month, year
