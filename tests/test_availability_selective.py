"""Selective fading by signature and space diversity: the printed branches, the limits and the directions."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from profiler.availability.diversity import (
    add_diversity_outages,
    amplitude_correlation,
    improvement_p530,
    protected_selective,
)
from profiler.availability.selective import mean_delay, multipath_activity, selective_percent
from profiler.errors import InputError

occurrences = st.floats(1e-3, 1000.0)
distances_m = st.floats(10e3, 150e3)
percents = st.floats(1e-8, 10.0)


def outage(occurrence_percent=10.0, distance_m=50e3, width_hz=30e6, deep_db=20.0, other_db=20.0, delay_s=6.3e-9):
    return float(
        selective_percent(
            occurrence_percent,
            distance_m,
            width_hz=width_hz,
            depth_minimum_phase_db=deep_db,
            depth_nonminimum_phase_db=other_db,
            delay_s=delay_s,
        )
    )


def test_selective_in_full():
    # Worked from P.530-17 §5.1 (from memory): 50 km, p0 = 10 %, W = 30 MHz, B = 20 and 26 dB, reference delay 6.3 ns.
    eta = 1 - np.exp(-0.2 * 0.1**0.75)
    ps = 2.15 * eta * 0.030 * (10**-1.0 + 10**-1.3) * 0.7**2 / 6.3
    assert outage(other_db=26.0) == pytest.approx(100 * ps, rel=1e-12)


@given(occurrences, distances_m, st.floats(1.1, 4.0))
def test_selective_goes_the_right_way(occurrence_percent, distance_m, times):
    base = outage(occurrence_percent, distance_m)
    assert outage(occurrence_percent * times, distance_m) >= base
    assert outage(occurrence_percent, distance_m, width_hz=30e6 * times) == pytest.approx(times * base)
    assert outage(occurrence_percent, distance_m * times) == pytest.approx(times**2.6 * base)
    assert outage(occurrence_percent, distance_m, delay_s=6.3e-9 * times) == pytest.approx(base / times)
    assert outage(occurrence_percent, distance_m, deep_db=26.0) < base


@given(st.floats(1e-9, 1e-3))
def test_activity_at_its_ends(occurrence_percent):
    # Little multipath: η → 0.2·P0^0.75; constant fading: never above 1.
    assert float(multipath_activity(occurrence_percent)) == pytest.approx(
        0.2 * (occurrence_percent / 100) ** 0.75, rel=1e-4
    )
    assert 0.99 < float(multipath_activity(1e4)) <= 1.0
    assert float(mean_delay(50e3)) == pytest.approx(0.7e-9)


def test_improvement_in_full():
    # Worked from P.530-17 §6.2 (from memory): S = 10 m, f = 6 GHz, d = 50 km, p0 = 10 %, A = 35 dB, V = 2 dB.
    exponent = -0.04 * 10**0.87 * 6**-0.12 * 50**0.48 * 10**-1.04
    found = improvement_p530(50e3, 6e9, 10.0, 35.0, occurrence_percent=10.0, gain_difference_db=-2.0)
    assert float(found) == pytest.approx((1 - np.exp(exponent)) * 10**3.3, rel=1e-12)


@given(st.floats(43e3, 150e3), st.floats(2e9, 11e9), st.floats(3.0, 20.0), st.floats(3.0, 300.0), st.floats(1.01, 2.0))
def test_improvement_goes_the_right_way(distance_m, frequency_hz, spacing_m, occurrence_percent, times):
    def improvement(spacing=spacing_m, fade_db=35.0, gain_db=0.0):
        where = (distance_m, frequency_hz, spacing, fade_db)
        return float(improvement_p530(*where, occurrence_percent=occurrence_percent, gain_difference_db=gain_db))

    assert improvement(spacing_m * times) > improvement() > improvement(gain_db=3.0)
    assert improvement(fade_db=45.0) == pytest.approx(10 * improvement())


def test_branches_of_the_correlations_meet():
    # The three pieces are printed with four digits: at r_w = 0.5 and 0.9628 and at k_ns² = 0.26 they must agree to
    # about that. A mistyped coefficient would show here.
    step = 1e-9
    (low, high), _ = amplitude_correlation(np.array([0.26 - step, 0.26 + step]))
    assert low == pytest.approx(high, abs=1e-3)
    k = np.linspace(0.26, 0.999999, 200_001)
    rw, uncorrelated = amplitude_correlation(k)
    for limit in (0.5, 0.9628):
        at = int(np.searchsorted(rw, limit))
        assert uncorrelated[at - 1] == pytest.approx(uncorrelated[at], abs=1e-3)


@given(st.floats(-20.0, 1.0), st.floats(-20.0, 1.0))
def test_correlated_antennas_leave_more(first, second):
    low, high = sorted((first, second))
    rw, uncorrelated = amplitude_correlation([low, high])
    assert rw[0] <= rw[1] + 1e-3
    assert uncorrelated[0] >= uncorrelated[1] - 1e-3  # the printed pieces miss each other by up to that
    assert ((uncorrelated >= 0) & (uncorrelated <= 0.1762 + 1e-3)).all()


@given(percents, occurrences, st.floats(1e-4, 1.0))
def test_diversity_never_harms_selective_fading(selective, occurrence_percent, improvement):
    left = protected_selective(
        selective,
        activity=multipath_activity(occurrence_percent),
        occurrence_percent=occurrence_percent,
        improvement_at_0_db=improvement,
    )
    assert 0 < left <= selective * (1 + 1e-12)


def test_fully_correlated_antennas_protect_nothing():
    left = protected_selective(0.01, activity=0.03, occurrence_percent=10.0, improvement_at_0_db=1e-30)
    assert float(left) == pytest.approx(0.01)


@given(percents, percents)
def test_joined_outage_is_over_the_sum_and_under_its_2_52(flat, selective):
    # Two equal parts: (2·x^0.75)^(4/3) = 2^(4/3)·x = 2.52·x, the largest excess there is over their sum of 2·x.
    joined = float(add_diversity_outages(flat, selective))
    assert flat + selective <= joined * (1 + 1e-12)
    assert joined <= 2 ** (1 / 3) * (flat + selective) * (1 + 1e-12)
    assert float(add_diversity_outages(flat, 0.0)) == pytest.approx(flat)


def test_what_is_refused():
    with pytest.raises(InputError, match="width_hz = 0: must be finite and more than 0 Hz"):
        outage(width_hz=0.0)
    with pytest.raises(InputError, match="spacing_m = -1: must be finite and more than 0 m"):
        improvement_p530(50e3, 6e9, -1.0, 35.0, occurrence_percent=10.0)
