"""What the outage methods need to know of the path."""

from __future__ import annotations

import math
from dataclasses import dataclass

from profiler.errors import InputError
from profiler.models import Polarization

__all__ = ["PathFacts"]


@dataclass(frozen=True, slots=True)
class PathFacts:
    """The path in plain numbers.

    Attributes
    ----------
    distance_m
        Path length, more than 0 m.
    frequency_hz
        Carrier, more than 0 Hz.
    centre_a_m, centre_b_m
        Antenna centres above the vertical datum of the terrain, taken as above mean sea level.
    latitude
        Of the path's middle, -90 to 90 degrees.
    polarization
        ``"vertical"`` or ``"horizontal"``.
    mean_ground_m
        Mean bare ground along the path above the same datum; needed by P.530-18.
    ground_roughness_m
        Roughness of the path's own ground from `path_roughness`; needed by Vigants-Barnett where only the climate is
        named.
    median_k, median_loss_db
        The k at which the budget counts diffraction, and the loss that it counts; for the record, and to warn where the
        path is blocked.

    Examples
    --------
    >>> path = PathFacts(20e3, 7e9, 300.0, 500.0, latitude=45.0)
    >>> path.inclination_mrad, round(path.elevation_deg, 3)
    (10.0, 0.573)
    """

    distance_m: float
    frequency_hz: float
    centre_a_m: float
    centre_b_m: float
    latitude: float
    polarization: Polarization = "vertical"
    mean_ground_m: float | None = None
    ground_roughness_m: float | None = None
    median_k: float | None = None
    median_loss_db: float | None = None

    def __post_init__(self) -> None:
        for name, unit in (("distance_m", "m"), ("frequency_hz", "Hz")):
            value = getattr(self, name)
            if not 0 < value < math.inf:
                raise InputError(f"{name} = {value}: must be finite and more than 0 {unit}")
        for name in ("centre_a_m", "centre_b_m"):
            value = getattr(self, name)
            if not math.isfinite(value):
                raise InputError(f"{name} = {value}: must be a height in metres")
        if not -90 <= self.latitude <= 90:
            raise InputError(f"latitude = {self.latitude}: must be -90 to 90 degrees")

    @property
    def distance_km(self) -> float:
        """Path length in km, as the published formulas have it."""
        return self.distance_m / 1e3

    @property
    def frequency_ghz(self) -> float:
        """Carrier in GHz, as the published formulas have it."""
        return self.frequency_hz / 1e9

    @property
    def inclination_mrad(self) -> float:
        """Path inclination |εp| = |hB - hA|/d, mrad (Rec. ITU-R P.530 §2.3.1)."""
        return abs(self.centre_b_m - self.centre_a_m) / self.distance_km

    @property
    def elevation_deg(self) -> float:
        """Slope of the straight line between the antennas, degrees, always positive."""
        return math.degrees(math.atan2(abs(self.centre_b_m - self.centre_a_m), self.distance_m))

    @property
    def tilt_deg(self) -> float:
        """Tilt of the polarization from the horizontal, degrees (Rec. ITU-R P.838-3)."""
        return 90.0 if self.polarization == "vertical" else 0.0

    @property
    def lower_centre_m(self) -> float:
        """The lower antenna, hL."""
        return min(self.centre_a_m, self.centre_b_m)
