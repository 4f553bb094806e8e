"""A small sample of scripts/exactness: studies against a dense calculation that shares no code with them."""

import importlib.util
import sys
from pathlib import Path

import numpy as np
import pytest

from profiler.terrain import open_terrain

SCRIPT = Path(__file__).resolve().parent.parent / "scripts" / "exactness.py"


@pytest.fixture(scope="module")
def exactness():
    spec = importlib.util.spec_from_file_location("exactness", SCRIPT)
    module = importlib.util.module_from_spec(spec)
    sys.modules["exactness"] = module
    spec.loader.exec_module(module)
    yield module
    del sys.modules["exactness"]


@pytest.fixture(scope="module")
def cases(exactness, tmp_path_factory):
    return {case.name: case for case in exactness.cases(tmp_path_factory.mktemp("exactness"))}


@pytest.mark.parametrize(
    "name", ["canyon, degrees", "canyon, UTM", "fault", "country and canopy", "canyon and classes", "canyon, highest"]
)
def test_studies_are_what_a_dense_calculation_finds(exactness, cases, name):
    case = cases[name]
    with open_terrain(case.terrain, method=case.method) as terrain:
        surpluses, losses = exactness.compare(case, terrain, 6, seed=7, length_m=(2e3, 15e3))
    assert surpluses.max() <= 1e-3
    assert np.abs(surpluses).max() <= exactness.WITHIN_M
    assert np.abs(losses).max() <= exactness.WITHIN_DB


def test_the_comparison_sees_what_half_a_cell_misses(exactness, cases):
    """Held against the points that a study had before, half a cell apart, the same comparison fails."""
    case = cases["canyon, degrees"]
    rng, worst = np.random.default_rng(7), 0.0
    for _ in range(6):
        hop = None
        while hop is None:
            hop = exactness.random_hop(case, rng, (2e3, 15e3))
        length_m = exactness.GEOD.inv(*hop.ends)[2]
        ends = exactness.centres(case, hop)
        coarse, fine = (
            exactness.surplus(
                hop, hop.rules[0], exactness.Dense.read(case, hop, np.arange(0.0, length_m, step)), ends, length_m
            )
            for step in (40.0, 1.0)
        )
        worst = max(worst, coarse.min() - fine.min())
    assert worst > exactness.WITHIN_M
