"""The tables of a hop file and what each key may hold. The only module that uses pydantic, with `check` beside it.

Each class is one table, flat: the tables inside it are plain dictionaries that are checked in their turn, so that a hop
without a radio never pays for building the radio's schema. Numbers are in the unit of their key; `check` turns
``antenna_ft`` or ``frequency_ghz`` into the key that stands here. A key that is not given is None, and the defaults are
those of `profiler.models`.
"""

from __future__ import annotations

from typing import Annotated, Any, Literal

from pydantic import BaseModel, ConfigDict, Field

from profiler.models import (
    DiffractionMethod,
    FillPolicy,
    KPeriod,
    MultipathMethod,
    Obstruction,
    Polarization,
    SampleMethod,
    VigantsClimate,
)
from profiler.units import MINUTES_PER_YEAR

__all__ = [
    "AirTable",
    "AvailabilityTable",
    "ConfidenceTable",
    "CoverTable",
    "DiffractionTable",
    "DiversityTable",
    "HeightsTable",
    "HopTable",
    "ModeTable",
    "ObjectiveTable",
    "ObstacleTable",
    "PlaceTable",
    "RadioTable",
    "RuleTable",
    "RulesTable",
    "SignatureTable",
    "SiteTable",
    "Table",
    "TerminalTable",
    "TerrainTable",
    "TowerTable",
]

Raw = dict[str, Any]
Text = Annotated[str, Field(min_length=1, pattern=r"^[^\p{Cc}\p{Zl}\p{Zp}\u202a-\u202e\u2066-\u2069]+$")]
"""Text that is printed as it stands: nothing in it may steer a terminal, begin a line or turn the writing around."""
Height = Annotated[float, Field(ge=0, lt=2000)]


class Table(BaseModel):
    """One table: unknown keys, text for numbers, NaN and infinity are errors."""

    model_config = ConfigDict(extra="forbid", strict=True, allow_inf_nan=False, frozen=True, defer_build=True)


class HopTable(Table):
    """The top of the file."""

    name: Text | None = None
    frequency_hz: float = Field(ge=1e7, le=1e12)
    polarization: Polarization | None = None
    site_a: Raw
    site_b: Raw
    terrain: Raw
    rules: Raw | None = None
    diffraction: Raw | None = None
    cover: Raw | None = None
    radio: Raw | None = None
    air: Raw | None = None
    availability: Raw | None = None
    heights: Raw | None = None
    confidence: Raw | None = None


class PlaceTable(Table):
    """A position in one of its three forms."""

    position: str | None = None
    latitude: float | None = Field(None, ge=-90, le=90)
    longitude: float | None = Field(None, ge=-180, le=180)
    datum: Text | None = None
    easting: float | None = None
    northing: float | None = None
    epsg: int | None = Field(None, gt=0)


class SiteTable(PlaceTable):
    """``[site_a]``, ``[site_b]``."""

    name: Text | None = None
    antenna_m: float = Field(gt=0, lt=2000)
    ground_m: float | None = Field(None, ge=-500, le=9000)
    clearing_m: float | None = Field(None, ge=0, le=5000)


class TerrainTable(Table):
    """``[terrain]``."""

    paths: list[Text] = Field(min_length=1)
    method: SampleMethod | None = None
    spacing_m: float | None = Field(None, gt=0)
    missing: FillPolicy | None = None
    allow_mixed_datums: bool | None = None
    vertical_datum: Text | None = None
    height_unit: Text | None = None
    allow_network: bool | None = None
    voids_are_sea: bool | None = None


class RulesTable(Table):
    """``[rules]``."""

    preset: Text | None = None
    median_k: float | None = Field(None, ge=0.1, le=100)
    median_gradient_n_km: float | None = Field(None, gt=-157, le=1000)
    low_k: float | None = Field(None, ge=0.1, le=100)
    low_gradient_n_km: float | None = Field(None, gt=-157, le=1000)
    rule: list[Raw] | None = None


class RuleTable(Table):
    """``[[rules.rule]]``."""

    k: float | None = Field(None, ge=0.1, le=100)
    gradient_n_km: float | None = Field(None, gt=-157, le=1000)
    fresnel_fraction: float = Field(ge=0, le=10)
    margin_m: float | None = Field(None, ge=-100, le=1000)
    label: Text | None = None


class DiffractionTable(Table):
    """``[diffraction]``."""

    method: DiffractionMethod | None = None
    sea_fraction: float | None = Field(None, ge=0, le=1)


class CoverTable(Table):
    """``[cover]``."""

    canopy: list[Text] | None = None
    landcover: Text | None = None
    class_heights_m: dict[str, Height] | None = None
    obstacle: list[Raw] | None = None


class ObstacleTable(PlaceTable):
    """``[[cover.obstacle]]``: where along the path, or at which position, and how tall."""

    name: Text | None = None
    at_m: float | None = Field(None, ge=0)
    from_m: float | None = Field(None, ge=0)
    to_m: float | None = Field(None, ge=0)
    width_m: float | None = Field(None, ge=0)
    height_m: float = Field(ge=0, lt=2000)


class RadioTable(Table):
    """``[radio]``."""

    a: Raw
    b: Raw
    mode: list[Raw] | None = None
    losses: dict[Text, Annotated[float, Field(ge=0)]] | None = None


class TerminalTable(Table):
    """``[radio.a]``, ``[radio.b]``."""

    power_dbm: float
    line_loss_db: float | None = Field(None, ge=0)
    gain_dbi: float | None = None
    diameter_m: float | None = Field(None, gt=0)
    efficiency: float | None = Field(None, gt=0, le=1)
    model: Text | None = None


class ModeTable(Table):
    """``[[radio.mode]]``."""

    name: Text
    threshold_dbm: float | None = None
    power_dbm: float | None = None
    noise_figure_db: float | None = Field(None, ge=0)
    noise_temperature_k: float | None = Field(None, gt=0)
    bandwidth_hz: float | None = Field(None, gt=0)
    bit_rate_bps: float | None = Field(None, gt=0)
    modulation: Text | None = None
    bit_error_ratio: float | None = Field(None, gt=0, lt=0.5)
    coding_gain_db: float | None = Field(None, ge=0)
    implementation_loss_db: float | None = Field(None, ge=0)
    signature: Raw | None = None
    objective: Raw | None = None


class SignatureTable(Table):
    """``[radio.mode.signature]``."""

    width_hz: float = Field(gt=0)
    depth_minimum_phase_db: float
    depth_nonminimum_phase_db: float
    delay_s: float | None = Field(None, gt=0)


class AirTable(Table):
    """``[air]``."""

    pressure_hpa: float | None = Field(None, gt=0, le=1100)
    temperature_k: float | None = Field(None, ge=150, le=350)
    temperature_c: float | None = Field(None, ge=-120, le=75)
    vapour_g_m3: float | None = Field(None, ge=0, le=100)


class AvailabilityTable(Table):
    """``[availability]``."""

    multipath_method: MultipathMethod
    use_maps: bool | None = None
    rain_rate_mm_h: float | None = Field(None, ge=0, le=500)
    dn1_n_km: float | None = None
    terrain_roughness_m: float | None = Field(None, ge=0)
    geoclimatic_factor: float | None = Field(None, gt=0)
    dn75_n_km: float | None = None
    climate_factor: float | None = Field(None, gt=0)
    climate: VigantsClimate | None = None
    annual_temperature_k: float | None = Field(None, ge=150, le=350)
    annual_temperature_c: float | None = Field(None, ge=-120, le=75)
    k_percentiles: list[list[float]] | None = None
    k_period: KPeriod | None = None
    objective: Raw | None = None
    diversity: Raw | None = None


class ObjectiveTable(Table):
    """``[availability.objective]``."""

    worst_month_percent: float | None = Field(None, gt=0, lt=100)
    year_percent: float | None = Field(None, gt=0, lt=100)
    minutes_per_year: float | None = Field(None, gt=0, lt=MINUTES_PER_YEAR)
    severely_errored_seconds_ratio: float | None = Field(None, gt=0, lt=1)
    errored_seconds_ratio: float | None = Field(None, gt=0, lt=1)
    errored_threshold_offset_db: float | None = Field(None, ge=0, lt=100)


class DiversityTable(Table):
    """``[availability.diversity]``."""

    spacing_m: float = Field(gt=0)
    gain_difference_db: float | None = None


class HeightsTable(Table):
    """``[heights]``."""

    a: Raw | None = None
    b: Raw | None = None
    loss_limit_db: float | None = Field(None, ge=0)
    loss_k: float | None = Field(None, ge=0.1, le=100)
    loss_gradient_n_km: float | None = Field(None, gt=-157, le=1000)
    diversity_obstruction: Obstruction | None = None


class TowerTable(Table):
    """``[heights.a]``, ``[heights.b]``."""

    lowest_m: float | None = Field(None, gt=0, lt=2000)
    highest_m: float | None = Field(None, gt=0, lt=2000)
    step_m: float | None = Field(None, ge=0.01)
    taken_m: list[Annotated[float, Field(gt=0, lt=2000)]] | None = None
    taken_clearance_m: float | None = Field(None, ge=0, lt=2000)
    cost_per_m: float | None = Field(None, ge=0, le=1e9)
    threshold_m: float | None = Field(None, gt=0)
    threshold_cost: float | None = Field(None, ge=0, le=1e12)


class ConfidenceTable(Table):
    """``[confidence]``."""

    terrain_kind: Text | None = None
    terrain_sigma_m: float | None = Field(None, ge=0, le=100)
    terrain_rmse_m: float | None = Field(None, ge=0, le=100)
    terrain_le90_m: float | None = Field(None, ge=0, le=150)
    terrain_source: Text | None = None
    correlation_m: float | None = Field(None, ge=0, allow_inf_nan=True)
    covariance: Literal["exponential", "gaussian"] | None = None
    site_sigma_m: float | None = Field(None, ge=0, le=100)
    cover_sigma_m: float | None = Field(None, ge=0, le=100)
    cover_relative_sigma: float | None = Field(None, ge=0, le=1)
    cover_correlation_m: float | None = Field(None, ge=0, allow_inf_nan=True)
    minimum_chance_percent: float | None = Field(None, ge=50, lt=100)
    terrain_offset_sigma_m: float | None = Field(None, ge=0, le=100)
    step_m: float | None = Field(None, gt=0)
    vary_k: bool | None = None
    draws: int | None = Field(None, ge=100, le=1_000_000)
    seed: int | None = Field(None, ge=0)
