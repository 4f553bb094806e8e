"""From the average year to the worst month and back: Rec. ITU-R P.841."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from profiler.checks import within
from profiler.units import Float

__all__ = ["worst_month_from_year", "year_from_worst_month"]

_Q1 = 2.85
_BETA = 0.13
_RAREST_PERCENT = (_Q1 / 12.0) ** (1.0 / _BETA)
_PLATEAU = _Q1 * 3.0**-_BETA
_LAST = np.log10(_PLATEAU) / np.log10(0.3)


def worst_month_from_year(percent: ArrayLike) -> Float:
    """Percent of the worst month from percent of the average year, pw = Q·p.

    Q = 12 for p under (Q1/12)^(1/β); Q1·p^−β up to 3 %; Q1·3^−β up to 30 %; then down to 1 at 100 %. Q1 = 2.85 and
    β = 0.13 are the values for global planning.

    Parameters
    ----------
    percent
        p, 0 to 100 % of the average year, any shape.

    Returns
    -------
    ndarray
        Percent of the average worst month.

    Examples
    --------
    >>> worst_month_from_year([0.0, 0.01, 100.0]).round(4).tolist()
    [0.0, 0.0519, 100.0]

    Notes
    -----
    Source: Rec. ITU-R P.841-6 (from memory; the global values have stood since its first editions).
    """
    p = within("percent", percent, 0, 100, "0 to 100 %")
    # each branch gets only what it is for, so that none overflows
    middle = _Q1 * np.clip(p, _RAREST_PERCENT, 3.0) ** -_BETA
    q = np.where(p < _RAREST_PERCENT, 12.0, middle) * (np.maximum(p, 30.0) / 30.0) ** _LAST
    return np.asarray(np.minimum(q * p, 100.0))


def year_from_worst_month(percent: ArrayLike) -> Float:
    """Percent of the average year from percent of the worst month: the inverse of `worst_month_from_year`.

    Examples
    --------
    >>> year_from_worst_month(worst_month_from_year([1e-6, 0.01, 10.0, 50.0])).round(8).tolist()
    [1e-06, 0.01, 10.0, 50.0]

    Notes
    -----
    Source: Rec. ITU-R P.841-6 (from memory); in its middle range this is the printed p = 0.30·pw^1.15.
    """
    pw = within("percent", percent, 0, 100, "0 to 100 %")
    rare, middle, plateau = 12.0 * _RAREST_PERCENT, 3.0 * _PLATEAU, 30.0 * _PLATEAU
    by_power = (np.clip(pw, rare, middle) / _Q1) ** (1.0 / (1.0 - _BETA))
    by_plateau = np.clip(pw, middle, plateau) / _PLATEAU
    by_last = 30.0 * (np.maximum(pw, plateau) / plateau) ** (1.0 / (1.0 + _LAST))
    return np.select([pw < rare, pw < middle, pw < plateau], [pw / 12.0, by_power, by_plateau], by_last)
