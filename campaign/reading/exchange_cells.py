"""Cells of exchanged tables: text or values to what the model holds, with every fault told."""

from __future__ import annotations

import math
import re
from collections.abc import Callable, Sequence
from typing import Any

from campaign.errors import InputRefused
from campaign.model.exchange_columns import Cell, ExchangeColumn
from campaign.model.exported import CellFault, ExchangeRow
from campaign.model.guarding import guarded
from campaign.reading.numbers import forbidden_character, read_number

_WHOLE = re.compile(r"[+-]?[0-9]{1,10}")
_MOST_POSITIVE, _MOST_NEGATIVE = 2**31 - 1, -(2**31)
_TRUTHS = {"true": True, "t": True, "false": False, "f": False}
_SHOWN = 200

Free = Callable[[str], str]


class Unfit(Exception):  # noqa: N818 - never leaves this module
    """Why a cell cannot be read."""

    def __init__(self, code: str, why: str) -> None:
        self.code = code
        self.why = why


class RowReader:
    """Reads rows of one table.

    Parameters
    ----------
    columns
        In the order of the table.
    free
        Undoes what the form of table did to the texts of a column.
    """

    def __init__(self, columns: Sequence[ExchangeColumn], free: Callable[[ExchangeColumn], Free]) -> None:
        self._names = [column.name for column in columns]
        self._from_text = [_text_reader(column, free(column)) for column in columns]
        self._from_value = [_value_reader(column) for column in columns]
        self._to_text = [_csv_writer(column, free(column)) for column in columns]

    def of_texts(self, line: int, texts: Sequence[str]) -> ExchangeRow:
        """A row of texts; an empty one is unknown."""
        if len(texts) != len(self._names):
            why = f"The row has {len(texts)} cells, the table {len(self._names)} columns."
            return misfit(line, texts, why)
        return self._row(line, tuple(texts), self._from_text, texts)

    def of_values(self, line: int, values: Sequence[Any]) -> ExchangeRow:
        """A row of values; None is unknown."""
        raw = tuple("" if value is None else str(value) for value in values)
        return self._row(line, raw, self._from_value, values)

    def as_csv(self, raw: Sequence[str]) -> tuple[str, ...]:
        """Cells of a row as they stood, as cells of CSV; a row of another length stays as it is."""
        if len(raw) != len(self._to_text):
            return tuple(raw)
        return tuple(write(text) for write, text in zip(self._to_text, raw, strict=True))

    def _row(
        self,
        line: int,
        raw: tuple[str, ...],
        readers: Sequence[Callable[[Any], Cell]],
        given: Sequence[Any],
    ) -> ExchangeRow:
        cells: dict[str, Cell] = {}
        faults = []
        for place, value in enumerate(given):
            if value is None or value == "":
                cells[self._names[place]] = None
                continue
            try:
                cells[self._names[place]] = readers[place](value)
            except Unfit as unfit:
                shown = raw[place][:_SHOWN]
                faults.append(CellFault(self._names[place], shown, unfit.code, unfit.why))
        return ExchangeRow(line, raw, cells, tuple(faults))


def misfit(line: int, raw: Sequence[str], why: str) -> ExchangeRow:
    """A row that does not fit the table at all."""
    fault = CellFault(None, ",".join(raw)[:_SHOWN], "row-misfit", why)
    return ExchangeRow(line, tuple(raw), {}, (fault,))


def _csv_writer(column: ExchangeColumn, free: Free) -> Free:
    return (lambda text: guarded(free(text))) if column.is_text else str


def _text_reader(column: ExchangeColumn, free: Free) -> Callable[[str], Cell]:
    if column.type == "number":
        return _number
    if column.type == "whole":
        return lambda text: _whole(int(text) if _WHOLE.fullmatch(text) else None)
    if column.type == "truth":
        return _truth
    check = _checked(column)
    return lambda text: check(free(text))


def _value_reader(column: ExchangeColumn) -> Callable[[Any], Cell]:
    if column.type == "number":
        return _number_value
    if column.type == "whole":
        return lambda value: _whole(value if type(value) is int else None)
    if column.type == "truth":
        return _truth_value
    check = _checked(column)

    def text_value(value: Any) -> Cell:
        if not isinstance(value, str):
            raise Unfit("cell-unreadable", "A text is expected.")
        return check(value)

    return text_value


def _number(text: str) -> float:
    try:
        return read_number(text)
    except InputRefused as refused:
        raise Unfit(refused.code, refused.why) from None


def _number_value(value: Any) -> float:
    if isinstance(value, int | float) and not isinstance(value, bool):
        try:
            if math.isfinite(value):
                return float(value)
        except OverflowError:  # a whole number beyond any float
            pass
    raise Unfit("number-unreadable", "A finite number is expected.")


def _whole(value: int | None) -> int:
    if value is None or not _MOST_NEGATIVE <= value <= _MOST_POSITIVE:
        raise Unfit(
            "number-unreadable", f"A whole number from {_MOST_NEGATIVE} to {_MOST_POSITIVE} is expected."
        )
    return value


def _truth(text: str) -> bool:
    found = _TRUTHS.get(text.casefold())
    if found is None:
        raise Unfit("word-unknown", "One of these is expected: true, false.")
    return found


def _truth_value(value: Any) -> bool:
    if not isinstance(value, bool):
        raise Unfit("word-unknown", "One of these is expected: true, false.")
    return value


def _checked(column: ExchangeColumn) -> Callable[[str], str]:
    if column.type == "word":
        return lambda text: _word(text, column.words)
    return lambda text: _plain(text, column.longest, column.is_prose)


def _word(text: str, words: Sequence[str]) -> str:
    if text not in words:
        raise Unfit("word-unknown", f"One of these is expected: {', '.join(words)}.")
    return text


def _plain(text: str, longest: int, is_prose: bool) -> str:
    if len(text) > longest:
        raise Unfit("text-too-long", f"At most {longest} characters are expected, not {len(text)}.")
    if not text.isprintable():
        found = forbidden_character(text.replace("\n", " ").replace("\t", " ") if is_prose else text)
        if found:
            raise Unfit("control-character", f"Visible characters are expected, but {found}.")
    return text
