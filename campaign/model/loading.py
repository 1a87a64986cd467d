"""What a load understood of a table, what was wrong with it, and what came of it."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, field
from fractions import Fraction
from typing import Literal

from campaign.model.instants import Place, Scale
from campaign.model.suspicion import Suspicion

LoadKind = Literal[
    "photometry", "velocity", "position", "shell", "line", "flux", "systems", "solutions", "episodes"
]
LOAD_KINDS: tuple[LoadKind, ...] = (
    "photometry", "velocity", "position", "shell", "line", "flux", "systems", "solutions", "episodes",
)  # fmt: skip
KNOWLEDGE_KINDS: tuple[LoadKind, ...] = ("systems", "solutions", "episodes")
# The stage of a load from which on it is in the catalogue, or fails; no interrupt takes it back.
FINISHING = "finishing"
# How much of a refused cell is kept for the report.
SHOWN_TEXT = 200


@dataclass(frozen=True, slots=True)
class BadCell:
    """One cell, or (without ``column``) one row, that cannot be loaded. Lines are counted from 1."""

    line: int
    column: str | None
    code: str
    why: str
    text: str


@dataclass(frozen=True, slots=True)
class Misfit:
    """A row that does not fit the columns, with its cells as they stood."""

    line: int
    cells: tuple[str, ...]
    code: str
    why: str


@dataclass(frozen=True, slots=True)
class TableBlock:
    """Some rows of a table, column by column as texts; ``lines`` says where each stood."""

    lines: Sequence[int]
    columns: Sequence[Sequence[str]]
    misfits: tuple[Misfit, ...] = ()


@dataclass(frozen=True, slots=True)
class TableColumn:
    """One column of a table of somebody: its name, the unit beside it, and what a header says of times."""

    name: str
    unit: str | None = None
    scale: Scale | None = None
    place: Place | None = None
    offset_jd: str | None = None
    described: str = ""


@dataclass(frozen=True, slots=True)
class ForeignTable:
    """A table of somebody: ``form`` in words, the columns, and the rows, block by block.

    ``line_word`` is how its rows are counted: by "line" of a text, by "row" otherwise.
    """

    form: str
    columns: tuple[TableColumn, ...]
    blocks: Iterator[TableBlock]
    line_word: Literal["line", "row"] = "line"
    size_bytes: int | None = None


@dataclass(frozen=True, slots=True)
class TimeMeaning:
    """How the cells of a time column are to be read.

    ``count`` is "jd" or "mjd" for a number of days to which ``offset_d`` is added, and "text" for instants
    written out. Scale and place are None where the column does not say; ``by_convention`` names what was
    taken from the usage of the trade instead.
    """

    count: Literal["jd", "mjd", "text"]
    offset_d: Fraction = Fraction(0)
    scale: Scale | None = None
    place: Place | None = None
    by_convention: str = ""


@dataclass(frozen=True, slots=True)
class ColumnUse:
    """What one column is taken for: ``number`` is its place from 1, ``unit`` that of its cells.

    ``clock_number`` is the place of a column of clock times beside a column of dates.
    """

    field: str
    column: str
    number: int
    unit: str | None = None
    meaning: str = ""
    clock_number: int | None = None


@dataclass(frozen=True, slots=True)
class ValueTarget:
    """One value in each row: its columns by field, and what is the same for all of them (such as a band)."""

    fields: Mapping[str, ColumnUse]
    constants: Mapping[str, str] = field(default_factory=dict)


@dataclass(frozen=True, slots=True)
class TableMapping:
    """Which columns of a table are taken for what.

    ``columns`` and ``constants`` belong to every value of a row, ``targets`` to one each: a table with a
    column for each band has several. ``instants`` says how the cells of each instant are to be read (of an
    observation: "time"); ``notes`` say what was concluded and how.
    """

    kind: LoadKind
    columns: Mapping[str, ColumnUse]
    constants: Mapping[str, str]
    targets: tuple[ValueTarget, ...]
    instants: Mapping[str, TimeMeaning]
    unused: tuple[str, ...] = ()
    missing: tuple[str, ...] = ()
    notes: tuple[str, ...] = ()
    has_decimal_commas: bool = False


@dataclass(frozen=True, slots=True)
class MappingRequest:
    """What the user said of the columns: ``columns`` and ``constants`` by field, as typed."""

    kind: LoadKind | None = None
    columns: Mapping[str, str] = field(default_factory=dict)
    constants: Mapping[str, str] = field(default_factory=dict)
    missing: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class LoadConflict:
    """A row that differs from a known observation in its value alone."""

    line: int
    system: str
    kind: str
    band: str | None
    bmjd_tdb: float
    value: float
    known_id: int
    known_value: float
    unit: str


@dataclass(frozen=True, slots=True)
class LoadWarning:
    """Something that an observer would want to know.

    ``lines`` are the first of those it concerns, and ``more`` tells that there are others.
    """

    code: str
    text: str
    rows: int = 0
    lines: tuple[int, ...] = ()
    more: bool = False


@dataclass(frozen=True, slots=True)
class MappingLine:
    """One line of the mapping that was understood: a field and where it comes from, for people."""

    field: str
    origin: str
    meaning: str = ""


@dataclass(frozen=True, slots=True)
class Understood:
    """What is shown before anything is written."""

    file: str
    form: str
    kind: str
    lines: tuple[MappingLine, ...]
    unused: tuple[str, ...] = ()
    notes: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class Loaded:
    """What a load came to.

    ``added`` is what went in (with ``rehearsed``: what would); ``already_known`` was in the catalogue,
    ``repeated`` stood more than once in the table. ``without_value`` counts rows whose value is a text that
    was said to stand for unknown. ``bad_rows`` counts rows, ``bad`` lists every cell. With ``is_refused``
    nothing went in. ``made`` counts what was made beside the rows, such as sites. ``suspicions`` are the
    onsets that the new photometry makes one suspect.
    """

    understood: Understood
    rows_read: int
    values_read: int
    added: int = 0
    already_known: int = 0
    repeated: int = 0
    without_value: int = 0
    bad_rows: int = 0
    bad: tuple[BadCell, ...] = ()
    conflicts: tuple[LoadConflict, ...] = ()
    warnings: tuple[LoadWarning, ...] = ()
    rehearsed: bool = False
    is_refused: bool = False
    kept_mapping: str | None = None
    operation_id: int | None = None
    rejects_file: str | None = None
    line_word: Literal["line", "row"] = "line"
    made: Mapping[str, int] = field(default_factory=dict)
    columns: tuple[str, ...] = ()
    rejected: tuple[Rejected, ...] = ()
    suspicions: tuple[Suspicion, ...] = ()

    @property
    def reasons(self) -> dict[str, int]:
        """How many cells were refused, by reason, the most frequent first."""
        counts: dict[str, int] = {}
        for cell in self.bad:
            counts[cell.code] = counts.get(cell.code, 0) + 1
        return dict(sorted(counts.items(), key=lambda item: (-item[1], item[0])))


@dataclass(frozen=True, slots=True)
class LoadWanted:
    """What is asked of a load, beside the file.

    ``request`` is what the user said of the columns; ``mapping`` and ``keep_mapping`` are names of kept
    mappings. ``keeps_rejected`` asks for the cells of every bad row.
    """

    request: MappingRequest = field(default_factory=MappingRequest)
    mapping: str | None = None
    keep_mapping: str | None = None
    encoding: str | None = None
    skip_bad: bool = False
    also_conflicts: bool = False
    rehearse: bool = False
    keeps_rejected: bool = False


@dataclass(frozen=True, slots=True)
class Rejected:
    """A bad row with its cells as they stood, and what is wrong with it."""

    cells: tuple[str, ...]
    bad: tuple[BadCell, ...]
