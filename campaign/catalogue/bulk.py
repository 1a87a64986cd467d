"""Observations by the hundred thousand: the same rows and digests as one by one, column by column."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping, Sequence
from hashlib import blake2b
from math import isnan
from typing import Any

import numpy as np
from numpy.typing import NDArray
from sqlalchemy import Connection, and_, select

from campaign.catalogue.converting import columns_of
from campaign.catalogue.guards import Cells, Made
from campaign.catalogue.observations import SAMENESS
from campaign.catalogue.sources import source_id
from campaign.catalogue.store import Writing
from campaign.catalogue.tables import observations
from campaign.model.columns import KnownRows, ObservationColumns, Words
from campaign.model.ordering import by_group_and_time

# How many rows go to the driver at once; Ctrl-C is heard between two blocks.
_BLOCK_ROWS = 20_000
# From so many rows on they are put in an order that the indexes like; below, in that of the table.
_SORTED_FROM = 20_000
_ORDERED_ROWS = 60_000
_CACHE_KIB = 65_536
# Above, numbers of groups are made small again, before they overflow.
_MOST_GROUPS = 1 << 30
# What a row has where nothing is said.
_DEFAULTS = {"quality": "good", "text": ""}
# What tells two observations of one system, time, band and site apart, beside the value.
OTHER_IDENTITY = (
    "unit", "limit_side", "frequency_ghz", "energy_low_kev", "energy_high_kev", "star", "species", "feature",
    "measured_at", "shell_index",
)  # fmt: skip
_KNOWN_COLUMNS = (
    "id", "bmjd_tdb", "value", "value_minus", "value_plus", "position_angle_deg", "limit_side", "band",
    "photometric_system", "site_id", "sameness", "operation_id", *OTHER_IDENTITY,
)  # fmt: skip
_DIGEST_BYTES = 16
# The columns of a digest that come before the value: many rows are alike in them.
_GROUPED = SAMENESS[: SAMENESS.index("value")]


def digests_of(columns: ObservationColumns) -> NDArray[np.uint64]:
    """The digest of each row, as ``sameness`` of a row that is entered alone.

    Only for observations with a value.

    Returns
    -------
    ndarray of uint64, shape (size, 2)
        Both halves of each digest, big-endian.
    """
    prefixes, group = _prefixes(columns)
    # What rows of a group have in common goes into the hash once; each row takes it up from there.
    begun = {
        number: blake2b(prefix.encode("utf-8", "backslashreplace"), digest_size=_DIGEST_BYTES)
        for number, prefix in prefixes.items()
    }
    found = np.empty((columns.size, 2), dtype=">u8")
    for start in range(0, columns.size, _BLOCK_ROWS):
        part = slice(start, start + _BLOCK_ROWS)
        digests = []
        for number, end in zip(group[part].tolist(), _ends(columns, part), strict=True):
            hashing = begun[number].copy()
            hashing.update(end)
            digests.append(hashing.digest())
        found[part] = np.frombuffer(b"".join(digests), dtype=">u8").reshape(-1, 2)
    return found


def _ends(columns: ObservationColumns, part: slice) -> Iterator[bytes]:
    """Value, position angle and time of some rows, as the digest has them."""
    numbers = columns.numbers["value"][part]
    values = numbers.tolist()
    times = columns.numbers["bmjd_tdb"][part].tolist()
    if "position_angle_deg" not in columns.numbers:
        different = set(values)
        # Zero has two forms, which are equal.
        if 0.0 not in different and len(different) < len(values) // 4:
            text = {value: b"\x1f%r\x1fNone\x1f" % value for value in different}
            return (b"%b%.8f" % (text[value], time) for value, time in zip(values, times, strict=True))
        return (b"\x1f%r\x1fNone\x1f%.8f" % pair for pair in zip(values, times, strict=True))
    angles = (None if isnan(each) else each for each in columns.numbers["position_angle_deg"][part].tolist())
    return (b"\x1f%r\x1f%r\x1f%.8f" % triple for triple in zip(values, angles, times, strict=True))


def _prefixes(columns: ObservationColumns) -> tuple[dict[int, str], NDArray[np.int64]]:
    """The texts of the columns before the value, each different set by a number, and which a row has."""
    group = np.zeros(columns.size, dtype=np.int64)
    most = 0
    parts: list[Any] = []
    for name in _GROUPED:
        words, codes = _distinct(columns, name)
        parts.append((words, codes))
        if codes is not None:
            group = group * (len(words) + 1) + codes + 1
            most = (most + 1) * (len(words) + 1)
            if most > _MOST_GROUPS:
                group = np.unique(group, return_inverse=True)[1]
                most = columns.size
    if most > 4 * columns.size:
        group = np.unique(group, return_inverse=True)[1]
        most = columns.size
    # Any row of a group speaks for all of them.
    speaker = np.full(most + 1, -1)
    speaker[group] = np.arange(columns.size)
    prefixes = {}
    for number in np.flatnonzero(speaker >= 0).tolist():
        row = int(speaker[number])
        values = [
            words[0] if codes is None else (words[codes[row]] if codes[row] >= 0 else None)
            for words, codes in parts
        ]
        prefixes[number] = "\x1f".join(repr(_as_compared(value)) for value in values)
    return prefixes, group


def _distinct(columns: ObservationColumns, name: str) -> tuple[Sequence[Any], NDArray[np.int64] | None]:
    """The different values of a column and which one each row has (-1: none); None when all are alike."""
    if name in columns.words:
        return columns.words[name].words, columns.words[name].codes.astype(np.int64)
    if name in columns.wholes:
        values, codes = np.unique(columns.wholes[name], return_inverse=True)
        return values.tolist(), np.where(columns.wholes[name] < 0, -1, codes)
    if name in columns.numbers:
        values, codes = np.unique(columns.numbers[name], return_inverse=True)
        return values.tolist(), np.where(np.isnan(columns.numbers[name]), -1, codes)
    return [columns.same.get(name)], None


def _as_compared(value: Any) -> Any:
    return float(value) if isinstance(value, int | float) else value


def known_rows(
    connection: Connection, system_id: int, kind: str, from_bmjd_tdb: float, until_bmjd_tdb: float
) -> KnownRows:
    """Observations in use of one system and kind within a range of time."""
    columns = observations.c
    rows = connection.execute(
        select(*columns_of(observations, _KNOWN_COLUMNS))
        .where(
            and_(
                columns.system_id == system_id,
                columns.kind == kind,
                columns.bmjd_tdb.between(from_bmjd_tdb, until_bmjd_tdb),
                columns.superseded_at.is_(None),
                columns.withdrawn_at.is_(None),
            )
        )
        .order_by(columns.bmjd_tdb, columns.id)
    ).all()
    cells: list[Sequence[Any]] = list(zip(*rows, strict=True)) or [()] * len(_KNOWN_COLUMNS)
    time, value, minus, plus, angle = (np.array(cells[place], dtype=np.float64) for place in range(1, 6))
    return KnownRows(
        id=np.array(cells[0], dtype=np.int64),
        bmjd_tdb=time,
        value=value,
        value_minus=minus,
        value_plus=plus,
        position_angle_deg=angle,
        limit_side=cells[6],
        band=_as_one(cells[7]),
        photometric_system=_as_one(cells[8]),
        site_id=cells[9],
        sameness=cells[10],
        operation_id=cells[11],
        other=list(zip(*cells[12:], strict=True)),
    )


def _as_one(words: Sequence[str | None]) -> list[str | None]:
    """The same few words, each kept in memory once."""
    kept: dict[str | None, str | None] = {}
    return [kept.setdefault(word, word) for word in words]


def withdrawn_rows(
    connection: Connection, system_id: int, kind: str, from_bmjd_tdb: float, until_bmjd_tdb: float
) -> list[tuple[float, float, str | None]]:
    """Time, value and band of observations that somebody withdrew for a reason, within a range of time.

    What went out of use because its command was taken back is not among them.
    """
    columns = observations.c
    rows = connection.execute(
        select(columns.bmjd_tdb, columns.value, columns.band).where(
            columns.system_id == system_id,
            columns.kind == kind,
            columns.bmjd_tdb.between(from_bmjd_tdb, until_bmjd_tdb),
            columns.withdrawn_why.is_not(None),
        )
    )
    return [(time, value, band) for time, value, band in rows if value is not None]


def holds_observations(connection: Connection) -> bool:
    """Whether there is any observation at all."""
    return connection.execute(select(observations.c.id).limit(1)).first() is not None


def add_columns(
    writing: Writing,
    columns: ObservationColumns,
    digests: NDArray[np.uint64],
    rows: NDArray[np.int64],
    told: Callable[[int], None],
) -> int:
    """Enter the chosen ``rows`` of ``columns``, and return their number.

    Parameters
    ----------
    digests
        Of all rows, by :func:`digests_of`.
    rows
        Places of those to enter; none of them is in the catalogue, and no two are the same.
    told
        Called with the number of rows that are in, block by block.
    """
    if not len(rows):
        return 0
    if writing.connection.dialect.name == "sqlite":
        # The indexes of a million rows do not fit the cache that one observation needs.
        writing.connection.exec_driver_sql(f"PRAGMA cache_size = -{_CACHE_KIB}")
    same = {name: value for name, value in columns.same.items() if name != "source" and value is not None}
    numbered = columns.words
    sources: Sequence[int | None] = ()
    if "source" in numbered:
        words = numbered["source"].words
        used = set(np.unique(numbered["source"].codes[rows]).tolist())
        sources = [source_id(writing, word) if place in used else None for place, word in enumerate(words)]
    elif columns.same.get("source"):
        same["source_id"] = source_id(writing, columns.same["source"])
    same["entered_at"] = writing.at
    for name, default in _DEFAULTS.items():
        if name not in numbered:
            same.setdefault(name, default)
    blocks = _blocks(writing, columns, digests, _in_order(columns, digests, rows), sources, told)
    return writing.insert_columns(observations, same, blocks)


def _in_order(
    columns: ObservationColumns, digests: NDArray[np.uint64], rows: NDArray[np.int64]
) -> NDArray[np.int64]:
    """Rows by system and time, so that a light curve lies together; within a block by digest.

    The index of digests is entered at random places. Taken in order, many of a block fall on one page of it,
    which halves its cost.
    """
    if len(rows) < _SORTED_FROM:
        return rows
    time = columns.numbers["bmjd_tdb"][rows]
    system = columns.wholes["system_id"][rows] if "system_id" in columns.wholes else np.zeros(len(rows), int)
    ordered = rows[by_group_and_time(system, time)]
    firsts = digests[:, 0].astype(np.uint64)
    for start in range(0, len(ordered), _ORDERED_ROWS):
        part = ordered[start : start + _ORDERED_ROWS]
        ordered[start : start + _ORDERED_ROWS] = part[np.argsort(firsts[part])]
    return ordered


def _blocks(
    writing: Writing,
    columns: ObservationColumns,
    digests: NDArray[np.uint64],
    rows: NDArray[np.int64],
    sources: Sequence[int | None],
    told: Callable[[int], None],
) -> Iterator[Mapping[str, Cells]]:
    # As arrays they can be taken in another order without a look at each.
    texts = {name: np.array(values, dtype=object) for name, values in columns.texts.items()}
    for start in range(0, len(rows), _BLOCK_ROWS):
        told(start)
        part = rows[start : start + _BLOCK_ROWS]
        block: dict[str, Cells] = {}
        if "uid" not in columns.texts:
            block["uid"] = Made(writing.new_uids(len(part)))
        made: dict[int, NDArray[np.float64]] = {}
        for name, numbers in columns.numbers.items():
            # Equal errors of both sides are one column, which is bound once.
            if id(numbers) not in made:
                made[id(numbers)] = numbers[part]
            block[name] = made[id(numbers)]
        for name, wholes in columns.wholes.items():
            block[name] = wholes[part]
        for name, words in columns.words.items():
            codes = words.codes[part]
            if name == "source":
                block["source_id"] = _looked_up([*sources, None], codes)
            elif name in _DEFAULTS:
                block[name] = _looked_up([*words.words, _DEFAULTS[name]], codes)
            else:
                block[name] = Words(words.words, codes)
        for name, values in texts.items():
            block[name] = values[part].tolist()
        hexadecimal = digests[part].tobytes().hex()
        block["sameness"] = Made(hexadecimal[at : at + 32] for at in range(0, len(hexadecimal), 32))
        yield block
    told(len(rows))


def _looked_up(words: Sequence[Any], codes: NDArray[np.int32]) -> list[Any]:
    """The words of some codes; -1 is the last of them."""
    return [words[code] for code in codes.tolist()]
