"""Frozen values passed between the stages. What a user decides lives here; what a stage finds lives beside the stage.

Conventions: profiles run from site A to site B and distance 0 is A; longitude and latitude are WGS 84 degrees, east
and north positive; heights named ``*_m`` are above the vertical datum of the terrain unless the name says otherwise
(``antenna_m`` and ``cover_m`` are above ground). ``None`` means "not given": nothing is invented for it.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any, Literal, TypeVar, overload

import numpy as np
from numpy.typing import ArrayLike, NDArray

from profiler.errors import InputError
from profiler.units import K_MEDIAN, MINUTES_PER_YEAR, Float

__all__ = [
    "AirChoice",
    "AvailabilityChoice",
    "ConfidenceChoice",
    "CoverChoice",
    "DiffractionMethod",
    "DiversityChoice",
    "FillPolicy",
    "HeightsChoice",
    "Hop",
    "KPeriod",
    "MultipathMethod",
    "Objective",
    "Obstacle",
    "Obstruction",
    "Polarization",
    "Profile",
    "Radio",
    "RadioMode",
    "Rule",
    "SampleMethod",
    "Signature",
    "Site",
    "Terminal",
    "TerrainChoice",
    "TowerChoice",
    "VigantsClimate",
    "frozen_array",
    "lengths_between",
]

Polarization = Literal["vertical", "horizontal"]
SampleMethod = Literal["bilinear", "highest"]
FillPolicy = Literal["stop", "interpolate"]
Obstruction = Literal["isolated", "extended"]
DiffractionMethod = Literal[
    "delta-bullington",
    "bullington",
    "spherical-earth",
    "knife-edge",
    "rounded-obstacle",
    "double-edge",
    "cascaded-edges",
]
MultipathMethod = Literal["p530-17", "p530-17-quick", "p530-18", "vigants-barnett"]
VigantsClimate = Literal["humid", "average", "dry"]
KPeriod = Literal["year", "worst-month"]


_Kind = TypeVar("_Kind", bound=np.generic)


@overload
def frozen_array(values: ArrayLike) -> Float: ...
@overload
def frozen_array(values: ArrayLike, dtype: type[_Kind]) -> NDArray[_Kind]: ...
def frozen_array(values: ArrayLike, dtype: type[np.generic] = np.float64) -> NDArray[Any]:
    """Copy values into a read-only array, of float64 unless another kind is given.

    Examples
    --------
    >>> frozen_array([1, 2])
    array([1., 2.])
    >>> frozen_array([True, False], np.bool_).flags.writeable
    False
    """
    array = np.array(values, dtype=dtype)
    array.setflags(write=False)
    return array


def lengths_between(distance_m: ArrayLike) -> Float:
    """Length of the path that each point stands for, half of it to either neighbour: weights of a mean along the path.

    Examples
    --------
    >>> lengths_between([0.0, 10.0, 40.0]).tolist()
    [5.0, 20.0, 15.0]
    """
    half = 0.5 * np.diff(distance_m)
    return np.asarray(np.append(half, 0.0) + np.append(0.0, half))


def _require(ok: bool, name: str, value: object, allowed: str) -> None:
    """Stop with the one-line error of a field unless ``ok``."""
    if not ok:
        raise InputError(f"{name} = {value}: must be {allowed}")


def _positive_or_none(value: float | None) -> bool:
    return value is None or 0 < value < math.inf


@dataclass(frozen=True, slots=True)
class Site:
    """One end of a hop.

    ``surveyed_ground_m`` replaces the raster's ground at the site. Within ``clearing_m`` of the site nothing stands on
    the ground, whatever the cover says. ``position_notes`` say how the position was given when that was not plain
    WGS 84 degrees.
    """

    name: str
    longitude: float
    latitude: float
    antenna_m: float
    surveyed_ground_m: float | None = None
    clearing_m: float = 0.0
    position_notes: tuple[str, ...] = ()

    def __post_init__(self) -> None:
        _require(-180 <= self.longitude <= 180, f"{self.name}: longitude", self.longitude, "-180 to 180 degrees")
        _require(-90 <= self.latitude <= 90, f"{self.name}: latitude", self.latitude, "-90 to 90 degrees")
        _require(0 < self.antenna_m < 2000, f"{self.name}: antenna_m", self.antenna_m, "more than 0 and under 2000 m")


@dataclass(frozen=True, slots=True)
class Rule:
    """One clearance requirement: at factor k, ``fresnel_fraction`` of F1 plus ``margin_m`` must be free."""

    k: float
    fresnel_fraction: float
    margin_m: float = 0.0
    label: str = ""

    def __post_init__(self) -> None:
        _require(self.k > 0, "k", self.k, "more than 0")
        _require(0 <= self.fresnel_fraction <= 10, "fresnel_fraction", self.fresnel_fraction, "0 to 10")
        _require(-100 <= self.margin_m <= 1000, "margin_m", self.margin_m, "-100 to 1000 m")


@dataclass(frozen=True, slots=True)
class TerrainChoice:
    """Where ground heights come from and how they are read.

    ``spacing_m`` None means half the finest cell under the path; ``vertical_datum`` and ``height_unit``
    ("m", "ft") are those of rasters that do not say it themselves. Of rasters of one resolution the one whose path
    stands first answers. ``voids_are_sea`` takes cells without a height for the sea, at 0 m.
    """

    paths: tuple[Path, ...]
    method: SampleMethod = "bilinear"
    spacing_m: float | None = None
    missing: FillPolicy = "stop"
    allow_mixed_datums: bool = False
    vertical_datum: str | None = None
    height_unit: str | None = None
    allow_network: bool = False
    voids_are_sea: bool = False


@dataclass(frozen=True, slots=True)
class Obstacle:
    """One thing that stands on the ground across the path, ``from_m`` to ``to_m`` from site A, ``height_m`` tall."""

    name: str
    from_m: float
    to_m: float
    height_m: float

    def __post_init__(self) -> None:
        _require(0 <= self.from_m <= self.to_m, f"obstacle {self.name}: from_m", self.from_m, "0 to to_m")
        _require(self.height_m >= 0, f"obstacle {self.name}: height_m", self.height_m, "0 m or more")


@dataclass(frozen=True, slots=True)
class CoverChoice:
    """What stands on the ground: canopy rasters (heights), a land-cover raster with a height per class, obstacles."""

    canopy: tuple[Path, ...] = ()
    landcover: Path | None = None
    class_heights_m: tuple[tuple[int, float], ...] = ()
    obstacles: tuple[Obstacle, ...] = ()


@dataclass(frozen=True, slots=True)
class Terminal:
    """The radio and antenna of one end: the gain is given, or follows from dish diameter and efficiency.

    ``model`` names the antenna, for the note of its gain.
    """

    power_dbm: float
    line_loss_db: float = 0.0
    gain_dbi: float | None = None
    diameter_m: float | None = None
    efficiency: float | None = None
    model: str = ""

    def __post_init__(self) -> None:
        _require(math.isfinite(self.power_dbm), "power_dbm", self.power_dbm, "a finite level in dBm")
        _require(0 <= self.line_loss_db < math.inf, "line_loss_db", self.line_loss_db, "0 dB or more")
        _require(
            self.gain_dbi is None or math.isfinite(self.gain_dbi), "gain_dbi", self.gain_dbi, "a finite gain in dBi"
        )
        _require(_positive_or_none(self.diameter_m), "diameter_m", self.diameter_m, "more than 0 m")
        ok = self.efficiency is None or 0 < self.efficiency <= 1
        _require(ok, "efficiency", self.efficiency, "more than 0 and at most 1 (a fraction, not percent)")


@dataclass(frozen=True, slots=True)
class Signature:
    """A radio's selective-fading signature (Rec. ITU-R F.1093): width, depths and the reference delay."""

    width_hz: float
    depth_minimum_phase_db: float
    depth_nonminimum_phase_db: float
    delay_s: float = 6.3e-9

    def __post_init__(self) -> None:
        _require(0 < self.width_hz < math.inf, "width_hz", self.width_hz, "more than 0 Hz")
        _require(0 < self.delay_s < math.inf, "delay_s", self.delay_s, "more than 0 s")
        for name in ("depth_minimum_phase_db", "depth_nonminimum_phase_db"):
            value = getattr(self, name)
            _require(math.isfinite(value), name, value, "a number of dB")


@dataclass(frozen=True, slots=True)
class RadioMode:
    """One modulation state of the radio. The threshold is given, or follows from noise, rate, modulation and ratio.

    ``noise_temperature_k`` is that of the whole receiving system (antenna and receiver), so N0 = k_B·T; a noise figure
    F means 290 K·F. ``bit_rate_bps`` is the rate of information bits and ``coding_gain_db`` is in Eb/N0 of those bits.
    ``power_dbm`` replaces the power of both terminals in this mode. ``objective`` is what this mode must meet, in place
    of the hop's.
    """

    name: str
    threshold_dbm: float | None = None
    power_dbm: float | None = None
    noise_figure_db: float | None = None
    noise_temperature_k: float | None = None
    bandwidth_hz: float | None = None
    bit_rate_bps: float | None = None
    modulation: str | None = None
    bit_error_ratio: float | None = None
    coding_gain_db: float = 0.0
    implementation_loss_db: float = 0.0
    signature: Signature | None = None
    objective: Objective | None = None

    def __post_init__(self) -> None:
        for name in ("threshold_dbm", "power_dbm"):
            level = getattr(self, name)
            _require(level is None or math.isfinite(level), name, level, "a finite level in dBm")
        for name, unit in (("noise_temperature_k", "K"), ("bandwidth_hz", "Hz"), ("bit_rate_bps", "bit/s")):
            value = getattr(self, name)
            _require(_positive_or_none(value), name, value, f"more than 0 {unit}")
        figure, ratio = self.noise_figure_db, self.bit_error_ratio
        _require(figure is None or 0 <= figure < math.inf, "noise_figure_db", figure, "0 dB or more")
        _require(ratio is None or 0 < ratio < 0.5, "bit_error_ratio", ratio, "more than 0 and under 0.5")
        for name in ("coding_gain_db", "implementation_loss_db"):
            value = getattr(self, name)
            _require(0 <= value < math.inf, name, value, "0 dB or more")


@dataclass(frozen=True, slots=True)
class Radio:
    """Both terminals, the modes (most robust first or in any order) and named extra losses of the path."""

    terminal_a: Terminal
    terminal_b: Terminal
    modes: tuple[RadioMode, ...]
    other_losses_db: tuple[tuple[str, float], ...] = ()

    @property
    def terminals(self) -> dict[str, Terminal]:
        """Both terminals by the letter of their end."""
        return {"A": self.terminal_a, "B": self.terminal_b}

    def __post_init__(self) -> None:
        for name, loss_db in self.other_losses_db:
            _require(0 <= loss_db < math.inf, f"other loss {name}", loss_db, "0 dB or more (a loss is positive)")
        names = [mode.name for mode in self.modes]
        _require(len(set(names)) == len(names), "mode names", ", ".join(names), "different from one another")


@dataclass(frozen=True, slots=True)
class AirChoice:
    """The air along the path; what is None comes from the reference atmosphere at the path's height."""

    pressure_hpa: float | None = None
    temperature_k: float | None = None
    vapour_g_m3: float | None = None


@dataclass(frozen=True, slots=True)
class DiversityChoice:
    """Space diversity: a second receiving antenna ``spacing_m`` below the main one at each end, with its gain."""

    spacing_m: float
    gain_difference_db: float = 0.0

    def __post_init__(self) -> None:
        _require(0 < self.spacing_m < math.inf, "spacing_m", self.spacing_m, "more than 0 m")
        _require(
            math.isfinite(self.gain_difference_db), "gain_difference_db", self.gain_difference_db, "a number of dB"
        )


@dataclass(frozen=True, slots=True)
class Objective:
    """What the hop must meet; each target that is None is not asked for. Outage both ways is judged per direction.

    The ratios are of the seconds of the worst month. Errors begin above the radio's threshold, so
    ``errored_seconds_ratio`` needs ``errored_threshold_offset_db``: by how much the level at which seconds are errored
    lies above the threshold.
    """

    worst_month_percent: float | None = None
    year_percent: float | None = None
    minutes_per_year: float | None = None
    severely_errored_seconds_ratio: float | None = None
    errored_seconds_ratio: float | None = None
    errored_threshold_offset_db: float | None = None

    def __post_init__(self) -> None:
        for name in ("worst_month_percent", "year_percent"):
            value = getattr(self, name)
            _require(value is None or 0 < value < 100, name, value, "more than 0 and under 100 %")
        minutes = self.minutes_per_year
        _require(
            minutes is None or 0 < minutes < MINUTES_PER_YEAR,
            "minutes_per_year",
            minutes,
            f"more than 0 and under {MINUTES_PER_YEAR:g}",
        )
        for name in ("severely_errored_seconds_ratio", "errored_seconds_ratio"):
            value = getattr(self, name)
            _require(value is None or 0 < value < 1, name, value, "more than 0 and under 1")
        offset = self.errored_threshold_offset_db
        _require(offset is None or 0 <= offset < 100, "errored_threshold_offset_db", offset, "0 to under 100 dB")
        _require(
            (offset is None) == (self.errored_seconds_ratio is None),
            "errored_threshold_offset_db",
            "not given" if offset is None else offset,
            "given together with errored_seconds_ratio",
        )


@dataclass(frozen=True, slots=True)
class AvailabilityChoice:
    """Climate numbers and method for the outage prediction. With ``use_maps`` the climate extra fills what is None.

    ``k_percentiles`` are (percent of the time that k is not exceeded, k) pairs, ascending, for obstruction fading and
    for the spread of k in the confidence analysis; ``k_period`` says of which time. ``climate_factor`` is the whole c
    of Vigants-Barnett; where it is None, ``climate`` with the roughness of the path's own ground gives it.
    ``annual_temperature_k`` is the mean of the year, for the length of the Vigants-Barnett fading season.
    """

    multipath_method: MultipathMethod
    objective: Objective = Objective()
    use_maps: bool = False
    rain_rate_mm_h: float | None = None
    dn1_n_km: float | None = None
    terrain_roughness_m: float | None = None
    geoclimatic_factor: float | None = None
    dn75_n_km: float | None = None
    climate_factor: float | None = None
    climate: VigantsClimate | None = None
    annual_temperature_k: float | None = None
    k_percentiles: tuple[tuple[float, float], ...] = ()
    k_period: KPeriod = "year"
    diversity: DiversityChoice | None = None


@dataclass(frozen=True, slots=True)
class TowerChoice:
    """What a tower allows and costs: range and step of positions, taken ones, price per metre and above a limit.

    Positions are the whole multiples of ``step_m`` above ground from ``lowest_m`` to ``highest_m``, both included;
    with ``lowest_m`` equal to ``highest_m`` that one height, whatever the step. A position closer than
    ``taken_clearance_m`` to one of ``taken_m`` is not free. ``threshold_cost`` is paid once for an antenna above
    ``threshold_m`` (not for one at it).
    """

    lowest_m: float = 1.0
    highest_m: float = 150.0
    step_m: float = 1.0
    taken_m: tuple[float, ...] = ()
    taken_clearance_m: float = 1.0
    cost_per_m: float = 1.0
    threshold_m: float | None = None
    threshold_cost: float = 0.0

    def __post_init__(self) -> None:
        _require(self.lowest_m > 0, "lowest_m", self.lowest_m, "more than 0 m")
        _require(self.highest_m >= self.lowest_m, "highest_m", self.highest_m, f"at least lowest_m = {self.lowest_m}")
        _require(self.highest_m < 2000, "highest_m", self.highest_m, "under 2000 m")
        _require(self.step_m > 0, "step_m", self.step_m, "more than 0 m")
        _require(
            all(0 < taken < 2000 for taken in self.taken_m), "taken_m", self.taken_m, "more than 0 and under 2000 m"
        )
        _require(0 <= self.taken_clearance_m < 2000, "taken_clearance_m", self.taken_clearance_m, "0 m or more")
        _require(0 <= self.cost_per_m < math.inf, "cost_per_m", self.cost_per_m, "0 or more")
        _require(self.threshold_m is None or self.threshold_m > 0, "threshold_m", self.threshold_m, "more than 0 m")
        _require(0 <= self.threshold_cost < math.inf, "threshold_cost", self.threshold_cost, "0 or more")


@dataclass(frozen=True, slots=True)
class HeightsChoice:
    """What the search for antenna heights may do at each tower, and the optional loss limit.

    ``diversity_obstruction`` says what the ground does to the lower antenna of a diversity pair (Rec. ITU-R P.530-18
    §2.2.2): one or two isolated obstacles, or an extended one, which asks for more clearance.
    """

    tower_a: TowerChoice = TowerChoice()
    tower_b: TowerChoice = TowerChoice()
    loss_limit_db: float | None = None
    loss_k: float = K_MEDIAN
    diversity_obstruction: Obstruction = "extended"

    def __post_init__(self) -> None:
        limit_ok = self.loss_limit_db is None or 0 <= self.loss_limit_db < math.inf
        _require(limit_ok, "loss_limit_db", self.loss_limit_db, "0 dB or more")
        _require(self.loss_k > 0, "loss_k", self.loss_k, "more than 0")


@dataclass(frozen=True, slots=True)
class ConfidenceChoice:
    """How wrong the terrain and the cover may be, and how the doubt is drawn.

    ``terrain_source`` says in words where ``terrain_sigma_m`` comes from. ``correlation_m`` is the practical range of
    the terrain error: the distance at which its correlation has fallen to 5 %; 0 is none, infinity is one error for
    the whole path. ``cover_correlation_m`` is the same for the cover, None meaning the terrain's. ``site_sigma_m`` is
    the error of the ground at sites known better than the raster, None meaning that they share the raster's error.
    The cover's error is ``cover_sigma_m`` and ``cover_relative_sigma`` times its height, added in quadrature.
    ``terrain_offset_sigma_m`` is the part of the terrain's error that a whole neighbourhood shares, beside the local
    ``terrain_sigma_m``. ``step_m`` is the step at which local errors are drawn, None meaning the raster's cell.
    ``minimum_chance`` is the chance of clearing under which a hop that clears on the map is not sure to pass.
    """

    terrain_sigma_m: float
    terrain_source: str
    correlation_m: float
    covariance: Literal["exponential", "gaussian"] = "exponential"
    site_sigma_m: float | None = None
    cover_sigma_m: float = 0.0
    cover_relative_sigma: float = 0.0
    cover_correlation_m: float | None = None
    minimum_chance: float = 0.9
    terrain_offset_sigma_m: float = 0.0
    step_m: float | None = None
    vary_k: bool = False
    draws: int = 2000
    seed: int = 1

    def __post_init__(self) -> None:
        _require(0.5 <= self.minimum_chance < 1, "minimum_chance", self.minimum_chance, "0.5 to under 1")
        offset, step = self.terrain_offset_sigma_m, self.step_m
        _require(0 <= offset <= 100, "terrain_offset_sigma_m", offset, "0 to 100 m")
        _require(_positive_or_none(step), "step_m", step, "more than 0 m")
        _require(0 <= self.terrain_sigma_m <= 100, "terrain_sigma_m", self.terrain_sigma_m, "0 to 100 m")
        _require(self.correlation_m >= 0, "correlation_m", self.correlation_m, "0 m or more")
        kinds = ("exponential", "gaussian")
        _require(self.covariance in kinds, "covariance", repr(self.covariance), "'exponential' or 'gaussian'")
        site = 0.0 if self.site_sigma_m is None else self.site_sigma_m
        _require(0 <= site <= 100, "site_sigma_m", site, "0 to 100 m")
        _require(0 <= self.cover_sigma_m <= 100, "cover_sigma_m", self.cover_sigma_m, "0 to 100 m")
        _require(0 <= self.cover_relative_sigma <= 1, "cover_relative_sigma", self.cover_relative_sigma, "0 to 1")
        cover = 0.0 if self.cover_correlation_m is None else self.cover_correlation_m
        _require(cover >= 0, "cover_correlation_m", cover, "0 m or more")
        _require(100 <= self.draws <= 1_000_000, "draws", self.draws, "100 to 1000000")
        _require(self.seed >= 0, "seed", self.seed, "0 or more")


@dataclass(frozen=True, slots=True)
class Hop:
    """All that a user says about one hop. Built by `profiler.hopfile` or in code; `profiler.study` runs it.

    ``median_k`` is for losses, budget and angles; None means that of the climate maps where they are used, else 4/3.
    The rules have their own k.
    """

    name: str
    site_a: Site
    site_b: Site
    frequency_hz: float
    rules: tuple[Rule, ...]
    terrain: TerrainChoice
    polarization: Polarization = "vertical"
    median_k: float | None = None
    diffraction_method: DiffractionMethod = "delta-bullington"
    sea_fraction: float = 0.0
    cover: CoverChoice = CoverChoice()
    radio: Radio | None = None
    air: AirChoice = AirChoice()
    availability: AvailabilityChoice | None = None
    heights: HeightsChoice = HeightsChoice()
    confidence: ConfidenceChoice | None = None
    assumptions: tuple[str, ...] = ()
    source: str = "code"
    source_sha256: str | None = None

    def __post_init__(self) -> None:
        _require(1e7 <= self.frequency_hz <= 1e12, "frequency_hz", self.frequency_hz, "1e7 to 1e12 Hz")
        _require(len(self.rules) > 0, "rules", "none", "at least one rule or a named preset")
        _require(_positive_or_none(self.median_k), "median_k", self.median_k, "more than 0")

    @property
    def ends(self) -> tuple[float, float, float, float]:
        """Longitude and latitude of A, then of B."""
        return self.site_a.longitude, self.site_a.latitude, self.site_b.longitude, self.site_b.latitude

    @property
    def has_objective(self) -> bool:
        """Whether the hop, or one of its modes, must meet an availability target."""
        asked = [] if self.availability is None else [self.availability.objective]
        asked += [] if self.radio is None else [mode.objective or Objective() for mode in self.radio.modes]
        return any(objective != Objective() for objective in asked)


@dataclass(frozen=True, slots=True, eq=False)
class Profile:
    """Ground and cover from A to B, all arrays (n,) and read-only.

    ``filled`` marks ground that was interpolated by the user's leave, ``surveyed`` ground that a survey replaced.
    """

    distance_m: Float
    longitude: Float
    latitude: Float
    ground_m: Float
    cover_m: Float
    filled: NDArray[np.bool_] = field(repr=False)
    surveyed: NDArray[np.bool_] = field(repr=False)

    @property
    def surface_m(self) -> Float:
        """Ground plus cover, above the vertical datum."""
        return self.ground_m + self.cover_m

    @property
    def weight_m(self) -> Float:
        """Length of the path that each point stands for, metres: points are not equally spaced, so means need it."""
        return lengths_between(self.distance_m)

    @property
    def mean_ground_m(self) -> float:
        """Mean ground along the path, above the vertical datum."""
        return float(np.average(self.ground_m, weights=self.weight_m))
