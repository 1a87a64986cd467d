"""Tables as CSV, ECSV and JSON, line by line; VOTable stands beside.

The same table is always the same bytes: UTF-8, line feeds, no dates of writing. Floats are the shortest
text that reads back as the same number.
"""

from __future__ import annotations

import csv
import io
import json
from collections.abc import Callable, Iterator
from typing import Any

from campaign.model.exchange_columns import EXCHANGE_FORMAT, Cell, ExchangeColumn
from campaign.model.exported import ExchangeForm, OutgoingTable
from campaign.model.guarding import guarded
from campaign.output.exchange_votable import votable_text

TIME_SYSTEM = {"timescale": "TDB", "refposition": "BARYCENTER", "timeorigin": "MJD-origin"}


def table_text(table: OutgoingTable, form: ExchangeForm) -> Iterator[str]:
    """The whole text of a table, piece by piece."""
    return _WRITERS[form](table)


def _csv_text(table: OutgoingTable) -> Iterator[str]:
    """Comma-separated, empty for unknown; texts that a spreadsheet would run are guarded."""
    sink = io.StringIO()
    write = csv.writer(sink, lineterminator="\n").writerow
    write([column.name for column in table.columns])
    texts = [place for place, column in enumerate(table.columns) if column.is_text]
    truths = [place for place, column in enumerate(table.columns) if column.type == "truth"]
    for row in table.rows:
        cells: list[Any] = list(row)
        for place in texts:
            if cells[place]:
                cells[place] = guarded(cells[place])
        for place in truths:
            cells[place] = _truth(cells[place], "true", "false")
        write(cells)
        if sink.tell() > _PIECE:
            yield _taken(sink)
    yield _taken(sink)


def _ecsv_text(table: OutgoingTable) -> Iterator[str]:
    """Enhanced CSV 1.0: a header in YAML, then rows.

    Readers take it line by line, so that line feeds and tabs inside a text are written as ``\\n`` and
    ``\\t``, and a backslash as two, in the columns that may have several lines.
    """
    yield from _ecsv_header(table)
    writers = [_ecsv_cell_writer(column) for column in table.columns]
    lines: list[str] = []
    for row in table.rows:
        cells = ["" if cell is None else write(cell) for write, cell in zip(writers, row, strict=True)]
        lines.append(",".join(cells) + "\n")
        if len(lines) >= _LINES:
            yield "".join(lines)
            lines.clear()
    yield "".join(lines)


def _ecsv_header(table: OutgoingTable) -> Iterator[str]:
    yield "# %ECSV 1.0\n# ---\n# delimiter: ','\n# datatype:\n"
    for column in table.columns:
        unit = table.unit_of(column)
        entry = {"name": column.name} | ({"unit": unit} if unit else {})
        entry |= {"datatype": _ECSV_TYPES[column.type], "description": column.text}
        yield f"# - {json.dumps(entry, ensure_ascii=True)}\n"
    yield "# meta:\n"
    yield f"#   campaign: {json.dumps({'kind': table.kind, 'format': EXCHANGE_FORMAT})}\n"
    if axis := table.axis_columns:
        yield f"#   TIMESYS: {json.dumps(TIME_SYSTEM | {'columns': axis})}\n"
    if table.kind == "systems":
        yield f"#   COOSYS: {json.dumps({'system': 'ICRS', 'epoch_column': 'position_epoch_jyr'})}\n"
    yield "# schema: astropy-2.0\n"
    yield ",".join(column.name for column in table.columns) + "\n"


def _ecsv_cell_writer(column: ExchangeColumn) -> Callable[[Any], str]:
    if column.type == "number":
        return repr
    if column.type == "whole":
        return str
    if column.type == "truth":
        return lambda cell: _truth(cell, "True", "False")
    if column.is_prose:
        return lambda cell: _ecsv_quoted(escaped(cell))
    return _ecsv_quoted


def _ecsv_quoted(text: str) -> str:
    # A line that begins with a number sign is a comment to readers, quoted or not it must not look so.
    if text and (text[0] in '# "' or text[-1] == " " or any(each in text for each in ',"\n')):
        return '"' + text.replace('"', '""') + '"'
    return text


def escaped(text: str) -> str:
    """Text of several lines on one."""
    return text.replace("\\", "\\\\").replace("\n", "\\n").replace("\t", "\\t")


def _json_text(table: OutgoingTable) -> Iterator[str]:
    """One document with a row a line, in ASCII; null for unknown."""
    columns = [
        {"name": c.name, "type": c.type, "unit": table.unit_of(c), "description": c.text}
        for c in table.columns
    ]
    axis = table.axis_columns
    head: dict[str, Any] = {
        "kind": table.kind,
        "format": EXCHANGE_FORMAT,
        "time": TIME_SYSTEM | {"columns": axis} if axis else None,
        "columns": columns,
    }
    document = {"schema": f"campaign/export-{table.kind}/1", "as_of": None}
    yield json.dumps(document)[:-1] + ', "data": ' + json.dumps(head)[:-1] + ', "rows": ['
    names = [column.name for column in table.columns]
    encode = json.JSONEncoder(allow_nan=False).encode
    between = "\n"
    lines: list[str] = []
    for row in table.rows:
        # An empty text and one that was never given are alike everywhere else; so they are here.
        cells = dict(zip(names, (None if cell == "" else cell for cell in row), strict=True))
        lines.append(between + encode(cells).replace("\x7f", "\\u007f"))
        between = ",\n"
        if len(lines) >= _LINES:
            yield "".join(lines)
            lines.clear()
    yield "".join(lines) + '\n]}, "warnings": []}\n'


def _truth(cell: Cell, yes: str, no: str) -> str:
    return "" if cell is None else yes if cell else no


def _taken(sink: io.StringIO) -> str:
    text = sink.getvalue()
    sink.seek(0)
    sink.truncate()
    return text


_PIECE = 1 << 18
_LINES = 1_000
_ECSV_TYPES = {
    "text": "string",
    "word": "string",
    "number": "float64",
    "whole": "int64",
    "truth": "bool",
}
_WRITERS: dict[ExchangeForm, Callable[[OutgoingTable], Iterator[str]]] = {
    "csv": _csv_text,
    "ecsv": _ecsv_text,
    "votable": votable_text,
    "json": _json_text,
}
