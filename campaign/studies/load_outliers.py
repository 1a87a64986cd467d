"""Magnitudes of a table that stand far from their neighbours in time."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np
from numpy.typing import NDArray

from campaign.model.columns import ObservationColumns
from campaign.model.ordering import by_group_and_time
from campaign.studies.load_known import KnownCheck
from campaign.studies.load_rows import CheckedRows

FloatArray = NDArray[np.float64]

OUTLIER_SIGMA = 5.0
_NEAR_D = 30.0
# Magnitudes scatter by as much for reasons that no error bar knows (common practice, no source).
_FLOOR_MAG = 0.005
_ROWS_AT_ONCE = 100_000


def outlying(rows: CheckedRows, columns: ObservationColumns, check: KnownCheck) -> NDArray[np.bool_]:
    """Which magnitudes are 5 sigma from both neighbours, on the same side.

    Parameters
    ----------
    rows, columns
        The same rows twice; ``bmjd_tdb`` in days, values in mag.
    check
        Has the observations around them that are known already.

    Returns
    -------
    ndarray of bool
        One for each row (dimensionless).

    Notes
    -----
    Accuracy: neighbours are the nearest magnitude before and after in the same system and band, within
    30 d; at either end of a light curve the two nearest, which must agree with each other to 5 sigma. An
    error is at least 0.005 mag; magnitudes without one, and limits, are not judged.

    Source: project convention.
    """
    far = np.zeros(rows.size, dtype=np.bool_)
    error = _sigma(columns)
    judged = np.flatnonzero(np.isfinite(error) & ~check.known & ~check.repeated)
    groups = _Groups(rows, columns, check)
    for some in _portions(rows.system, judged):
        group, known = groups.of(some)
        time = np.concatenate([columns.numbers["bmjd_tdb"][some], known[0]])
        value = np.concatenate([columns.numbers["value"][some], known[1]])
        sigma = np.concatenate([error[some], known[2]])
        far[some] = _far(time, value, sigma, group)[: some.size]
    return far


def _portions(system: NDArray[np.int32], rows: NDArray[np.intp]) -> Iterator[NDArray[np.intp]]:
    """The rows of some systems after the other, so that a large table does not fill the memory."""
    order = rows[np.argsort(system[rows], kind="stable")]
    edges = np.flatnonzero(np.diff(system[order])) + 1
    _, first = np.unique(edges // _ROWS_AT_ONCE, return_index=True)
    for some in np.split(order, edges[first]):
        if some.size:
            yield some


def _far(
    time: FloatArray, value: FloatArray, sigma: FloatArray, group: NDArray[np.int64]
) -> NDArray[np.bool_]:
    usable = np.flatnonzero(np.isfinite(sigma))
    order = usable[by_group_and_time(group[usable], time[usable])]
    t, m, s, g = time[order], value[order], sigma[order], group[order]
    # Distance to the neighbour `step` places on, in sigma; NaN where there is none near enough.
    after, after_too = _distances(t, m, s, g, 1), _distances(t, m, s, g, 2)
    before, before_too = _moved(-after, 1), _moved(-after_too, 2)
    step_after, step_before = _moved(after, -1), _moved(before, 1)
    with np.errstate(invalid="ignore"):
        inside = _both_far(before, after)
        at_begin = np.isnan(before) & _both_far(after, after_too) & (np.abs(step_after) < OUTLIER_SIGMA)
        at_end = np.isnan(after) & _both_far(before, before_too) & (np.abs(step_before) < OUTLIER_SIGMA)
    far = np.zeros(time.size, dtype=np.bool_)
    far[order[inside | at_begin | at_end]] = True
    return far


def _sigma(columns: ObservationColumns) -> FloatArray:
    minus, plus = columns.numbers.get("value_minus"), columns.numbers.get("value_plus")
    if minus is None or plus is None:
        return np.full(columns.size, np.nan)
    sigma = np.hypot(np.maximum(minus, plus), _FLOOR_MAG)
    if "limit_side" in columns.words:
        sigma = np.where(columns.words["limit_side"].codes >= 0, np.nan, sigma)
    return sigma


class _Groups:
    """A number for each system and band, of rows and of what is known around them."""

    def __init__(self, rows: CheckedRows, columns: ObservationColumns, check: KnownCheck) -> None:
        self._system = rows.system
        self._nearby = check.nearby
        bands, self._codes = [str(columns.same.get("band"))], np.zeros(columns.size, dtype=np.int32)
        if "band" in columns.words:
            bands, self._codes = list(columns.words["band"].words), columns.words["band"].codes
        self._number_of = {band: number for number, band in enumerate(bands)}
        self._width = len(bands) + 1

    def of(
        self, some: NDArray[np.intp]
    ) -> tuple[NDArray[np.int64], tuple[FloatArray, FloatArray, FloatArray]]:
        """Numbers of some rows, then of what is known of their systems; and time, value, error of that."""
        system = self._system[some].astype(np.int64)
        groups = [system * self._width + self._codes[some]]
        pieces: list[tuple[FloatArray, FloatArray, FloatArray]] = []
        for place in np.unique(system).tolist():
            known = self._nearby.get(place)
            if known is None:
                continue
            number = np.array([self._number_of.get(str(band), -1) for band in known.band])
            measured = np.array([side is None for side in known.limit_side], dtype=np.bool_)
            taken = (number >= 0) & measured
            sigma = np.hypot(np.maximum(known.value_minus, known.value_plus), _FLOOR_MAG)
            pieces.append((known.bmjd_tdb[taken], known.value[taken], sigma[taken]))
            groups.append(place * self._width + number[taken])
        if not pieces:
            return groups[0], (np.zeros(0), np.zeros(0), np.zeros(0))
        time, value, error = (np.concatenate(piece) for piece in zip(*pieces, strict=True))
        return np.concatenate(groups), (time, value, error)


def _distances(
    time: FloatArray, value: FloatArray, sigma: FloatArray, group: NDArray[np.int64], step: int
) -> FloatArray:
    """How far each magnitude is above the one ``step`` places later, in sigma of the difference."""
    found = np.full(time.size, np.nan)
    if time.size <= step:
        return found
    near = (group[step:] == group[:-step]) & (time[step:] - time[:-step] <= _NEAR_D)
    distance = (value[:-step] - value[step:]) / np.hypot(sigma[:-step], sigma[step:])
    found[:-step] = np.where(near, distance, np.nan)
    return found


def _moved(values: FloatArray, places: int) -> FloatArray:
    """Each value ``places`` later in the array; NaN comes in at the end that is left free."""
    moved = np.full(values.size, np.nan)
    if places > 0:
        moved[places:] = values[:-places] if values.size > places else []
    else:
        moved[:places] = values[-places:]
    return moved


def _both_far(one: FloatArray, other: FloatArray) -> NDArray[np.bool_]:
    return (np.abs(one) > OUTLIER_SIGMA) & (np.abs(other) > OUTLIER_SIGMA) & (one * other > 0.0)
