"""Shared by all tests: the hypothesis profile and where the published data lies."""

from pathlib import Path

import pytest
from hypothesis import settings

settings.register_profile("repeatable", derandomize=True, deadline=None, max_examples=60)
settings.load_profile("repeatable")

ROOT = Path(__file__).resolve().parent.parent


def _data(folder: str) -> Path:
    path = ROOT.parent / "shared" / folder
    if not path.is_dir():
        pytest.skip(f"no {folder} data beside the project (../shared/{folder})")
    return path


@pytest.fixture
def reference() -> Path:
    """Find the published values: ../shared/reference from the project's root."""
    return _data("reference")


@pytest.fixture
def real_terrain() -> Path:
    """Find the real terrain: ../shared/terrain from the project's root."""
    return _data("terrain")
