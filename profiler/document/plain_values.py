"""Results as values that JSON has words for."""

from __future__ import annotations

import math
from dataclasses import fields, is_dataclass
from pathlib import Path
from typing import Any

import numpy as np

from profiler.remarks import Note

__all__ = ["plain"]


def plain(value: Any) -> Any:
    """Turn dataclasses into dictionaries, arrays and tuples into lists, paths into text, however deep.

    A number that is not finite becomes None, since JSON has no word for it; a note is its text, in metres.

    Examples
    --------
    >>> from profiler.models import Rule
    >>> plain({"rule": Rule(k=1.0, fresnel_fraction=0.6), "at_m": np.array([0.0, np.nan])})
    {'rule': {'k': 1.0, 'fresnel_fraction': 0.6, 'margin_m': 0.0, 'label': ''}, 'at_m': [0.0, None]}
    """
    if is_dataclass(value) and not isinstance(value, type | Note):
        return {each.name: plain(getattr(value, each.name)) for each in fields(value)}
    if isinstance(value, dict):
        return {str(key): plain(each) for key, each in value.items()}
    if isinstance(value, tuple | list):
        return [plain(each) for each in value]
    if isinstance(value, np.ndarray | np.generic):
        return plain(value.tolist())
    if isinstance(value, float) and not math.isfinite(value):
        return None
    return str(value) if isinstance(value, Path | Note) else value
