"""The distinct values of a column, sorted.

What `np.unique` gives; but that asks about masked arrays, for which NumPy then loads a module that takes longer than a
tenth of a check does.
"""

from __future__ import annotations

from typing import TypeVar

import numpy as np
from numpy.typing import NDArray

Value = TypeVar("Value", bound=np.generic)


def distinct(values: NDArray[Value]) -> NDArray[Value]:
    """Return the distinct values, ascending; no NaN.

    >>> distinct(np.array([3, 1, 3])).tolist()
    [1, 3]
    """
    ordered = np.sort(values, axis=None)
    is_new = np.ones(len(ordered), dtype=bool)
    is_new[1:] = ordered[1:] != ordered[:-1]
    return ordered[is_new]


def distinct_with_places(values: NDArray[Value]) -> tuple[NDArray[Value], NDArray[np.intp]]:
    """Return the distinct values, ascending, and for each value (n) which of them it is.

    >>> distinct_with_places(np.array([3, 1, 3]))[1].tolist()
    [1, 0, 1]
    """
    found = distinct(values)
    return found, np.searchsorted(found, values)
