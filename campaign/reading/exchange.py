"""Tables that ``export`` wrote, read back row by row: CSV, ECSV, VOTable and JSON.

Only tables of our own are read here, bit for bit; those of others are read by column names and mappings.
"""

from __future__ import annotations

import csv
import json
import re
from collections.abc import Callable, Iterator, Sequence
from typing import Any, BinaryIO

from campaign.errors import InputRefused
from campaign.model.exchange_columns import (
    EXCHANGE_COLUMNS,
    EXCHANGE_FORMAT,
    EXCHANGE_KINDS,
    OUT_OF_USE_COLUMNS,
    SIGNATURES,
    ExchangeColumn,
    ExchangeKind,
)
from campaign.model.exported import ExchangeForm, ExchangeRow, ExchangeTable
from campaign.model.guarding import unguarded
from campaign.reading.exchange_cells import Free, RowReader, misfit
from campaign.reading.exchange_votable import votable_rows

HEAD_BYTES = 1 << 16
_KIND_OF_ECSV = re.compile(r'# +campaign: \{"kind": "(\w+)"')
_SCHEMA = re.compile(rb'\s*\{\s*"schema"\s*:\s*"campaign/export-\w+/')
_ESCAPES = {"n": "\n", "t": "\t", "\\": "\\"}
_REASON = "reason"


def recognise(head: bytes) -> ExchangeForm | None:
    """Which form of table of our own a file is, by its first ``HEAD_BYTES``; None: of none.

    A table that another program wrote again is none of ours, even where it holds the same.
    """
    if head.startswith(b"# %ECSV"):
        return "ecsv" if any(_KIND_OF_ECSV.match(line) for line in _lines_of(head)) else None
    if _SCHEMA.match(head):
        return "json"
    if head.lstrip().startswith(b"<"):
        return "votable" if b'"campaign_format"' in head and b"<TABLEDATA" in head else None
    return "csv" if _kind_of(_header(head)) else None


def read_exchange(stream: BinaryIO, form: ExchangeForm) -> ExchangeTable:
    """Read a table that ``export`` wrote; its rows are read as they are taken.

    Parameters
    ----------
    stream
        At the first byte; plain, not packed.
    form
        As :func:`recognise` found.

    Raises
    ------
    InputRefused
        ``table-unreadable``, with the line in ``details``: when the head cannot be read, when a column is
        unknown or comes twice, and, while rows are taken, when the file breaks off or is no text. Faults
        of single rows and cells are told with the rows.
    """
    return _READERS[form](stream)


def _lines_of(head: bytes) -> list[str]:
    return head.decode("utf-8", "replace").split("\n")


def _header(head: bytes) -> list[str]:
    first = _lines_of(head.removeprefix(b"\xef\xbb\xbf"))[0].rstrip("\r")
    try:
        return next(csv.reader([first]), [])
    except csv.Error:
        return []


def _kind_of(names: Sequence[str]) -> ExchangeKind | None:
    found = set(names)
    return next((kind for kind in EXCHANGE_KINDS if SIGNATURES[kind] <= found), None)


def _kind_named(name: object, where: str) -> ExchangeKind:
    for kind in EXCHANGE_KINDS:
        if kind == name:
            return kind
    raise _unreadable(f"{where} does not name an export.", 1)


def _row_reader(
    kind: ExchangeKind, names: Sequence[str], free: Callable[[ExchangeColumn], Free], line: int = 1
) -> RowReader:
    """The reader of the rows, after the names of the columns have been looked at."""
    known = {column.name: column for column in EXCHANGE_COLUMNS[kind] + OUT_OF_USE_COLUMNS[kind]}
    for place, name in enumerate(names):
        if name not in known or name in names[:place]:
            wrong = "comes twice" if name in known else "is not one of an export"
            raise _unreadable(f"It is a table of {kind}, and its column {name[:200]!r} {wrong}.", line)
    missing = SIGNATURES[kind] - set(names)
    if missing:
        raise _unreadable(f"It is a table of {kind} and has no column {min(missing)!r}.", line)
    return RowReader([known[name] for name in names], free)


def _read_csv(stream: BinaryIO) -> ExchangeTable:
    records = _records(stream)
    _, names = next(records, (1, []))
    # Bad rows that an earlier load wrote out, mended: their reasons are of no more use.
    reason = names.index(_REASON) if _REASON in names else None
    names = [name for name in names if name != _REASON]
    kind = _kind_of(names)
    if kind is None:
        raise _unreadable("Its first line does not name the columns of an export.", 1)
    reader = _row_reader(kind, names, lambda column: unguarded)
    rows = records if reason is None else _without_cell(records, reason, len(names))
    return ExchangeTable(kind, tuple(names), (reader.of_texts(line, cells) for line, cells in rows))


def _without_cell(
    records: Iterator[tuple[int, list[str]]], place: int, width: int
) -> Iterator[tuple[int, list[str]]]:
    for line, cells in records:
        yield line, cells[:place] + cells[place + 1 :] if len(cells) == width + 1 else cells


def _read_ecsv(stream: BinaryIO) -> ExchangeTable:
    kind: ExchangeKind | None = None
    line, text = 0, "#"
    while text.startswith("#"):
        line += 1
        text = _decoded(stream.readline(), line).rstrip("\r\n")
        if found := _KIND_OF_ECSV.match(text):
            kind = _kind_named(found.group(1), "Its head")
    if kind is None:
        raise _unreadable("Its head does not say which export it is.", 1)
    names = text.split(",")
    reader = _row_reader(kind, names, lambda column: _unescaped if column.is_prose else str, line)
    rows = (reader.of_texts(number, cells) for number, cells in _records(stream, line))
    return ExchangeTable(kind, tuple(names), rows, reader.as_csv)


def _read_votable(stream: BinaryIO) -> ExchangeTable:
    name, names, records = votable_rows(stream)
    kind = _kind_named(name, "The name of its table")
    reader = _row_reader(kind, names, lambda column: str)
    rows = (reader.of_texts(line, cells) for line, cells in records)
    return ExchangeTable(kind, tuple(names), rows, reader.as_csv)


def _read_json(stream: BinaryIO) -> ExchangeTable:
    text = _decoded(stream.read(), 1)
    try:
        document = json.loads(text)
    except RecursionError:
        raise _unreadable("Its brackets are nested too deep.", 1) from None
    except ValueError as error:
        raise _unreadable(f"It is no JSON document ({error}).", getattr(error, "lineno", 1)) from None
    try:
        data = document["data"]
        kind_name, form, rows = data["kind"], data["format"], data["rows"]
        names = [column["name"] for column in data["columns"]]
    except (KeyError, TypeError, IndexError):
        raise _unreadable("Parts of an export are missing in it.", 1) from None
    if form != EXCHANGE_FORMAT or not isinstance(rows, list):
        raise _unreadable(f"Its format is not the one that is read here ({EXCHANGE_FORMAT}).", 1)
    if not all(isinstance(name, str) for name in names):
        raise _unreadable("The names of its columns are not texts.", 1)
    kind = _kind_named(kind_name, "Its head")
    reader = _row_reader(kind, names, lambda column: str)
    return ExchangeTable(kind, tuple(names), _json_rows(reader, names, rows), reader.as_csv)


def _json_rows(reader: RowReader, names: list[str], rows: list[Any]) -> Iterator[ExchangeRow]:
    known = set(names)
    # ``export`` puts one row on a line, the first on the second line of the file.
    for line, row in enumerate(rows, start=2):
        if isinstance(row, dict) and row.keys() <= known:
            yield reader.of_values(line, [row.get(name) for name in names])
        else:
            yield misfit(line, [json.dumps(row)[:200]], "The row has not the columns named above it.")


def _records(stream: BinaryIO, line: int = 0) -> Iterator[tuple[int, list[str]]]:
    """Records of comma-separated text with the line that each begins in; ``line`` are behind already."""
    lines = (_decoded(data, number) for number, data in enumerate(stream, start=line + 1))
    reader = csv.reader(lines, strict=True)
    while True:
        first = line + reader.line_num + 1
        try:
            cells = next(reader)
        except StopIteration:
            return
        except csv.Error as error:
            raise _unreadable(f"It cannot be divided into cells there ({error}).", first) from None
        if cells:
            yield first, cells


def _unescaped(text: str) -> str:
    return re.sub(r"\\(.)", lambda found: _ESCAPES.get(found.group(1), found.group(0)), text)


def _decoded(data: bytes, line: int) -> str:
    """Text that begins in ``line``."""
    try:
        return data.decode("utf-8-sig" if line == 1 else "utf-8")
    except UnicodeDecodeError as error:
        wrong = line + data[: error.start].count(b"\n")
        raise _unreadable(
            f"It holds the byte 0x{data[error.start]:02X} where UTF-8 allows none.", wrong
        ) from None


def _unreadable(why: str, line: int) -> InputRefused:
    return InputRefused(
        f"The table cannot be read (line {line}).",
        why=why,
        hint="Export it again: campaign export KIND --to FILE.",
        code="table-unreadable",
        details={"line": line},
    )


_READERS: dict[ExchangeForm, Callable[[BinaryIO], ExchangeTable]] = {
    "csv": _read_csv,
    "ecsv": _read_ecsv,
    "votable": _read_votable,
    "json": _read_json,
}
