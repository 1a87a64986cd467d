"""Orders of many rows."""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

_FEW_GROUPS = 1 << 16


def by_group_and_time(group: NDArray[Any], time: NDArray[np.float64]) -> NDArray[np.intp]:
    """Places of rows group by group, in order of time within each, and as given where times are equal."""
    order = np.argsort(time)
    _as_given_where_equal(order, time[order])
    # Small numbers are put in order without comparing them.
    numbers = group
    if group.size and int(group.max()) - (least := int(group.min())) < _FEW_GROUPS:
        numbers = (group - least).astype(np.uint16)
    return order[np.argsort(numbers[order], kind="stable")]


def _as_given_where_equal(order: NDArray[np.intp], ordered: NDArray[np.float64]) -> None:
    """Put right what a fast order does with equal times; a stable one takes six times as long."""
    equal = np.flatnonzero(ordered[1:] == ordered[:-1])
    if not equal.size:
        return
    concerned = np.union1d(equal, equal + 1)
    places = order[concerned]
    order[concerned] = places[np.lexsort((places, ordered[concerned]))]
