"""Slow functions of time at whole days, from which many instants are read off.

Series of a thousand terms take 20 us an instant, and a survey has thousands of instants in the same few
days. The value at an instant depends on that instant alone, whatever else is asked for in the same call.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

# Up to so many days an instant, marking them is faster than sorting.
_MARKED_PER_INSTANT = 16


def needed_days(day: NDArray[np.int64], first: int, last: int) -> NDArray[np.int64]:
    """Which whole days a set of instants needs.

    Parameters
    ----------
    day : ndarray of int64, shape (n,)
        Whole part of each instant, days.
    first, last : int
        Each instant needs the days from ``day + first`` to ``day + last``.

    Returns
    -------
    ndarray of int64
        Those days, each once, in ascending order.

    Notes
    -----
    Accuracy: exact.

    Source: project convention.

    Examples
    --------
    >>> needed_days(np.array([7, 3, 7]), 0, 1).tolist()
    [3, 4, 7, 8]
    """
    if not day.size:
        return np.zeros(0, dtype=np.int64)
    low = int(day.min())
    width = int(day.max()) - low + 1
    if width > _MARKED_PER_INSTANT * day.size + 1000:
        distinct = np.unique(day)
        return np.unique(np.concatenate([distinct + step for step in range(first, last + 1)]))
    marked = np.zeros(width + last - first, dtype=np.bool_)
    for step in range(last - first + 1):
        marked[day + (step - low)] = True
    return np.flatnonzero(marked).astype(np.int64) + (low + first)
