"""A VOTable that ``export`` wrote, as rows of texts with their lines; spaces inside texts are kept."""

from __future__ import annotations

from collections import deque
from collections.abc import Iterator
from typing import BinaryIO
from xml.parsers import expat

from campaign.errors import InputRefused

_CHUNK = 1 << 16


def votable_rows(stream: BinaryIO) -> tuple[str, list[str], Iterator[tuple[int, list[str]]]]:
    """Name of the table, names of its columns, and its rows, which are read as they are taken.

    Raises
    ------
    InputRefused
        ``table-unreadable``.
    """
    parsing = _Parsing()
    pieces = _parsed(stream, parsing)
    while not parsing.in_rows and next(pieces, None) is not None:
        pass
    if not parsing.in_rows:
        raise _unreadable("It holds no table with rows of cells.", 1)
    return parsing.table, parsing.names, _rows(parsing, pieces)


def _rows(parsing: _Parsing, pieces: Iterator[bool]) -> Iterator[tuple[int, list[str]]]:
    while True:
        while parsing.rows:
            yield parsing.rows.popleft()
        if next(pieces, None) is None:
            return


def _parsed(stream: BinaryIO, parsing: _Parsing) -> Iterator[bool]:
    """Feed the parser piece by piece."""
    while True:
        data = stream.read(_CHUNK)
        try:
            parsing.parser.Parse(data, not data)
        except expat.ExpatError as error:
            raise _unreadable(f"It is no XML ({expat.ErrorString(error.code)}).", error.lineno) from None
        yield True
        if not data:
            return


class _Parsing:
    """What the parser found so far."""

    def __init__(self) -> None:
        self.table = ""
        self.names: list[str] = []
        self.in_rows = False
        self.rows: deque[tuple[int, list[str]]] = deque()
        self._cells: list[str] = []
        self._text: list[str] | None = None
        self._line = 0
        self.parser = expat.ParserCreate(encoding="utf-8")
        self.parser.buffer_text = True
        self.parser.StartElementHandler = self._start
        self.parser.EndElementHandler = self._end
        self.parser.CharacterDataHandler = self._characters
        self.parser.StartDoctypeDeclHandler = self._doctype

    def _start(self, name: str, attributes: dict[str, str]) -> None:
        if name == "TD":
            self._text = []
        elif name == "TR":
            self._cells, self._line = [], self.parser.CurrentLineNumber
        elif name == "FIELD":
            self.names.append(attributes.get("name", ""))
        elif name == "TABLE":
            if self.table:
                raise _unreadable("It holds more than one table.", self.parser.CurrentLineNumber)
            self.table = attributes.get("name", "?")
        elif name == "TABLEDATA":
            self.in_rows = True

    def _end(self, name: str) -> None:
        if name == "TD" and self._text is not None:
            self._cells.append("".join(self._text))
            self._text = None
        elif name == "TR":
            self.rows.append((self._line, self._cells))

    def _characters(self, text: str) -> None:
        if self._text is not None:
            self._text.append(text)

    def _doctype(self, *_: object) -> None:
        raise _unreadable("It declares a document type, which no export does.", 1)


def _unreadable(why: str, line: int) -> InputRefused:
    return InputRefused(
        f"The table cannot be read (line {line}).",
        why=why,
        hint="Export it again: campaign export KIND --to FILE.",
        code="table-unreadable",
        details={"line": line},
    )
