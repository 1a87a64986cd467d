"""Rows of a table checked and gathered, block by block, into columns of the catalogue."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray

from campaign.errors import InputRefused, NotFound
from campaign.model.columns import ObservationColumns, Words
from campaign.model.loading import (
    SHOWN_TEXT,
    BadCell,
    Rejected,
    TableBlock,
    TableMapping,
)
from campaign.model.systems import Site, System
from campaign.reading.columncells import CellFault, Vocabulary
from campaign.reading.columntimes import PLACES, SCALES
from campaign.reading.columnvalues import read_plain_numbers, word_reader
from campaign.reading.expected import Expected
from campaign.reading.tabletext import COMMENTED
from campaign.studies.load_block import BlockCheck, CheckContext
from campaign.studies.load_fields import NUMBER_COLUMNS, WORD_FIELDS, value_column
from campaign.studies.load_names import NameIndex, site_index, system_index

FloatArray = NDArray[np.float64]
# Every one of them is told, which takes memory; a table with more is not what it was taken for.
MOST_BAD_CELLS = 2_000_000
Array = NDArray[Any]


@dataclass(slots=True, eq=False)
class CheckedRows:
    """Good rows as columns, still without their instants on the catalogue's axis.

    ``system`` and ``site`` are places among those of the catalogue (-1: no site); ``day`` and ``fraction``
    are MJD in scale and place by number. ``passed_over`` are lines of comments among the rows.
    """

    size: int
    line: NDArray[np.int64]
    system: NDArray[np.int32]
    site: NDArray[np.int32]
    day: FloatArray
    fraction: FloatArray
    scale: NDArray[np.int8]
    place: NDArray[np.int8]
    side: NDArray[np.int8]
    same: dict[str, Any]
    numbers: dict[str, FloatArray]
    words: dict[str, Words]
    texts: dict[str, list[str]]
    passed_over: Sequence[int] = ()

    def columns(
        self, systems: Sequence[System], sites: Sequence[Site], bmjd_tdb: FloatArray
    ) -> ObservationColumns:
        """Everything as columns of the catalogue."""
        same = dict(self.same)
        wholes: dict[str, NDArray[np.int64]] = {}
        words = dict(self.words)
        for name, codes, ids in (
            ("system_id", self.system, [system.id for system in systems]),
            ("site_id", self.site, [site.id for site in sites]),
        ):
            if self.size and (codes == codes[0]).all():
                same[name] = ids[int(codes[0])] if codes[0] >= 0 else None
            else:
                wholes[name] = np.array([*ids, -1], dtype=np.int64)[codes]
        numbers = {"bmjd_tdb": bmjd_tdb, **self.numbers}
        if "shell_index" in numbers:
            index = numbers.pop("shell_index")
            wholes["shell_index"] = np.where(np.isnan(index), -1, index).astype(np.int64)
        for name, few, known in (("time_scale", self.scale, SCALES), ("time_place", self.place, PLACES)):
            if self.size and (few == few[0]).all():
                same[name] = known[int(few[0])]
            else:
                words[name] = Words(known, few.astype(np.int32))
        if self.side.any():
            codes = np.where(self.side == 0, -1, (self.side + 1) // 2).astype(np.int32)
            words["limit_side"] = Words(("below", "above"), codes)
        return ObservationColumns(self.size, same, numbers, wholes, words, self.texts)


@dataclass(slots=True)
class _Parts:
    """Pieces of columns, one a block and target."""

    arrays: dict[str, list[Array]] = field(default_factory=dict)
    texts: list[str] = field(default_factory=list)

    def add(self, name: str, array: Array) -> None:
        self.arrays.setdefault(name, []).append(array)

    def joined(self, name: str, dtype: Any) -> Array:
        pieces = self.arrays.pop(name, [])
        return np.concatenate(pieces) if pieces else np.zeros(0, dtype=dtype)


def _is_filled(cells: Sequence[str]) -> bool:
    """Whether a row has anything in it; spreadsheets end in rows of empty cells."""
    return any(cell and not cell.isspace() for cell in cells)


class RowChecker:
    """Takes a table block by block; tells what is wrong, and in the end has what is right as columns."""

    def __init__(
        self,
        mapping: TableMapping,
        systems: Sequence[System],
        sites: Sequence[Site],
        *,
        keeps_rejected: bool,
    ) -> None:
        self.bad: list[BadCell] = []
        self.rejected: list[Rejected] = []
        self.bad_rows = 0
        self.rows_read = 0
        self.without_value = 0
        self.passed_over: list[int] = []
        self.kind = mapping.kind
        self.systems: NameIndex = system_index(systems)
        self.sites: NameIndex = site_index(sites)
        self._keeps_rejected = keeps_rejected
        self._parts = _Parts()
        self._vocabularies: dict[str, Vocabulary[Any]] = {}
        has_energies = "energy_low" in mapping.columns or "energy_low" in mapping.constants
        self._context = CheckContext(
            mapping, value_column(mapping.kind, has_energies=has_energies), sites, self._vocabulary
        )
        self._context.constants.update(self._read_constants())

    def take(self, block: TableBlock) -> None:
        """Check and gather some rows."""
        for misfit in block.misfits:
            if misfit.code == COMMENTED:
                self.passed_over.append(misfit.line)
                continue
            if not _is_filled(misfit.cells):
                continue
            self.rows_read += 1
            text = " | ".join(misfit.cells)[:SHOWN_TEXT]
            bad = BadCell(misfit.line, None, misfit.code, misfit.why, text)
            self._refuse(misfit.cells, [bad])
        size = len(block.lines)
        self.rows_read += size
        if not size:
            return
        check = BlockCheck(self._context, block)
        pieces = check.pieces()
        self.without_value += check.without_value
        for place, faults in sorted(check.faults.items()):
            cells = [column[place] for column in block.columns]
            if _is_filled(cells):
                self._refuse(cells, faults)
            else:
                self.rows_read -= 1
        for arrays, texts in pieces:
            self._parts.texts += texts
            for name, array in arrays.items():
                self._parts.add(name, array)

    def finish(self) -> CheckedRows:
        """The good rows; call it once, after the last block."""
        parts = self._parts
        line = parts.joined("line", np.int64)
        size = len(line)
        same: dict[str, Any] = {"kind": self._context.mapping.kind, "unit": self._context.value.unit}
        words: dict[str, Words] = {}
        numbers: dict[str, FloatArray] = {}
        core = {
            name: parts.joined(name, dtype)
            for name, dtype in (
                ("system", np.int32), ("site", np.int32), ("day", np.float64), ("fraction", np.float64),
                ("scale", np.int8), ("place", np.int8), ("side", np.int8),
            )
        }  # fmt: skip
        for name in WORD_FIELDS:
            if name in parts.arrays:
                codes = parts.joined(name, np.int32)
                found = self._vocabularies[name].words
                if size and codes[0] >= 0 and (codes == codes[0]).all():
                    same[name] = found[int(codes[0])]
                elif (codes >= 0).any():
                    words[name] = Words(found, codes)
        for name in list(parts.arrays):
            column = parts.joined(name, np.float64)
            if name in ("value", "bmjd_tdb") or not np.isnan(column).all():
                numbers[name] = column
        for low, high in (("value_minus", "value_plus"), ("time_minus_d", "time_plus_d")):
            if (
                low in numbers
                and high in numbers
                and np.array_equal(numbers[low], numbers[high], equal_nan=True)
            ):
                numbers[high] = numbers[low]
        return CheckedRows(
            size, line, **core, same=same, numbers=numbers, words=words, texts={"time_text": parts.texts},
            passed_over=self.passed_over,
        )  # fmt: skip

    def _read_constants(self) -> dict[str, Any]:
        """What is the same for all rows: codes of words, numbers, places of system and site."""
        read: dict[str, Any] = {}
        for name, text in self._context.mapping.constants.items():
            faults: list[CellFault] = []
            column = f"--constant {name}"
            self._refuse_unknown(name, text)
            if name in ("system", "site") or name in WORD_FIELDS or name == "limit":
                read[name] = int(self._vocabulary(name, column).codes([text], faults)[0])
            elif name in NUMBER_COLUMNS:
                values, faults = read_plain_numbers([text], NUMBER_COLUMNS[name].expected(column), None)
                read[name] = float(values[0])
            elif name in ("error", "error_minus", "error_plus", "time_error", "limit_sigma"):
                unit = {"time_error": "d", "limit_sigma": ""}.get(name, self._context.value.unit)
                values, faults = read_plain_numbers(
                    [text], Expected(unit, column, low=0.0, with_error=False), None
                )
                read[name] = float(values[0])
            else:
                faults = [CellFault(0, "field-unknown", f"{name} cannot be the same for all rows.")]
            if faults:
                raise InputRefused(
                    f"{column}={text[:SHOWN_TEXT]} cannot be used.",
                    why=faults[0].why,
                    hint="Correct the constant; nothing was loaded.",
                    code=faults[0].code,
                    details={"field": name, "text": text[:SHOWN_TEXT]},
                )
        return read

    def _refuse_unknown(self, name: str, text: str) -> None:
        """A system or site for all rows that is in no catalogue is told as anywhere else."""
        index = {"system": self.systems, "site": self.sites}.get(name)
        try:
            if index is not None:
                index.read(text)
        except InputRefused as refused:
            raise NotFound(
                refused.message,
                why=refused.why,
                hint=refused.hint,
                code=refused.code,
                details=refused.details,
            ) from refused

    def _vocabulary(self, name: str, column: str) -> Vocabulary[Any]:
        """The words of a field, each read once for the whole table."""
        if name not in self._vocabularies:
            reader = {"system": self.systems.read, "site": self.sites.read}.get(name)
            self._vocabularies[name] = Vocabulary(reader or word_reader(name, column))
        return self._vocabularies[name]

    def _refuse(self, cells: Sequence[str], bad: Sequence[BadCell]) -> None:
        self.bad_rows += 1
        self.bad += bad
        if len(self.bad) > MOST_BAD_CELLS:
            raise InputRefused(
                f"More than {MOST_BAD_CELLS:,} cells of the table cannot be read.",
                why=f"The last of them is in line {bad[-1].line:,}: {bad[-1].why}",
                hint="Load its first rows alone, and say what its columns hold with --column and --constant.",
                code="rows-refused",
                details={"line": bad[-1].line, "bad_rows": self.bad_rows},
            )
        if self._keeps_rejected:
            self.rejected.append(Rejected(tuple(cells), tuple(bad)))
