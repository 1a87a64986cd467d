"""The shape of a table of text: what stands between its columns, their names, units, and its first row."""

from __future__ import annotations

import csv
import re
from collections.abc import Callable, Sequence
from dataclasses import dataclass

from campaign.errors import InputRefused
from campaign.reading.numbers import MINUS_SIGN, UNSIGNED
from campaign.reading.units import FAMILIES

_DELIMITERS = {"\t": "tabs", ",": "commas", ";": "semicolons", "|": "bars"}
_QUOTED = re.compile(r'"[^"]*"')
_NUMBER = re.compile(rf"[+-]?{UNSIGNED}")
_DATE = re.compile(r"[0-9]{4}-[0-9]{2}(?:-[0-9]{2}.*)?")
_RULER = re.compile(r"[-=+:~ ]*[-=+~]{2}[-=+:~ ]*")
_BLANKS = re.compile(r" {2,}|\t")
_WORD = re.compile(r'"[^"]*"|\S+')
_OTHER_UNITS = frozenset(
    (
        "jd",
        "mjd",
        "hjd",
        "bjd",
        "utc",
        "tt",
        "tdb",
        "tai",
        "ut",
        "iso",
        "none",
        "text",
        "string",
        "name",
        "days",
    )
)
_BRACKETS = re.compile(r"[\[({](.*)[\])}]")
# So many rows decide on the shape, and so large a part of them must have it.
_SAMPLE_ROWS = 200
_MOST = 0.9
LONGEST_NAME = 200


@dataclass(frozen=True, slots=True)
class TableShape:
    """How a table of text is laid out.

    ``delimiter`` is one character, or " " for runs of spaces, "  " for runs of two and more, and empty for
    columns at the positions ``edges``. ``first_row`` counts lines from 0; ``is_named`` tells whether the
    names stood in the table.
    """

    delimiter: str
    names: tuple[str, ...]
    units: tuple[str | None, ...]
    first_row: int
    is_named: bool
    edges: tuple[int, ...] = ()

    @property
    def form(self) -> str:
        if self.delimiter in _DELIMITERS:
            return f"text, columns between {_DELIMITERS[self.delimiter]}"
        return "text, columns at fixed places" if not self.delimiter else "text, columns between spaces"


def is_comment(line: str) -> bool:
    """Whether a line says something about the table and is no row of it."""
    return line.startswith("#")


def split_words(line: str) -> list[str]:
    """Cells between runs of spaces; one in double quotes may hold spaces."""
    if '"' not in line:
        return line.split()
    return [
        word[1:-1] if len(word) > 1 and word[0] == word[-1] == '"' else word for word in _WORD.findall(line)
    ]


def split_blanks(line: str) -> list[str]:
    """Cells between runs of at least two spaces."""
    return [cell.strip() for cell in _BLANKS.split(line.strip())]


def split_at(line: str, edges: Sequence[int]) -> list[str]:
    """Cells that begin at ``edges``."""
    ends = [*edges[1:], None]
    return [line[begin:end].strip() for begin, end in zip(edges, ends, strict=True)]


def find_shape(lines: Sequence[str], name: str) -> TableShape:
    """The shape of the table whose first lines are ``lines``.

    Raises
    ------
    InputRefused
        ``table-empty``, when there is no row.
    """
    content: Sequence[tuple[int, str]] = [
        (place, line) for place, line in enumerate(lines) if line.strip() and not is_comment(line)
    ]
    if not content:
        raise InputRefused(
            f"{name} holds no rows.",
            why="It has nothing but empty lines and comments.",
            hint="Check the file.",
            code="table-empty",
        )
    content = content[:_SAMPLE_ROWS]
    delimiter, edges = _division([line for _, line in content])
    split = splitter(delimiter, edges)
    first = split(content[0][1])
    is_named = _are_names(first)
    if is_named:
        names, rest = first, content[1:]
        below = _names_below(first, rest, split)
        if below:
            names, rest = below, rest[1:]
    else:
        names, rest = _names_above(lines[: content[0][0]], delimiter, len(first)), content
    units, rest = _units_below(rest, split, len(names or first))
    first_row = rest[0][0] if rest else content[-1][0] + 1
    return TableShape(
        delimiter,
        tuple(_tidy(each) for each in names or [str(number + 1) for number in range(len(first))]),
        units or (None,) * len(names or first),
        first_row,
        bool(names),
        edges,
    )


def splitter(delimiter: str, edges: Sequence[int]) -> Callable[[str], list[str]]:
    """How one line becomes cells; quotes that span lines are left to the csv module."""
    if not delimiter:
        return lambda line: split_at(line, edges)
    if delimiter == " ":
        return split_words
    if delimiter == "  ":
        return split_blanks

    def split(line: str) -> list[str]:
        if '"' not in line:
            return line.split(delimiter)
        try:
            return next(csv.reader([line], delimiter=delimiter), [])
        except csv.Error:
            return line.split(delimiter)

    return split


def _division(lines: Sequence[str]) -> tuple[str, tuple[int, ...]]:
    """What stands between the columns, and where they begin when nothing does."""
    bare = [_QUOTED.sub("", line) for line in lines]
    best, best_share = "", 0.0
    for delimiter in _DELIMITERS:
        expected = bare[0].count(delimiter)
        if expected:
            share = sum(line.count(delimiter) == expected for line in bare) / len(bare)
            if share > best_share:
                best, best_share = delimiter, share
    if best and best_share >= 0.5:
        return best, ()
    by_space = _spaces(lines)
    if by_space is not None:
        return by_space
    return (best or " "), ()


def _spaces(lines: Sequence[str]) -> tuple[str, tuple[int, ...]] | None:
    rows = [line for line in lines if not _RULER.fullmatch(line)]
    ruler = next((line for line in lines if _RULER.fullmatch(line) and " " in line.strip()), None)
    if ruler is not None and rows:
        edges = _runs([ruler])
        names = split_at(rows[0], edges)
        if len(edges) > 1 and all(names) and " ".join(names).split() == rows[0].split():
            return "", edges
    for delimiter, split in ((" ", split_words), ("  ", split_blanks)):
        expected = len(split(rows[0]))
        if expected > 1 and sum(len(split(row)) == expected for row in rows) >= _MOST * len(rows):
            return delimiter, ()
    edges = _runs([ruler]) if ruler is not None else _runs(rows)
    return ("", edges) if len(edges) > 1 else None


def _runs(lines: Sequence[str]) -> tuple[int, ...]:
    """Where the runs of places begin that are blank in no line."""
    width = max(len(line) for line in lines)
    if width > 20_000:
        return ()
    blank = [all(place >= len(line) or line[place] == " " for line in lines) for place in range(width)]
    begins = [place for place in range(width) if not blank[place] and (place == 0 or blank[place - 1])]
    if len(lines) < 2:
        return tuple(begins)
    # One blank and no name over what follows: a space inside the cells of one column.
    head = lines[0].ljust(width)
    ends = [*begins[1:], width]
    return tuple(
        begin
        for begin, end in zip(begins, ends, strict=True)
        if begin == 0 or head[begin:end].strip() or (begin > 1 and blank[begin - 2])
    )


def looks_like_number(cell: str) -> bool:
    """Whether a cell is a number or a date, which no column is named by."""
    text = cell.strip().replace(MINUS_SIGN, "-")
    return bool(_NUMBER.fullmatch(text) or _DATE.fullmatch(text))


def _are_names(cells: Sequence[str]) -> bool:
    return not any(looks_like_number(cell) for cell in cells) and any(
        any(character.isalpha() for character in cell) for cell in cells
    )


def _names_above(lines: Sequence[str], delimiter: str, number: int) -> list[str]:
    """Names in the last comment above the rows that has as many words as there are columns."""
    split = splitter(delimiter or " ", ())
    for line in reversed(lines):
        if is_comment(line):
            for way in (split, split_words):
                cells = [cell.strip() for cell in way(line.lstrip("#").strip())]
                if len(cells) == number and _are_names(cells):
                    return cells
    return []


def _names_below(
    first: Sequence[str], rest: Sequence[tuple[int, str]], split: Callable[[str], list[str]]
) -> list[str]:
    """Names in the second line, where the first only groups them (cells that a spreadsheet has merged)."""
    rows = [split(line) for _, line in rest[:2]]
    if len(rows) < 2 or any(len(row) != len(first) for row in rows):
        return []
    second = [cell.strip() for cell in rows[0]]
    empty = sum(not cell.strip() for cell in first)
    is_fuller = empty > 0 and sum(not cell for cell in second) < empty
    if not is_fuller or not _are_names(second) or _are_units(second) or _are_names(rows[1]):
        return []
    second = [below or above.strip() for above, below in zip(first, second, strict=True)]
    if len(set(second)) == len(second):
        return second
    # Alike names are told apart by their group, which stands over the first of its columns.
    groups: list[str] = []
    for cell in first:
        groups.append(cell.strip() or (groups[-1] if groups else ""))
    repeated = {name for name in second if second.count(name) > 1}
    return [
        f"{group} {name}".strip() if name in repeated else name
        for group, name in zip(groups, second, strict=True)
    ]


def _units_below(
    content: Sequence[tuple[int, str]], split: Callable[[str], list[str]], number: int
) -> tuple[tuple[str | None, ...], Sequence[tuple[int, str]]]:
    """Units in the line under the names, if there is one, and the lines after it and after any ruler."""
    units: tuple[str | None, ...] = ()
    rest = list(content)
    for _ in range(3):
        if not rest:
            break
        line = rest[0][1]
        if _RULER.fullmatch(line.replace("|", "-").replace("\t", " ").replace(",", "-")):
            rest.pop(0)
            continue
        cells = split(line)
        if units or len(cells) != number or not _are_units(cells):
            break
        units = tuple(_unit(cell) for cell in cells)
        rest.pop(0)
    return units, rest


def _are_units(cells: Sequence[str]) -> bool:
    given = [cell.strip() for cell in cells if cell.strip(" -")]
    # One word alone could as well be a cell of a row: K is a band too.
    enough = len(given) > 1 or (bool(given) and _BRACKETS.fullmatch(given[0]) is not None)
    return enough and all(_BRACKETS.fullmatch(cell) or _is_unit(cell) for cell in given)


def _is_unit(text: str) -> bool:
    return text.casefold() in _OTHER_UNITS or any(
        text in family.factors or text == family.symbol for family in FAMILIES.values() if family.symbol
    )


def _unit(cell: str) -> str | None:
    text = cell.strip(" -")
    found = _BRACKETS.fullmatch(text)
    return (found[1].strip() if found else text) or None


def _tidy(name: str) -> str:
    return " ".join(name.strip().lstrip("#").split())[:LONGEST_NAME]
