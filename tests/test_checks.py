"""The range checks: which values pass, and that the first wrong one is named."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from profiler.checks import check_profile, finite, not_negative, positive, within
from profiler.errors import InputError, MissingGroundError


@given(st.lists(st.floats(-1e9, 1e9), min_size=1), st.floats(-100, 0), st.floats(0, 100))
def test_what_is_inside_passes_unchanged_and_the_first_outside_is_named(values, low, high):
    outside = [value for value in values if not low <= value <= high]
    if outside:
        with pytest.raises(InputError, match=f"^x_m = {outside[0]:g}: must be some m$".replace("+", r"\+")):
            within("x_m", values, low, high, "some m")
    else:
        assert within("x_m", values, low, high, "some m").tolist() == values


def test_the_ends_of_each_range():
    assert not_negative("x", 0.0) == 0.0
    assert positive("x", 5e-324) > 0
    assert positive("k", np.inf, infinite=True) == not_negative("r_m", np.inf, infinite=True) == np.inf
    assert finite("x_db", -1e300, "dB") == -1e300
    for check, value in ((positive, 0.0), (positive, np.inf), (not_negative, -5e-324), (not_negative, np.inf)):
        with pytest.raises(InputError, match=f"x = {value:g}: must be finite and"):
            check("x", value)
    with pytest.raises(InputError, match="x_db = -inf: must be a finite number of dB"):
        finite("x_db", -np.inf, "dB")


@pytest.mark.parametrize("check", [positive, not_negative])
@pytest.mark.parametrize("infinite", [True, False])
def test_what_is_not_a_number_never_passes(check, infinite):
    with pytest.raises(InputError, match="x_m = nan: must be"):
        check("x_m", [1.0, np.nan], "m", infinite=infinite)


@pytest.mark.parametrize(
    ("distance", "message"),
    [([0.0], "two equal rows"), ([0, 1, 2], "two equal rows"), ([1, 2], "ascend from 0"), ([0, 0], "ascend from 0")],
)
def test_a_profile_is_two_equal_rows_that_ascend_from_site_a(distance, message):
    with pytest.raises(InputError, match=message):
        check_profile(distance, np.zeros(1 if len(distance) == 1 else 2))


@pytest.mark.parametrize("gap", [np.nan, np.inf])
def test_a_gap_in_a_profile_is_named_by_its_place(gap):
    with pytest.raises(MissingGroundError, match="no height at 700 m from A: must be known"):
        check_profile([0, 700, 900], [1, gap, gap])
