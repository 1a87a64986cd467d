"""Tables of text, read block by block into columns of cells, each row with the line it stood in."""

from __future__ import annotations

import codecs
import csv
from collections.abc import Iterator, Sequence
from contextlib import suppress
from itertools import chain, islice, repeat
from typing import BinaryIO

from campaign.errors import InputRefused
from campaign.model.loading import ForeignTable, Misfit, TableBlock, TableColumn
from campaign.reading.tablefile import TableFile
from campaign.reading.tableshape import TableShape, find_shape, is_comment, splitter

# Stands for a line that is none of the rows, although it is among them.
COMMENTED = "commented"
_READ_BYTES = 1 << 21
_BLOCK_ROWS = 50_000
_LONGEST_LINE = 20_000_000
# The csv module's own limit is 131072 characters, too few for a long remark.
_LONGEST_CELL = 1_000_000
# Encodings that turn any bytes into text by a plain rule; others could run or unpack something.
ENCODINGS = (
    "utf-8", "utf-16", "utf-32", "latin-1", "iso-8859-2", "iso-8859-5", "iso-8859-7", "iso-8859-9",
    "iso-8859-15", "cp1250", "cp1251", "cp1252", "cp1253", "cp437", "cp850", "mac-roman", "koi8-r",
    "shift_jis", "euc-jp", "euc-kr", "gb18030", "big5", "ascii",
)  # fmt: skip
_WIDE_MARKS = (
    codecs.BOM_UTF32_LE, codecs.BOM_UTF32_BE, codecs.BOM_UTF16_LE, codecs.BOM_UTF16_BE,
)  # fmt: skip


def read_text_table(file: TableFile, encoding: str | None = None) -> ForeignTable:
    """A table of text; its rows are read as they are taken.

    Parameters
    ----------
    file
        Opened; read from its first byte.
    encoding
        One of ``ENCODINGS``; UTF-8 when it is None.

    Raises
    ------
    InputRefused
        ``encoding-refused``, ``encoding-unreadable``, ``line-too-long``, ``table-empty``; while rows are
        taken also ``table-unreadable``.
    """
    lines = _numbered_lines(file.stream, file.name, _checked(encoding, file))
    first_chunk = next(lines, (1, []))
    shape = find_shape(first_chunk[1], file.name)
    return ForeignTable(
        shape.form,
        tuple(TableColumn(name, unit) for name, unit in zip(shape.names, shape.units, strict=True)),
        _Blocks(shape, file.name).of(_without_head(shape, first_chunk, lines)),
        size_bytes=file.size_bytes,
    )


def _without_head(
    shape: TableShape, first: tuple[int, list[str]], rest: Iterator[tuple[int, list[str]]]
) -> Iterator[tuple[int, list[str]]]:
    line, texts = first
    return chain([(line + shape.first_row, texts[shape.first_row :])], rest)


def _checked(encoding: str | None, file: TableFile) -> str:
    if encoding is None:
        if file.head.startswith(_WIDE_MARKS):
            wide = "utf-32" if file.head[2:4] == b"\0\0" or file.head[:2] == b"\0\0" else "utf-16"
            raise InputRefused(
                f"{file.name} is not in UTF-8 (line 1, column 1).",
                why=f"It begins with the mark of {wide.upper()}.",
                hint=f"Say so: --encoding {wide}.",
                code="encoding-unreadable",
                details={"file": file.name, "line": 1, "column": 1, "accepted_form": f"--encoding {wide}"},
            )
        return "utf-8-sig"
    name = encoding.strip().casefold().replace("_", "-").replace(" ", "-")
    for known in ENCODINGS:
        if name == known.replace("_", "-") or name == known.replace("-", "").replace("_", ""):
            return "utf-8-sig" if known == "utf-8" else known
    raise InputRefused(
        f"The encoding '{encoding[:40]}' is not known here.",
        why=f"Known are: {', '.join(ENCODINGS)}.",
        hint="For example --encoding latin-1.",
        code="encoding-refused",
        details={"accepted": list(ENCODINGS), "accepted_form": "--encoding latin-1"},
    )


def _numbered_lines(stream: BinaryIO, name: str, encoding: str) -> Iterator[tuple[int, list[str]]]:
    """Chunks of lines without their ends, each with the number of its first; CR, LF and CRLF end a line."""
    decoder = codecs.getincrementaldecoder(encoding)("strict")
    line, pending, ended = 1, "", False
    while not ended:
        data = stream.read(_READ_BYTES)
        ended = not data
        try:
            text = pending + decoder.decode(data, ended)
        except UnicodeError as error:
            raise _undecodable(name, encoding, error, line, pending) from error
        if "\r" in text:
            # A CR at the end may be half of a CRLF.
            held = "\r" if text.endswith("\r") and not ended else ""
            text = text[: len(text) - len(held)].replace("\r\n", "\n").replace("\r", "\n") + held
        cut = len(text) if ended else text.rfind("\n")
        if cut < 0:
            pending = text
            if len(pending) > _LONGEST_LINE:
                raise InputRefused(
                    f"{name} has a line of more than {_LONGEST_LINE} characters (line {line}).",
                    why="A row of a table is far shorter.",
                    hint="Check that this is a table of text.",
                    code="line-too-long",
                    details={"file": name, "line": line},
                )
            continue
        lines = text[:cut].split("\n")
        pending = text[cut + 1 :]
        if ended and lines[-1] == "":
            lines.pop()
        if lines:
            yield line, lines
        line += len(lines)


def _undecodable(name: str, encoding: str, error: UnicodeError, line: int, pending: str) -> InputRefused:
    before, found = pending, "no mark of its byte order"
    if isinstance(error, UnicodeDecodeError):
        found = f"the byte 0x{error.object[error.start]:02X}"
        with suppress(UnicodeError, LookupError):
            before += bytes(error.object[: error.start]).decode(error.encoding)
    before = before.replace("\r\n", "\n").replace("\r", "\n")
    at_line, column = line + before.count("\n"), len(before) - before.rfind("\n")
    shown = "UTF-8" if encoding.startswith("utf-8") else encoding
    return InputRefused(
        f"{name} is not in {shown} (line {at_line}, column {column}).",
        why=f"It holds {found} there, which {shown} does not allow.",
        hint="Say which encoding it is in, for example --encoding latin-1.",
        code="encoding-unreadable",
        details={
            "file": name,
            "line": at_line,
            "column": column,
            "accepted_form": "--encoding latin-1",
        },
    )


def _comment(line: int, text: str) -> Misfit:
    """A line among the rows that is passed over; whoever reads them may tell of it."""
    return Misfit(line, (text,), COMMENTED, "It begins with #.")


class _Blocks:
    """Turns lines into blocks of columns."""

    def __init__(self, shape: TableShape, name: str) -> None:
        self._shape = shape
        self._name = name
        self._width = len(shape.names)
        self._split = splitter(shape.delimiter, shape.edges)
        self._comments: list[Misfit] = []
        self._is_single = len(shape.delimiter) == 1 and shape.delimiter != " "

    def of(self, chunks: Iterator[tuple[int, list[str]]]) -> Iterator[TableBlock]:
        for first, lines in chunks:
            if self._is_single and '"' in "".join(lines):
                # From here on a cell may span lines, which only a reader of records can tell.
                yield from self._records(chain([(first, lines)], chunks))
                return
            for start in range(0, len(lines), _BLOCK_ROWS):
                block = self._block(first + start, lines[start : start + _BLOCK_ROWS])
                if block.lines or block.misfits:
                    yield block

    def _block(self, first: int, lines: list[str]) -> TableBlock:
        numbers: Sequence[int] = range(first, first + len(lines))
        comments: tuple[Misfit, ...] = ()
        if "" in lines or any(map(str.startswith, lines, repeat("#"))) or any(map(str.isspace, lines)):
            kept = [
                (number, line)
                for number, line in zip(numbers, lines, strict=True)
                if line.strip() and not is_comment(line)
            ]
            comments = tuple(
                _comment(number, line)
                for number, line in zip(numbers, lines, strict=True)
                if is_comment(line)
            )
            numbers, lines = [number for number, _ in kept], [line for _, line in kept]
        if self._is_single:
            delimiter = self._shape.delimiter
            counts = list(map(str.count, lines, repeat(delimiter)))
            if counts.count(self._width - 1) == len(lines):
                return self._columns(numbers, delimiter.join(lines).split(delimiter), comments)
        rows = ((number, self._split(line)) for number, line in zip(numbers, lines, strict=True))
        return self._of_rows(rows, comments)

    def _columns(
        self, numbers: Sequence[int], cells: list[str], misfits: tuple[Misfit, ...] = ()
    ) -> TableBlock:
        if not numbers:
            return TableBlock((), [[] for _ in range(self._width)], misfits)
        return TableBlock(numbers, [cells[place :: self._width] for place in range(self._width)], misfits)

    def _of_rows(
        self, rows: Iterator[tuple[int, list[str]]], comments: tuple[Misfit, ...] = ()
    ) -> TableBlock:
        numbers: list[int] = []
        cells: list[str] = []
        misfits = list(comments)
        for number, row in rows:
            if len(row) == self._width:
                numbers.append(number)
                cells += row
            else:
                misfits.append(self._misfit(number, row))
        return self._columns(numbers, cells, tuple(misfits))

    def _misfit(self, number: int, row: Sequence[str]) -> Misfit:
        more = len(row) > self._width
        cells = "1 cell" if len(row) == 1 else f"{len(row)} cells"
        return Misfit(
            number,
            tuple(row),
            "row-too-long" if more else "row-too-short",
            f"The row has {cells}, the table has {self._width} columns.",
        )

    def _records(self, chunks: Iterator[tuple[int, list[str]]]) -> Iterator[TableBlock]:
        """Blocks by the csv module, for a table with quoted cells."""
        csv.field_size_limit(_LONGEST_CELL)
        rows = self._rows(chunks)
        while True:
            some = list(islice(rows, _BLOCK_ROWS))
            if not some:
                return
            comments, self._comments = tuple(self._comments), []
            yield self._of_rows(iter(some), comments)

    def _rows(self, chunks: Iterator[tuple[int, list[str]]]) -> Iterator[tuple[int, list[str]]]:
        started = next(chunks, (1, []))
        before = started[0] - 1
        last_line = ""

        def lines() -> Iterator[str]:
            nonlocal last_line
            for _, texts in chain([started], chunks):
                for text in texts:
                    last_line = text
                    yield text + "\n"

        reader = csv.reader(lines(), delimiter=self._shape.delimiter, strict=True)
        while True:
            first = before + reader.line_num + 1
            try:
                row = next(reader)
            except StopIteration:
                return
            except csv.Error as error:
                raise InputRefused(
                    f"{self._name} cannot be divided into cells (line {first}).",
                    why=f"A quoted cell is not closed as it should be ({error}).",
                    hint="Mend the quotes: a quote inside a quoted cell is written twice.",
                    code="table-unreadable",
                    details={"file": self._name, "line": first},
                ) from error
            is_one_line = before + reader.line_num == first
            blank = not any(cell.strip() for cell in row) and len(row) <= 1
            if is_one_line and is_comment(last_line):
                self._comments.append(_comment(first, last_line))
            elif not blank:
                yield first, row
