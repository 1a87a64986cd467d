"""One block of a table through every check: which rows are good, and their columns."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray

from campaign.model.loading import SHOWN_TEXT, BadCell, ColumnUse, TableBlock, TableMapping, ValueTarget
from campaign.model.systems import Site
from campaign.reading.columncells import CellFault, Vocabulary, without_missing
from campaign.reading.columntimes import TimeCells, read_times
from campaign.reading.columnvalues import (
    ABOVE,
    BELOW,
    ValueCells,
    read_plain_numbers,
    read_sizes,
    read_values,
)
from campaign.reading.expected import Expected
from campaign.studies.load_fields import ANGLE, NUMBER_COLUMNS, WORD_FIELDS, NumberColumn

FloatArray = NDArray[np.float64]
Array = NDArray[Any]
# Columns of good rows by name, and the texts of their times.
Piece = tuple[dict[str, Array], list[str]]

_ERRORS = (("error", ("minus", "plus")), ("error_minus", ("minus",)), ("error_plus", ("plus",)))
_DEFAULT_LIMIT_SIGMA = 3.0
# Words that every row of a kind needs, where a column is to give them.
_NEEDED_WORDS = {"band": "photometry", "star": "velocity", "species": "line"}


@dataclass(frozen=True, slots=True, eq=False)
class CheckContext:
    """What all blocks of a table share; ``constants`` hold codes of words, places of names, and numbers."""

    mapping: TableMapping
    value: NumberColumn
    sites: Sequence[Site]
    vocabulary: Callable[[str, str], Vocabulary[Any]]
    constants: dict[str, Any] = field(default_factory=dict)


def _faults(places: Iterable[int], code: str, why: str) -> list[CellFault]:
    return [CellFault(place, code, why) for place in places]


def _where(condition: Array) -> list[int]:
    places: list[int] = np.flatnonzero(condition).tolist()
    return places


def _besides(condition: Array, faults: Sequence[CellFault]) -> list[int]:
    """Places where the condition holds, but for those that have a fault already."""
    refused = {fault.place for fault in faults}
    return [place for place in _where(condition) if place not in refused]


class BlockCheck:
    """One block on its way through the checks."""

    def __init__(self, context: CheckContext, block: TableBlock) -> None:
        self.faults: dict[int, list[BadCell]] = {}
        self.without_value = 0
        self._context = context
        self._mapping = context.mapping
        self._block = block
        self._size = len(block.lines)
        self._shared: dict[str, Array] = {}

    def pieces(self) -> list[Piece]:
        """Good rows, target by target; what is wrong with the others is in ``faults`` then."""
        self._shared["system"] = self._places("system", "system-missing", "The row names no system.")
        self._shared["site"] = self._places("site", "", "")
        times = self._times()
        for name in WORD_FIELDS:
            self._words(name)
        for name in NUMBER_COLUMNS:
            self._numbers(name)
        values = [self._values(target) for target in self._mapping.targets]
        self._refuse_empty(values)
        good = np.ones(self._size, dtype=np.bool_)
        good[list(self.faults)] = False
        return [
            self._piece(target, found, times, good & ~np.isnan(found["value"]))
            for target, found in zip(self._mapping.targets, values, strict=True)
        ]

    def _use(self, name: str) -> ColumnUse | None:
        return self._mapping.columns.get(name)

    def _cells(self, use: ColumnUse) -> Sequence[str]:
        return without_missing(self._block.columns[use.number - 1], self._mapping.missing)

    def _number_cells(self, use: ColumnUse) -> Sequence[str]:
        cells = self._cells(use)
        return [cell.replace(",", ".") for cell in cells] if self._mapping.has_decimal_commas else cells

    def _note(self, use: ColumnUse, faults: Sequence[CellFault]) -> None:
        for fault in faults:
            text = self._block.columns[use.number - 1][fault.place][:SHOWN_TEXT]
            line = self._block.lines[fault.place]
            cell = BadCell(line, use.column, fault.code, fault.why, text)
            self.faults.setdefault(fault.place, []).append(cell)

    def _places(self, name: str, code: str, why: str) -> Array:
        """Places of systems or sites; where ``code`` is given each row needs one."""
        use = self._use(name)
        if use is None:
            constant = self._context.constants.get(name, -1)
            words = self._context.vocabulary(name, name).words
            return np.full(self._size, words[constant] if constant >= 0 else -1, dtype=np.int32)
        faults: list[CellFault] = []
        vocabulary = self._context.vocabulary(name, use.column)
        codes = vocabulary.codes(self._cells(use), faults)
        if code:
            faults += _faults(_besides(codes < 0, faults), code, why)
        self._note(use, faults)
        places = np.array([*vocabulary.words, -1], dtype=np.int32)
        return places[codes]

    def _times(self) -> TimeCells:
        use = self._mapping.columns["time"]
        is_text = self._mapping.instants["time"].count == "text"
        longitudes: list[float | None] | None = None
        if is_text:
            by_place = [*(site.longitude_deg_east for site in self._context.sites), None]
            longitudes = [by_place[place] for place in self._shared["site"].tolist()]
        cells = self._cells(use) if is_text else self._number_cells(use)
        if use.clock_number is not None:
            clocks = without_missing(self._block.columns[use.clock_number - 1], self._mapping.missing)
            cells = [
                f"{date.strip()} {clock.strip()}".strip() for date, clock in zip(cells, clocks, strict=True)
            ]
        times = read_times(cells, self._mapping.instants["time"], use.column, longitudes)
        self._note(use, times.faults)
        error = self._sizes("time_error", "d")
        if error is not None:
            # An error beside it cannot make a day, month or night narrower than it is.
            times.minus_d = np.fmax(error, times.minus_d)
            times.plus_d = np.fmax(error, times.plus_d)
        return times

    def _sizes(
        self, name: str, unit: str, use: ColumnUse | None = None, of: ColumnUse | None = None
    ) -> FloatArray | None:
        """Errors of a column or constant; without a unit of their own they have that of the value."""
        use = use or self._use(name)
        if use is None:
            constant = self._context.constants.get(name)
            return None if constant is None else np.full(self._size, constant)
        expected = Expected(unit, use.column, low=0.0, with_error=False)
        sizes, faults = read_sizes(self._number_cells(use), expected, use.unit or (of.unit if of else None))
        self._note(use, faults)
        return sizes

    def _words(self, name: str) -> None:
        use = self._use(name)
        if use is not None:
            faults: list[CellFault] = []
            codes = self._context.vocabulary(name, use.column).codes(self._cells(use), faults)
            if _NEEDED_WORDS.get(name) == self._mapping.kind:
                faults += _faults(_besides(codes < 0, faults), f"{name}-missing", f"The row names no {name}.")
            self._note(use, faults)
            self._shared[name] = codes
        elif name in self._context.constants:
            self._shared[name] = np.full(self._size, self._context.constants[name], dtype=np.int32)

    def _numbers(self, name: str) -> None:
        use = self._use(name)
        column = NUMBER_COLUMNS[name]
        if use is not None:
            expected = column.expected(use.column)
            values, faults = read_plain_numbers(self._number_cells(use), expected, use.unit)
            if name == "shell_index":
                broken = ~np.isnan(values) & (values != np.floor(values))
                faults += _faults(_where(broken), "index-refused", "An index is a whole number from 1.")
            self._note(use, faults)
            self._shared[column.column] = values
        elif name in self._context.constants:
            self._shared[column.column] = np.full(self._size, self._context.constants[name])
        if name == "energy_high" and column.column in self._shared:
            self._refuse_inverted_energies()

    def _refuse_inverted_energies(self) -> None:
        use = self._use("energy_high") or self._use("energy_low")
        if use is None:
            return
        low, high = self._shared["energy_low_kev"], self._shared["energy_high_kev"]
        wrong = _where(~(low < high) & ~(np.isnan(low) & np.isnan(high)))
        why = "An energy range goes from the lower to the higher energy."
        self._note(use, _faults(wrong, "energy-refused", why))

    def _values(self, target: ValueTarget) -> dict[str, Array]:
        """Value, errors, side and angle of one target; a NaN value is one that is not there."""
        use = target.fields["value"]
        column = self._context.value
        expected = Expected(
            column.unit, use.column, column.low, column.high, column.low_open, column.high_open
        )
        cells = read_values(self._number_cells(use), expected, use.unit)
        self._note(use, cells.faults)
        self._limits(target, cells)
        self._errors(target, cells, column.unit)
        found: dict[str, Array] = {
            "value": cells.value, "value_minus": cells.minus, "value_plus": cells.plus, "side": cells.side,
        }  # fmt: skip
        found["limit_sigma"] = np.where(cells.side != 0, self._levels(target, cells.side), np.nan)
        if "angle" in target.fields:
            found |= self._angles(target)
        return found

    def _levels(self, target: ValueTarget, side: Array) -> FloatArray:
        """Of how many standard deviations the limits are."""
        use = target.fields.get("limit_sigma")
        sigma = self._sizes("limit_sigma", "", use)
        if sigma is None:
            return np.full(self._size, _DEFAULT_LIMIT_SIGMA)
        if use is not None:
            zero = _where((sigma == 0.0) & (side != 0))
            self._note(use, _faults(zero, "out-of-range", "The level of a limit is above zero."))
        return np.where(np.isnan(sigma), _DEFAULT_LIMIT_SIGMA, sigma)

    def _limits(self, target: ValueTarget, cells: ValueCells) -> None:
        use = target.fields.get("limit")
        if use is None:
            return
        faults: list[CellFault] = []
        vocabulary = self._context.vocabulary("limit", use.column)
        codes = vocabulary.codes(self._cells(use), faults)
        sides = [{"above": ABOVE, "below": BELOW}.get(word, 0) for word in vocabulary.words]
        marked = np.array([*sides, 0], dtype=np.int8)[codes]
        twice = _where((marked != 0) & (cells.side != 0) & (marked != cells.side))
        faults += _faults(twice, "limit-contradicted", "The mark and the value contradict each other.")
        self._note(use, faults)
        cells.side = np.where(cells.side != 0, cells.side, marked)

    def _errors(self, target: ValueTarget, cells: ValueCells, unit: str) -> None:
        value_use = target.fields["value"]
        for name, sides in _ERRORS:
            use = target.fields.get(name)
            sizes = self._sizes(name, unit, use, of=value_use)
            if sizes is None:
                continue
            known = ~np.isnan(sizes)
            if use is not None:
                twice = known & ~np.isnan(getattr(cells, sides[0]))
                limited = known & (cells.side != 0) & (sizes > 0.0)
                self._note(
                    use, _faults(_where(twice), "error-twice", "The cell of the value has an error too.")
                )
                self._note(use, _faults(_where(limited), "limit-with-error", "A limit has no error."))
            for side in sides:
                setattr(cells, side, np.where(known & (cells.side == 0), sizes, getattr(cells, side)))
        lonely = _where(np.isnan(cells.minus) != np.isnan(cells.plus))
        if lonely and "error_minus" in target.fields:
            why = "Two errors (lower and upper) are expected, not one."
            self._note(target.fields["error_minus"], _faults(lonely, "error-lonely", why))

    def _angles(self, target: ValueTarget) -> dict[str, Array]:
        use = target.fields["angle"]
        expected = Expected(ANGLE.unit, use.column, ANGLE.low, ANGLE.high)
        cells = read_values(self._number_cells(use), expected, use.unit)
        cells.faults += _faults(_where(cells.side != 0), "value-unreadable", "An angle is no limit.")
        if self._mapping.kind == "position":
            empty = _besides(np.isnan(cells.value), cells.faults)
            cells.faults += _faults(empty, "angle-missing", "The row has no position angle.")
        self._note(use, cells.faults)
        error_use = target.fields.get("angle_error")
        if error_use is not None:
            sizes = self._sizes("angle_error", ANGLE.unit, error_use, of=use)
            assert sizes is not None
            present = ~np.isnan(cells.value)
            cells.minus = np.where(np.isnan(cells.minus) & present, sizes, cells.minus)
            cells.plus = np.where(np.isnan(cells.plus) & present, sizes, cells.plus)
        return {
            "position_angle_deg": cells.value,
            "position_angle_deg_minus": cells.minus,
            "position_angle_deg_plus": cells.plus,
        }

    def _refuse_empty(self, values: Sequence[Mapping[str, Array]]) -> None:
        """A row without any value is no observation, and bad unless its text is said to mean unknown."""
        empty = np.logical_and.reduce([np.isnan(found["value"]) for found in values])
        uses = [target.fields["value"] for target in self._mapping.targets]
        places = [place for place in _where(empty) if place not in self.faults]
        if places and self._mapping.missing:
            columns = [self._block.columns[use.number - 1] for use in uses]
            bare = [
                place
                for place in places
                if not any(column[place].strip() in self._mapping.missing for column in columns)
            ]
            self.without_value = len(places) - len(bare)
            places = bare
        use = uses[0]
        self._note(use, _faults(places, "value-missing", "The row has no value."))

    def _piece(self, target: ValueTarget, found: Mapping[str, Array], times: TimeCells, kept: Array) -> Piece:
        everything = bool(kept.all())
        columns: dict[str, Array] = {
            "line": np.asarray(self._block.lines, dtype=np.int64),
            "day": times.day, "fraction": times.fraction, "scale": times.scale, "place": times.place,
            "time_minus_d": times.minus_d, "time_plus_d": times.plus_d, **self._shared, **found,
        }  # fmt: skip
        for name, word in target.constants.items():
            code = int(self._context.vocabulary(name, name).codes([word], [])[0])
            columns[name] = np.full(self._size, code, dtype=np.int32)
        if everything:
            return columns, times.texts
        texts = [times.texts[place] for place in _where(kept)]
        return {name: column[kept] for name, column in columns.items()}, texts
