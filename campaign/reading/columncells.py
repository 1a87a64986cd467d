"""Columns of cells as numbers, thousands at a time, by the very rules of ``campaign.reading.numbers``.

Cells that are plain numbers are turned over together; a cell that is anything else is read by itself, by
the reader that a single value has.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Collection, Sequence
from dataclasses import dataclass, field
from typing import Generic, TypeVar

import numpy as np
from numpy.typing import NDArray

from campaign.errors import InputRefused
from campaign.reading.numbers import MAX_NUMBER_LENGTH, MINUS_SIGN, read_number

FloatArray = NDArray[np.float64]

_PLAIN_BYTES = b"0123456789.+-eE \n"
_LONG_EXPONENT = re.compile(r"[eE][+-]?[0-9]{5}")
_DIGIT_BUT_ZERO = re.compile(r"[1-9]")


@dataclass(frozen=True, slots=True)
class CellFault:
    """The cell at ``place`` of a block cannot be used, and why."""

    place: int
    code: str
    why: str


@dataclass(slots=True)
class NumberCells:
    """Numbers of a column: NaN where a cell is empty or cannot be read; the latter are among ``faults``."""

    values: FloatArray
    faults: list[CellFault] = field(default_factory=list)


def read_numbers(cells: Sequence[str], name: str) -> NumberCells:
    """The numbers of a column.

    Parameters
    ----------
    cells
        As they stand; empty ones are unknown.
    name
        Of the column, for the reasons.
    """
    fast = plain_numbers(cells)
    if fast is not None:
        return NumberCells(fast)
    return _one_by_one(cells, name)


def plain_numbers(cells: Sequence[str]) -> FloatArray | None:
    """All cells as floats (empty: NaN), or None when a single one is not surely a plain number."""
    joined = "\n".join(cells)
    if not joined.isascii() or joined.encode("ascii").translate(None, _PLAIN_BYTES):
        return None
    if ("e" in joined or "E" in joined) and _LONG_EXPONENT.search(joined):
        return None
    # "nan" holds letters that no plain number has, so that it can stand for an empty cell.
    texts = [cell or "nan" for cell in cells] if "" in cells else cells
    try:
        values = np.fromiter(map(float, texts), dtype=np.float64, count=len(cells))
    except ValueError:
        return None
    if len(joined) > MAX_NUMBER_LENGTH and max(map(len, cells)) > MAX_NUMBER_LENGTH:
        return None
    if np.isinf(values).any():
        return None
    vanished = np.flatnonzero(values == 0.0)
    if vanished.size and any(_has_vanished(cells[place]) for place in vanished.tolist()):
        return None
    return values


def _has_vanished(cell: str) -> bool:
    """Whether a cell that reads as zero is too small a number rather than zero."""
    return _DIGIT_BUT_ZERO.search(re.split("[eE]", cell, maxsplit=1)[0]) is not None


def _one_by_one(cells: Sequence[str], name: str) -> NumberCells:
    values = np.full(len(cells), np.nan)
    faults = []
    known: dict[str, float | CellFault] = {}
    for place, cell in enumerate(cells):
        found = known.get(cell)
        if found is None:
            found = known[cell] = _number(cell, name)
        if isinstance(found, CellFault):
            faults.append(CellFault(place, found.code, found.why))
        else:
            values[place] = found
    return NumberCells(values, faults)


def _number(cell: str, name: str) -> float | CellFault:
    if not cell.strip(" "):
        return float("nan")
    try:
        return read_number(cell, name)
    except InputRefused as refused:
        return CellFault(0, refused.code, refused.why)


Word = TypeVar("Word")


class Vocabulary(Generic[Word]):
    """Gives each different cell of a column a number, and reads it once.

    ``read`` turns a cell into what it means; what it refuses is a fault of every row that has the cell.
    """

    def __init__(self, read: Callable[[str], Word]) -> None:
        self.words: list[Word] = []
        self._read = read
        self._numbers: dict[str, int] = {}
        self._same: dict[Word, int] = {}
        self._refused: dict[int, InputRefused] = {}

    def codes(self, cells: Sequence[str], faults: list[CellFault]) -> NDArray[np.int32]:
        """Number of the word in each cell; -1 where it is empty or refused."""
        numbers = self._numbers
        try:
            codes = np.fromiter(map(numbers.__getitem__, cells), dtype=np.int32, count=len(cells))
        except KeyError:
            for cell in set(cells):
                if cell not in numbers:
                    numbers[cell] = self._number(cell)
            codes = np.fromiter(map(numbers.__getitem__, cells), dtype=np.int32, count=len(cells))
        if self._refused and bool((codes < -1).any()):
            for place in np.flatnonzero(codes < -1).tolist():
                refused = self._refused[int(codes[place])]
                faults.append(CellFault(place, refused.code, refused.why or refused.message))
            codes[codes < -1] = -1
        return codes

    def _number(self, cell: str) -> int:
        text = cell.strip()
        if not text:
            return -1
        try:
            word = self._read(text)
        except InputRefused as refused:
            number = -2 - len(self._refused)
            self._refused[number] = refused
            return number
        if word not in self._same:
            self._same[word] = len(self.words)
            self.words.append(word)
        return self._same[word]


def without_missing(cells: Sequence[str], missing: Collection[str]) -> Sequence[str]:
    """The cells, with those empty that hold a word for what is not known."""
    if not missing:
        return cells
    return ["" if cell.strip() in missing else cell for cell in cells]


def decimal_text(cell: str) -> str:
    """A number as typed, with the plain minus and without spaces."""
    return cell.strip(" ").replace(MINUS_SIGN, "-")
