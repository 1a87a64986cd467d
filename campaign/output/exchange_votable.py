"""Tables as VOTable 1.4: instants and positions point at the systems that they are in."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from typing import Any
from xml.sax.saxutils import escape, quoteattr

from campaign.errors import InputRefused
from campaign.model.exchange_columns import EXCHANGE_FORMAT, ExchangeColumn
from campaign.model.exported import OutgoingTable

_LINES = 1_000
_DATATYPES = {
    "text": 'datatype="unicodeChar" arraysize="*"',
    "word": 'datatype="char" arraysize="*"',
    "number": 'datatype="double"',
    "whole": 'datatype="int"',
    "truth": 'datatype="boolean"',
}
# Units that other tables write as people do, in the one standard that allows no other form.
_VOUNITS = {"Angstrom": "0.1nm", "erg.s**-1.cm**-2": "mW/m**2"}
_COORDINATES = {"ra_deg": "pos.eq.ra;meta.main", "dec_deg": "pos.eq.dec;meta.main"}


def votable_text(table: OutgoingTable) -> Iterator[str]:
    """The whole document, piece by piece; empty cells for unknown.

    Raises
    ------
    InputRefused
        For a text with a character that XML does not know.
    """
    yield '<?xml version="1.0" encoding="UTF-8"?>\n'
    yield (
        '<VOTABLE version="1.4" xmlns="http://www.ivoa.net/xml/VOTable/v1.3"'
        ' xmlns:xsi="http://www.w3.org/2001/XMLSchema-instance">\n'
    )
    yield ' <RESOURCE type="results">\n'
    if table.axis_columns:
        yield ('  <TIMESYS ID="axis" timescale="TDB" refposition="BARYCENTER" timeorigin="MJD-origin"/>\n')
    if table.kind == "systems":
        yield '  <COOSYS ID="sky" system="ICRS"/>\n'
    yield f'  <TABLE name="{table.kind}" nrows="{table.row_count}">\n'
    yield f"   <DESCRIPTION>The {table.kind} of a campaign.</DESCRIPTION>\n"
    yield f'   <PARAM name="campaign_format" datatype="int" value="{EXCHANGE_FORMAT}"/>\n'
    for column in table.columns:
        yield _field(column, table.unit_of(column))
    yield "   <DATA><TABLEDATA>\n"
    writers = [_cell_writer(column) for column in table.columns]
    lines: list[str] = []
    for row in table.rows:
        cells = [
            "<TD/>" if cell is None or cell == "" else f"<TD>{write(cell)}</TD>"
            for write, cell in zip(writers, row, strict=True)
        ]
        lines.append(f"<TR>{''.join(cells)}</TR>\n")
        if len(lines) >= _LINES:
            yield "".join(lines)
            lines.clear()
    yield "".join(lines)
    yield "   </TABLEDATA></DATA>\n  </TABLE>\n </RESOURCE>\n</VOTABLE>\n"


def _field(column: ExchangeColumn, unit: str | None) -> str:
    attributes = f'name="{column.name}" {_DATATYPES[column.type]}'
    if unit is not None:
        attributes += f" unit={quoteattr(_VOUNITS.get(unit, unit))}"
    if column.on_axis:
        attributes += ' ref="axis" ucd="time.epoch"'
    if column.name in _COORDINATES:
        attributes += f' ref="sky" ucd="{_COORDINATES[column.name]}"'
    return f"   <FIELD {attributes}>\n    <DESCRIPTION>{escape(column.text)}</DESCRIPTION>\n   </FIELD>\n"


def _cell_writer(column: ExchangeColumn) -> Callable[[Any], str]:
    if column.type == "number":
        return repr
    if column.type == "whole":
        return str
    if column.type == "truth":
        return lambda cell: "T" if cell else "F"
    return lambda cell: _text(cell, column.name)


def _text(text: str, column: str) -> str:
    if not text.isprintable():
        for character in text:
            if character in "\ufffe\uffff":
                raise InputRefused(
                    f"A text of column {column} holds U+{ord(character):04X}.",
                    why="XML, and with it a VOTable, has no place for this character.",
                    hint="Mend the entry, or choose another form, for example --as csv.",
                    code="text-not-xml",
                    details={"column": column, "text": text[:200]},
                )
    return escape(text)
