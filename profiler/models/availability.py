"""The air, the climate, and what the hop must meet."""

from dataclasses import dataclass
from itertools import pairwise
from typing import Annotated, ClassVar, Literal

from profiler.models.stated import Forms, Key, Stated, require
from profiler.units import MINUTES_PER_YEAR

__all__ = [
    "AirChoice",
    "AvailabilityChoice",
    "DiversityChoice",
    "KPeriod",
    "MultipathMethod",
    "Objective",
    "VigantsClimate",
]

MultipathMethod = Literal["p530-17", "p530-17-quick", "p530-18", "vigants-barnett"]
VigantsClimate = Literal["humid", "average", "dry"]
KPeriod = Literal["year", "worst-month"]


@dataclass(frozen=True, slots=True)
class AirChoice(Stated):
    """The air along the path; what is None comes from the reference atmosphere at the path's height."""

    pressure_hpa: Annotated[
        float | None, Key("total", above=0, most=1100, left_out="reference atmosphere", example=955)
    ] = None
    temperature_k: Annotated[
        float | None,
        Key("of the air", least=150, most=350, usual="c", left_out="reference atmosphere", example=12),
    ] = None
    vapour_g_m3: Annotated[
        float | None, Key("water vapour", least=0, most=100, left_out="reference atmosphere", example=7.5)
    ] = None


@dataclass(frozen=True, slots=True)
class DiversityChoice(Stated):
    """Space diversity: a second receiving antenna ``spacing_m`` below the main one at each end, with its gain."""

    spacing_m: Annotated[float, Key("between the two centres", above=0, example=10)]
    gain_difference_db: Annotated[float, Key("of the lower antenna's gain to the main one's", example=0)] = 0.0


@dataclass(frozen=True, slots=True)
class Objective(Stated):
    """What the hop must meet; each target that is None is not asked for. Outage both ways is judged per direction.

    The ratios are of the seconds of the worst month. Errors begin above the radio's threshold, so
    ``errored_seconds_ratio`` needs ``errored_threshold_offset_db``: by how much the level at which seconds are errored
    lies above the threshold.
    """

    FORMS: ClassVar = (Forms((("errored_seconds_ratio", "errored_threshold_offset_db"),), needed=False),)

    worst_month_percent: Annotated[
        float | None, Key("outage of the worst month", above=0, below=100, left_out="not asked", example=0.05)
    ] = None
    year_percent: Annotated[
        float | None, Key("outage of the year", above=0, below=100, left_out="not asked", example=0.01)
    ] = None
    minutes_per_year: Annotated[
        float | None, Key("outage of the year", above=0, below=MINUTES_PER_YEAR, left_out="not asked", example=52.6)
    ] = None
    severely_errored_seconds_ratio: Annotated[
        float | None, Key("of the worst month", above=0, below=1, left_out="not asked", example=2e-5)
    ] = None
    errored_seconds_ratio: Annotated[
        float | None, Key("of the worst month", above=0, below=1, left_out="not asked", example=4e-4)
    ] = None
    errored_threshold_offset_db: Annotated[
        float | None,
        Key(
            "by how much the level of errored seconds lies above the threshold",
            least=0,
            below=100,
            left_out="none",
            example=4,
        ),
    ] = None


@dataclass(frozen=True, slots=True)
class AvailabilityChoice(Stated):
    """Climate numbers and method for the outage prediction. With ``use_maps`` the climate extra fills what is None.

    ``k_percentiles`` are (percent of the time that k is not exceeded, k) pairs, ascending, for obstruction fading and
    for the spread of k in the confidence analysis; ``k_period`` says of which time. ``climate_factor`` is the whole c
    of Vigants-Barnett; where it is None, ``climate`` with the roughness of the path's own ground gives it.
    ``annual_temperature_k`` is the mean of the year, for the length of the Vigants-Barnett fading season.
    """

    multipath_method: Annotated[MultipathMethod, Key("of multipath fading", example="p530-17-quick")]
    objective: Annotated[Objective, Key("what is asked of the hop", left_out="nothing")] = Objective()
    use_maps: Annotated[
        bool,
        Key("look up what is left out in the published maps; needs hopwright[climate]", example=True),
    ] = False
    rain_rate_mm_h: Annotated[
        float | None,
        Key("exceeded for 0.01 % of the year", least=0, most=500, left_out="no rain is counted", example=32),
    ] = None
    dn1_n_km: Annotated[
        float | None,
        Key("gradient not exceeded for 1 % of the year, lowest 65 m", left_out="not known", example=-300),
    ] = None
    terrain_roughness_m: Annotated[
        float | None, Key("for p530-17", least=0, left_out="from the path's own ground", example=45)
    ] = None
    geoclimatic_factor: Annotated[
        float | None, Key("for p530-18, from its own map", above=0, left_out="not known", example=1e-5)
    ] = None
    dn75_n_km: Annotated[float | None, Key("for p530-18, from its own map", left_out="not known", example=60)] = None
    climate_factor: Annotated[
        float | None, Key("for vigants-barnett; or the climate", above=0, left_out="from the climate", example=1.0)
    ] = None
    climate: Annotated[VigantsClimate | None, Key("for vigants-barnett", left_out="not known", example="average")] = (
        None
    )
    annual_temperature_k: Annotated[
        float | None,
        Key("mean of the year, for vigants-barnett", least=150, most=350, usual="c", left_out="not known", example=11),
    ] = None
    k_percentiles: Annotated[
        tuple[tuple[float, float], ...],
        Key(
            "percent of the time, k not exceeded in it",
            left_out="obstruction by low k is not counted",
            example=[[0.1, 0.8], [1, 0.95], [50, 1.3333], [99, 2.2]],
        ),
    ] = ()
    k_period: Annotated[KPeriod, Key("the time that k_percentiles are of", example="year")] = "year"
    diversity: Annotated[DiversityChoice | None, Key("a second receiving antenna below the first", left_out="none")] = (
        None
    )

    def _agree(self) -> None:
        pairs = self.k_percentiles
        whole = all(0 < percent < 100 and k > 0 for percent, k in pairs)
        ascend = all(low[0] < high[0] and low[1] <= high[1] for low, high in pairwise(pairs))
        like = "pairs of percent and k, both ascending, like [[0.1, 0.6], [50, 1.33], [99.9, 3.0]], the percent of the "
        require(whole and ascend, "k_percentiles", pairs, like + "time that k is not exceeded above 0 and below 100")
