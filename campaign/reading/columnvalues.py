"""Columns of measured values, errors and words of observations, by the rules for single ones."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray

from campaign.errors import InputRefused
from campaign.model.measured import Limit, Range
from campaign.reading.columncells import CellFault, plain_numbers, read_numbers
from campaign.reading.expected import Expected
from campaign.reading.numbers import check_plain_text, quoted, refusal
from campaign.reading.units import unit_factor
from campaign.reading.values import read_measured_or_bound

FloatArray = NDArray[np.float64]

ABOVE, BELOW = 1, -1
# How tables mark a limit; for a magnitude ">" is "fainter than" (common practice, no source).
_LIMIT_MARKS = {">": "above", ">=": "above", "≥": "above", "above": "above", "<": "below", "<=": "below",
                "≤": "below", "below": "below", "=": "measured", "0": "measured"}  # fmt: skip
# The longest text of each field of words, as at the terminal.
_LONGEST = {
    "band": 24, "photometric_system": 40, "comparison_star": 120, "species": 60, "feature": 60,
    "observer": 120, "instrument": 120, "source": 400, "text": 2000,
}  # fmt: skip
_CHOICES: Mapping[str, Mapping[str, str]] = {
    "star": {"a": "A", "b": "B"},
    "measured_at": {"edge": "edge", "peak": "peak"},
    "quality": {"good": "good", "doubtful": "doubtful", "bad": "bad"},
    "limit": _LIMIT_MARKS,
}


@dataclass(slots=True)
class ValueCells:
    """Values of a block: NaN where a cell is empty; errors NaN where unknown; ``side`` 0 where no limit."""

    value: FloatArray
    minus: FloatArray
    plus: FloatArray
    side: NDArray[np.int8]
    faults: list[CellFault] = field(default_factory=list)


def read_values(cells: Sequence[str], expected: Expected, unit: str | None) -> ValueCells:
    """The values of a column in the canonical unit, with their errors where the cells hold them.

    Parameters
    ----------
    cells
        As they stand: ``7.31``, ``7.31±0.03``, ``>12.1``; empty ones are unknown.
    expected
        The canonical unit, the name of the column, and where values may lie.
    unit
        Of the column, where cells do not say it.
    """
    size = len(cells)
    found = ValueCells(
        np.full(size, np.nan), np.full(size, np.nan), np.full(size, np.nan), np.zeros(size, dtype=np.int8)
    )
    plain = plain_numbers(cells)
    if plain is None:
        _read_alone(cells, expected, unit, found)
        return found
    found.value = plain * factor_of(unit, expected) if unit else plain
    with np.errstate(invalid="ignore"):
        outside = _outside(found.value, expected)
    for place in np.flatnonzero(outside).tolist():
        found.faults.append(_out_of_range(place, cells[place], expected))
    return found


def factor_of(unit: str | None, expected: Expected) -> float:
    """What to multiply the numbers of a column by."""
    return unit_factor(unit or "", expected.unit, expected.name, unit or "", expected.example())


def _outside(values: FloatArray, expected: Expected) -> NDArray[np.bool_]:
    outside = np.zeros(values.shape, dtype=np.bool_)
    if expected.low is not None:
        outside |= (values <= expected.low) if expected.low_open else (values < expected.low)
    if expected.high is not None:
        outside |= (values >= expected.high) if expected.high_open else (values > expected.high)
    return outside


def _out_of_range(place: int, cell: str, expected: Expected) -> CellFault:
    return CellFault(place, "out-of-range", f"{quoted(cell)} is not {expected.in_words()}.")


def _read_alone(cells: Sequence[str], expected: Expected, unit: str | None, found: ValueCells) -> None:
    known: dict[str, tuple[float, float, float, int] | CellFault] = {}
    for place, cell in enumerate(cells):
        read = known.get(cell)
        if read is None:
            read = known[cell] = _one(cell, expected, unit)
        if isinstance(read, CellFault):
            found.faults.append(CellFault(place, read.code, read.why))
        else:
            found.value[place], found.minus[place], found.plus[place], found.side[place] = read


def _one(cell: str, expected: Expected, unit: str | None) -> tuple[float, float, float, int] | CellFault:
    text = cell.strip(" ")
    if not text:
        return float("nan"), float("nan"), float("nan"), 0
    domain: dict[str, Any] = {
        "low": expected.low, "high": expected.high,
        "low_open": expected.low_open, "high_open": expected.high_open,
    }  # fmt: skip
    # A cell may say its unit itself; otherwise it has that of the column.
    tries = [f"{text} {unit}", text] if unit else [text]
    refused: InputRefused | None = None
    for attempt in tries:
        try:
            read = read_measured_or_bound(attempt, expected.unit, expected.name, **domain)
        except InputRefused as error:
            refused = refused or error
            continue
        if isinstance(read, Range):
            return CellFault(0, "value-unreadable", "A value or a limit is expected here, not a range.")
        if isinstance(read, Limit):
            return read.bound, float("nan"), float("nan"), ABOVE if read.side == "above" else BELOW
        unknown = float("nan")
        return (
            read.value,
            unknown if read.minus is None else read.minus,
            unknown if read.plus is None else read.plus,
            0,
        )
    assert refused is not None
    return CellFault(0, refused.code, refused.why)


def read_sizes(
    cells: Sequence[str], expected: Expected, unit: str | None
) -> tuple[FloatArray, list[CellFault]]:
    """Errors of a column in the canonical unit: sizes of zero and more, NaN where unknown."""
    read = read_numbers(cells, expected.name)
    sizes = read.values * factor_of(unit, expected) if unit else read.values
    faults = read.faults
    with np.errstate(invalid="ignore"):
        negative = np.flatnonzero(sizes < 0.0)
    for place in negative.tolist():
        faults.append(CellFault(place, "error-negative", "An error is a size: zero or more."))
    infinite = np.flatnonzero(np.isinf(sizes))
    for place in infinite.tolist():
        faults.append(CellFault(place, "number-unreadable", "A finite number is expected."))
    return sizes, faults


def read_plain_numbers(
    cells: Sequence[str], expected: Expected, unit: str | None
) -> tuple[FloatArray, list[CellFault]]:
    """Numbers of a column in the canonical unit, without errors; NaN where unknown."""
    values = read_values(cells, expected, unit)
    faults = values.faults
    for place in np.flatnonzero((values.side != 0) | ~np.isnan(values.minus)).tolist():
        faults.append(CellFault(place, "value-unreadable", "A plain number is expected here."))
    return values.value, faults


def word_reader(name: str, column: str) -> Callable[[str], str]:
    """How a cell of a field of words is read; ``column`` is its name in the table.

    The reader raises InputRefused.
    """
    choices = _CHOICES.get(name)
    if choices is None:
        longest = _LONGEST[name]
        return lambda text: check_plain_text(text, column, longest)

    def choose(text: str) -> str:
        word = choices.get(text.strip().casefold())
        if word is None:
            accepted = list(dict.fromkeys(choices.values())) if name != "limit" else ["<", ">"]
            raise refusal(
                column, text, f"One of {', '.join(accepted)} is expected.", accepted[0], "choice-refused"
            )
        return word

    return choose
