"""Read-only arrays, and the profile of a path made of them."""

from dataclasses import dataclass, field
from typing import Any, TypeVar, overload

import numpy as np
from numpy.typing import ArrayLike, NDArray

from profiler.units import Float

__all__ = ["Profile", "frozen_array", "lengths_between"]

_Kind = TypeVar("_Kind", bound=np.generic)


@overload
def frozen_array(values: ArrayLike) -> Float: ...
@overload
def frozen_array(values: ArrayLike, dtype: type[_Kind]) -> NDArray[_Kind]: ...
def frozen_array(values: ArrayLike, dtype: type[np.generic] = np.float64) -> NDArray[Any]:
    """Copy values into a read-only array, of float64 unless another kind is given.

    Examples
    --------
    >>> frozen_array([1, 2])
    array([1., 2.])
    >>> frozen_array([True, False], np.bool_).flags.writeable
    False
    """
    array = np.array(values, dtype=dtype)
    array.setflags(write=False)
    return array


def lengths_between(distance_m: ArrayLike) -> Float:
    """Length of the path that each point stands for, half of it to either neighbour: weights of a mean along the path.

    Examples
    --------
    >>> lengths_between([0.0, 10.0, 40.0]).tolist()
    [5.0, 20.0, 15.0]
    """
    half = 0.5 * np.diff(distance_m)
    return np.asarray(np.append(half, 0.0) + np.append(0.0, half))


@dataclass(frozen=True, slots=True, eq=False)
class Profile:
    """Ground and cover from A to B, all arrays (n,) and read-only.

    ``filled`` marks ground that was interpolated by the user's leave, ``surveyed`` ground that a survey replaced.
    """

    distance_m: Float
    longitude: Float
    latitude: Float
    ground_m: Float
    cover_m: Float
    filled: NDArray[np.bool_] = field(repr=False)
    surveyed: NDArray[np.bool_] = field(repr=False)

    @property
    def surface_m(self) -> Float:
        """Ground plus cover, above the vertical datum."""
        return self.ground_m + self.cover_m

    @property
    def weight_m(self) -> Float:
        """Length of the path that each point stands for, metres: points are not equally spaced, so means need it."""
        return lengths_between(self.distance_m)

    @property
    def mean_ground_m(self) -> float:
        """Mean ground along the path, above the vertical datum."""
        return float(np.average(self.ground_m, weights=self.weight_m))
