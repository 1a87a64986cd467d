"""Rows of one table that differ from each other in their value alone."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

import numpy as np
from numpy.typing import NDArray

from campaign.catalogue.bulk import OTHER_IDENTITY
from campaign.model.columns import ObservationColumns
from campaign.studies.load_known import SAME_TIME_D
from campaign.studies.load_rows import CheckedRows

_VALUES = ("value", "position_angle_deg")


def differing_in_value(rows: CheckedRows, columns: ObservationColumns) -> NDArray[np.bool_]:
    """Rows beside which the table has another value of the same thing at the same time.

    Parameters
    ----------
    rows, columns
        The same rows twice: as checked, and as columns (``bmjd_tdb`` in days, values in their unit).

    Returns
    -------
    ndarray of bool, shape (size,)
        Both rows of each pair of neighbours in time that are alike in system, site, band, photometric
        system and everything else that tells measurements apart, but not in value.

    Notes
    -----
    Accuracy: times within 1e-6 d are one time, as where rows are compared with the catalogue.

    Source: project convention.
    """
    marked = np.zeros(rows.size, dtype=np.bool_)
    time = columns.numbers["bmjd_tdb"]
    some = _with_neighbours(time)
    if not some.size:
        return marked
    keys = [key[some] for key in (rows.system, rows.site, *_identity(columns))]
    keys = [key for key in keys if not (key[:1] == key).all()]
    order = np.lexsort([time[some], *keys])
    near = np.diff(time[some][order]) <= SAME_TIME_D
    for key in keys:
        near &= _same(key, order)
    differs = np.zeros(len(near), dtype=np.bool_)
    for name in _VALUES:
        if name in columns.numbers:
            differs |= ~_same(columns.numbers[name][some], order)
    pairs = np.flatnonzero(near & differs)
    marked[some[order[pairs]]] = True
    marked[some[order[pairs + 1]]] = True
    return marked


def _with_neighbours(time: NDArray[np.float64]) -> NDArray[np.intp]:
    """Rows of a time at which there are others, of whatever system: few of a million."""
    order = np.argsort(time)
    near = np.diff(time[order]) <= SAME_TIME_D
    beside = np.zeros(len(time), dtype=np.bool_)
    beside[:-1] |= near
    beside[1:] |= near
    return order[beside]


def _identity(columns: ObservationColumns) -> Iterator[NDArray[Any]]:
    for name in ("band", "photometric_system", *OTHER_IDENTITY):
        if name in columns.words:
            yield columns.words[name].codes
        elif name in columns.wholes:
            yield columns.wholes[name]
        elif name in columns.numbers:
            yield columns.numbers[name]


def _same(column: NDArray[Any], order: NDArray[np.intp]) -> NDArray[np.bool_]:
    """Whether each row has what the next one in ``order`` has; unknown is unknown."""
    first, second = column[order[:-1]], column[order[1:]]
    same: NDArray[np.bool_] = first == second
    if column.dtype.kind == "f":
        same |= np.isnan(first) & np.isnan(second)
    return same
