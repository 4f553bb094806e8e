"""The Gaussian tail and its inverse against scipy (Cephes and Boost) and the printed table."""

import numpy as np
import pytest
from scipy.special import ndtr, ndtri

from profiler.errors import InputError
from profiler.normal import normal_quantile, normal_tail


def test_tail_and_quantile_agree_with_scipy_over_the_whole_range():
    score = np.linspace(-8, 37, 4001)
    # rounding x by one part in 2^53 changes exp(-x²/2) by x² such parts, in either of the two
    np.testing.assert_allclose(normal_tail(score), ndtr(-score), rtol=4 * 37**2 * 2.0**-53)
    probability = np.concatenate([np.logspace(-300, -1, 900), np.linspace(0.1, 0.9, 81), 1 - np.logspace(-1, -15, 60)])
    np.testing.assert_allclose(normal_quantile(probability), ndtri(probability), rtol=1e-14, atol=1e-15)


@pytest.mark.parametrize(
    ("percent", "score"), [("90", "1.2816"), ("95", "1.6449"), ("99", "2.3263"), ("99.9", "3.0902")]
)
def test_quantiles_as_printed(percent, score):
    """Abramowitz and Stegun, Handbook of Mathematical Functions, Table 26.5 (from memory), four decimals."""
    assert float(normal_quantile(float(percent) / 100)) == pytest.approx(float(score), abs=0.5e-4)


def test_one_is_the_inverse_of_the_other_in_any_shape():
    probability = np.array([[1e-12, 0.3], [0.5, 0.9]])
    np.testing.assert_allclose(normal_tail(-normal_quantile(probability)), probability, rtol=1e-13)
    assert normal_tail(0.0).shape == normal_quantile(0.5).shape == ()


@pytest.mark.parametrize("probability", [0.0, 1.0, -0.1, np.nan])
def test_probability_is_held_to_its_range(probability):
    with pytest.raises(InputError, match=r"probability = .*: must be above 0 and below 1"):
        normal_quantile([0.5, probability])
