"""Which rows of a table are in the catalogue already, or contradict what is there."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, field, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray
from sqlalchemy import Connection

from campaign.catalogue import bulk
from campaign.model.columns import KnownRows, ObservationColumns
from campaign.model.loading import LoadConflict
from campaign.model.systems import System
from campaign.studies.bands import photometric_system_key
from campaign.studies.load_rows import CheckedRows

# Times that differ by less are one time, however they were rounded.
SAME_TIME_D = 1e-6
# Light takes no longer from the Earth's orbit to the Sun, with a little room.
LIGHT_TIME_D = 0.006
# Neighbours of the first and last row count too.
_AROUND_D = 60.0
_NONE: NDArray[Any] = np.zeros(0)


@dataclass(slots=True, eq=False)
class KnownCheck:
    """What the catalogue says to checked rows.

    ``known`` and ``repeated`` mark rows that are there already, or stood earlier in the table,
    ``withdrawn`` those that somebody withdrew before. ``nearby``
    holds the observations around them, system by system: time, value, error, band and limit, the rest is
    empty. ``shifted`` holds pairs of a new row and how much later it is (days) than a known one that is like
    it in all but the time.
    """

    known: NDArray[np.bool_]
    repeated: NDArray[np.bool_]
    conflicts: list[LoadConflict] = field(default_factory=list)
    conflicting: set[int] = field(default_factory=set)
    nearby: dict[int, KnownRows] = field(default_factory=dict)
    shifted: list[tuple[int, float]] = field(default_factory=list)
    withdrawn: list[int] = field(default_factory=list)


def check_known(
    connection: Connection,
    rows: CheckedRows,
    columns: ObservationColumns,
    digests: NDArray[np.uint64],
    systems: Sequence[System],
    told: Callable[[int], None],
    own_operation: int | None = None,
) -> KnownCheck:
    """Compare checked rows with each other and with the catalogue.

    Parameters
    ----------
    connection
        To the catalogue, in the state in which the rows would be entered.
    rows, columns, digests
        The same rows three times: as checked, as columns (``bmjd_tdb`` in days), and their digests.
    systems
        Those that the rows refer to by place.
    told
        Called with the number of rows that are done.
    own_operation
        Number of the operation that brings them: what it brought before is no conflict.

    Returns
    -------
    KnownCheck
        Values in the unit of the kind; times in days.

    Notes
    -----
    Accuracy: times within 1e-6 d (0.09 s) are one time. A row conflicts with a known observation that is
    like it in system, time, band, site and everything else that tells measurements apart, but has another
    value; two different photometric systems are no conflict.

    Source: project convention.
    """
    check = KnownCheck(np.zeros(rows.size, dtype=np.bool_), _repeated(digests))
    if not rows.size or not bulk.holds_observations(connection):
        return check
    order = np.argsort(rows.system, kind="stable")
    edges = np.flatnonzero(np.diff(rows.system[order])) + 1
    details = _Details(columns)
    done = 0
    for some in np.split(order, edges):
        place = int(rows.system[some[0]])
        time = columns.numbers["bmjd_tdb"][some]
        known = bulk.known_rows(
            connection,
            systems[place].id,
            str(columns.same["kind"]),
            float(time.min()) - _AROUND_D,
            float(time.max()) + _AROUND_D,
        )
        if known.id.size:
            _mark_known(check, some, digests, known)
            _compare(check, some[~check.known[some]], rows, details, known, systems[place], own_operation)
            # What tells rows apart is no longer needed, and a million of them fill the memory.
            check.nearby[place] = replace(
                known,
                id=_NONE,
                position_angle_deg=_NONE,
                photometric_system=(),
                site_id=(),
                operation_id=(),
                other=(),
                sameness=(),
            )
        _mark_withdrawn(connection, check, some, columns, details, systems[place].id)
        done += len(some)
        told(done)
    return check


def _repeated(digests: NDArray[np.uint64]) -> NDArray[np.bool_]:
    """Rows that are the same as an earlier one."""
    repeated = np.zeros(len(digests), dtype=np.bool_)
    ordered = np.sort(digests[:, 0].astype(np.uint64))
    if not (ordered[1:] == ordered[:-1]).any():
        return repeated
    order = np.lexsort((digests[:, 1], digests[:, 0]))
    first, second = digests[order, 0], digests[order, 1]
    repeated[order[1:]] = (first[1:] == first[:-1]) & (second[1:] == second[:-1])
    return repeated


def _mark_known(
    check: KnownCheck, some: NDArray[np.int64], digests: NDArray[np.uint64], known: KnownRows
) -> None:
    there = {digest for digest in known.sameness if digest is not None}
    texts = digests[some].tobytes().hex()
    check.known[some] = [texts[at : at + 32] in there for at in range(0, len(texts), 32)]


def _mark_withdrawn(
    connection: Connection,
    check: KnownCheck,
    some: NDArray[np.int64],
    columns: ObservationColumns,
    details: _Details,
    system_id: int,
) -> None:
    """Rows of one system that are in the catalogue as withdrawn for a reason."""
    time, value = columns.numbers["bmjd_tdb"][some], columns.numbers["value"][some]
    gone = bulk.withdrawn_rows(
        connection,
        system_id,
        str(columns.same["kind"]),
        float(time.min()) - SAME_TIME_D,
        float(time.max()) + SAME_TIME_D,
    )
    for at, withdrawn_value, band in gone:
        alike = some[(np.abs(time - at) <= SAME_TIME_D) & (value == withdrawn_value)]
        check.withdrawn += [row for row in alike.tolist() if details.of("band", row) == band]


class _Details:
    """What tells a row from others, beside time and value, one row at a time."""

    def __init__(self, columns: ObservationColumns) -> None:
        self._columns = columns

    def of(self, name: str, row: int) -> Any:
        columns = self._columns
        if name in columns.words:
            words = columns.words[name]
            return words.words[words.codes[row]] if words.codes[row] >= 0 else None
        if name in columns.wholes:
            whole = int(columns.wholes[name][row])
            return whole if whole >= 0 else None
        if name in columns.numbers:
            number = float(columns.numbers[name][row])
            return None if np.isnan(number) else number
        return columns.same.get(name)

    def identity(self, row: int) -> tuple[Any, ...]:
        return tuple(self.of(name, row) for name in bulk.OTHER_IDENTITY)


def _compare(
    check: KnownCheck,
    new: NDArray[np.int64],
    rows: CheckedRows,
    details: _Details,
    known: KnownRows,
    system: System,
    own_operation: int | None,
) -> None:
    """Conflicts of new rows with known ones, and rows that are known ones at another time."""
    columns = details._columns
    time = columns.numbers["bmjd_tdb"][new]
    first = np.searchsorted(known.bmjd_tdb, time - LIGHT_TIME_D)
    last = np.searchsorted(known.bmjd_tdb, time + LIGHT_TIME_D)
    for place in np.flatnonzero(last > first).tolist():
        row = int(new[place])
        value = float(columns.numbers["value"][row])
        band, site, identity = details.of("band", row), details.of("site_id", row), details.identity(row)
        angle = details.of("position_angle_deg", row)
        own_system = photometric_system_key(details.of("photometric_system", row))
        for at in range(int(first[place]), int(last[place])):
            if known.band[at] != band or known.other[at] != identity:
                continue
            if known.operation_id[at] == own_operation:
                continue
            other_system = photometric_system_key(known.photometric_system[at])
            if own_system and other_system and own_system != other_system:
                continue
            later_d = float(time[place] - known.bmjd_tdb[at])
            known_value = float(known.value[at])
            is_alike = known_value == value and _same_angle(float(known.position_angle_deg[at]), angle)
            if abs(later_d) > SAME_TIME_D:
                if is_alike:
                    check.shifted.append((row, later_d))
            elif known.site_id[at] == site and not is_alike and row not in check.conflicting:
                check.conflicting.add(row)
                check.conflicts.append(
                    LoadConflict(
                        int(rows.line[row]), system.name, str(columns.same["kind"]), band, float(time[place]),
                        value, int(known.id[at]), known_value, str(columns.same["unit"]),
                    )
                )  # fmt: skip


def _same_angle(known_deg: float, angle_deg: float | None) -> bool:
    return bool(np.isnan(known_deg)) if angle_deg is None else known_deg == angle_deg
