"""Whole columns of values past the guards of the column types, as safely as one by one and far faster.

Values that are surely good are looked at together; at the first doubt every value of the column goes
through its type, which converts it or refuses it.
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np
from numpy.typing import NDArray
from sqlalchemy import Column, Dialect, Table

from campaign.catalogue.types import (
    MOST_NEGATIVE_WHOLE,
    MOST_POSITIVE_WHOLE,
    Choice,
    Line,
    Prose,
    Real,
    ValueRefused,
    Whole,
)
from campaign.model.columns import Words

_FLOATS, _WHOLES, _TEXTS = {float}, {int}, {str}

# One cell a row. In arrays, NaN and whole numbers below zero stand for what is unknown; codes of words too.
Cells = Sequence[Any] | NDArray[Any] | Words


class Made(list[Any]):
    """Values that this program made just now, and which need no guard."""


def guarded_column(column: Column[Any], values: Cells) -> Sequence[Any]:
    """``values`` as the driver may have them.

    Raises
    ------
    ValueRefused
        ``details["row"]`` is the place of the value that the column must not hold.
    """
    if isinstance(values, Made):
        return values
    if isinstance(values, Words):
        return _guarded_words(column, values)
    if isinstance(values, np.ndarray):
        return _guarded_array(column, values)
    kind = column.type
    if isinstance(kind, Line | Prose) and _are_plain(values, kind.longest):
        return values
    types = set(map(type, values))
    given: Sequence[Any] = values
    if type(None) in types:
        types.discard(type(None))
        given = [value for value in values if value is not None]
    if not given:
        return values
    if isinstance(kind, Real):
        # A sum is finite only if each of its terms is.
        is_good = types == _FLOATS and math.isfinite(sum(given))
    elif isinstance(kind, Whole):
        is_good = types == _WHOLES and _fits(given)
    elif isinstance(kind, Line | Prose):
        is_good = types == _TEXTS and _are_plain(given, kind.longest)
    elif isinstance(kind, Choice):
        is_good = types == _TEXTS and set(given) <= set(kind.words)
    else:
        is_good = False
    return values if is_good else _one_by_one(column, values)


def _are_plain(values: Sequence[Any], longest: int) -> bool:
    """Whether all of them are texts that a column of texts may hold; no when it is not sure."""
    try:
        together = "".join(values)
    except TypeError:
        return False
    return together.isprintable() and max(map(len, values), default=0) <= longest


def _guarded_array(column: Column[Any], values: NDArray[Any]) -> Sequence[Any]:
    kind = column.type
    is_number = values.dtype == np.float64
    unknown = np.isnan(values) if is_number else values < 0
    if is_number:
        is_good = isinstance(kind, Real) and not np.isinf(values).any()
    else:
        is_good = isinstance(kind, Whole) and (not values.size or int(values.max()) <= MOST_POSITIVE_WHOLE)
    found: list[Any] = values.tolist()
    if unknown.any():
        for place in np.flatnonzero(unknown).tolist():
            found[place] = None
    return found if is_good else _one_by_one(column, found)


def _guarded_words(column: Column[Any], values: Words) -> Sequence[Any]:
    """The different words pass the guards, and each row takes its own."""
    if len(values.words) > len(values.codes):
        words = values.words
        return guarded_column(column, [None if code < 0 else words[code] for code in values.codes.tolist()])
    different = np.empty(len(values.words) + 1, dtype=object)
    different[-1] = None
    try:
        different[:-1] = guarded_column(column, list(values.words))
    except ValueRefused:
        # Perhaps no row has the word that is refused; else the row is told.
        different[:-1] = values.words
        return _one_by_one(column, different[values.codes].tolist())
    found: list[Any] = different[values.codes].tolist()
    return found


def _fits(numbers: Sequence[int]) -> bool:
    return min(numbers) >= MOST_NEGATIVE_WHOLE and max(numbers) <= MOST_POSITIVE_WHOLE


def _one_by_one(column: Column[Any], values: Sequence[Any]) -> list[Any]:
    convert = getattr(column.type, "process_bind_param", None)
    if convert is None:
        return list(values)
    converted = []
    for place, value in enumerate(values):
        try:
            converted.append(convert(value, None))
        except ValueRefused as refusal:
            refusal.details.update(row=place, column=column.name, table=column.table.name)
            raise
    return converted


def guarded_columns(
    table: Table[Any], block: Mapping[str, Cells]
) -> tuple[dict[str, int], list[Sequence[Any]]]:
    """Guarded columns, each list once, and which of them holds the values of each name.

    Raises
    ------
    ValueRefused
    """
    places: dict[str, int] = {}
    columns: list[Sequence[Any]] = []
    seen: dict[tuple[int, type], int] = {}
    for name, values in block.items():
        column = table.c[name]
        same = (id(values), type(column.type))
        if same not in seen or not isinstance(column.type, Real):
            seen[same] = len(columns)
            columns.append(guarded_column(column, values))
        places[name] = seen[same]
    return places, columns


def insertion(
    dialect: Dialect, table: Table[Any], places: Mapping[str, int], same: Mapping[str, Any], rows: int = 1
) -> str:
    """The statement that inserts columns by place and writes out ``same``, which passed its types.

    Where the driver knows no places, each name needs a value of its own, in the order of ``places``; else
    the values of ``rows`` rows follow each other.
    """
    quote = dialect.identifier_preparer.quote
    by_number = dialect.paramstyle == "qmark"
    written = {
        name: _literal(value, by_number=by_number) for name, value in same.items() if value is not None
    }
    columns = ", ".join(quote(name) for name in (*places, *written))
    width = max(places.values()) + 1
    values = []
    for row in range(rows):
        marks = [f"?{row * width + place + 1}" if by_number else "%s" for place in places.values()]
        values.append(f"({', '.join([*marks, *written.values()])})")
    # The whole transaction is given up at an error: SQLite need not be ready to take back one statement.
    verb = "INSERT" if rows == 1 else "INSERT OR FAIL"
    return f"{verb} INTO {quote(table.name)} ({columns}) VALUES {', '.join(values)}"


def _literal(value: Any, *, by_number: bool) -> str:
    """A value in SQL. The driver would bind it again for each of a million rows."""
    if isinstance(value, str):
        text = value.replace("'", "''")
        return f"'{text}'" if by_number else f"'{text.replace('%', '%%')}'"
    if isinstance(value, bool) or not isinstance(value, int | float):
        raise TypeError(f"{value!r} has no form in a statement")
    return repr(value)
