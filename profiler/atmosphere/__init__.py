"""What the air takes from a signal: gases line by line, rain, and the reference atmosphere where nobody measured.

"Pressure" of `gas_attenuation` and of an `Atmosphere` is that of the *dry* air, p, as Rec. ITU-R P.676 has it. A
barometer reads the total, p + e with e the vapour pressure: names with ``total`` mean that, and `dry_pressure` and
`local_atmosphere` convert. Outside the published ranges there are still numbers; `gas_warnings` says which.
"""

from profiler.atmosphere.air import Atmosphere, dry_pressure, local_atmosphere, reference_atmosphere
from profiler.atmosphere.along_ray import GasLoss, gas_along_ray
from profiler.atmosphere.gases import gas_attenuation
from profiler.atmosphere.rain import rain_attenuation, rain_coefficients
from profiler.atmosphere.ranges import gas_warnings

__all__ = [
    "Atmosphere",
    "GasLoss",
    "dry_pressure",
    "gas_along_ray",
    "gas_attenuation",
    "gas_warnings",
    "local_atmosphere",
    "rain_attenuation",
    "rain_coefficients",
    "reference_atmosphere",
]
