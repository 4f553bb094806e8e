"""What level a receiver needs: noise, modulation, bit error ratio, threshold.

Coherent detection in additive white Gaussian noise throughout: no fading, no interference, no phase noise. Bit error
ratios are inverted exactly (in closed form or by a bracketed root), never from a table.
"""

from profiler.receiver.modulation import bit_error_ratio, required_eb_n0_db
from profiler.receiver.noise import noise_density_dbm_hz
from profiler.receiver.threshold import Line, Threshold, mode_threshold

__all__ = [
    "Line",
    "Threshold",
    "bit_error_ratio",
    "mode_threshold",
    "noise_density_dbm_hz",
    "required_eb_n0_db",
]
