"""Tables that keep inside the window: squeezed first, then shorter by columns whose absence is said.

In a pipe a table is plain aligned text, one record a line, at its natural width.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import Literal

from rich.cells import cell_len

from campaign.output.console import Screen, Span, fold


@dataclass(frozen=True, slots=True)
class Column:
    """One column. Only a column that ``shrinks`` is ever wrapped; the highest ``drop`` is left out first.

    ``drop`` 0 means never. ``name`` is what the sentence on columns left out calls it, when the heading
    is not clear alone.
    """

    heading: str
    align: Literal["left", "right"] = "left"
    shrinks: bool = False
    drop: int = 0
    min_width: int = 8
    name: str = ""


@dataclass(frozen=True, slots=True)
class Cell:
    """The text of one cell with a style given by code."""

    text: str
    style: str = ""


Row = Sequence[str | Cell]


@dataclass(frozen=True, slots=True)
class _Layout:
    kept: tuple[int, ...]
    widths: tuple[int, ...]
    gap: int


def print_table(screen: Screen, columns: Sequence[Column], rows: Sequence[Row]) -> None:
    """Write the table; under it, when it had to be cut, which columns were left out."""
    columns = [replace(column, heading=screen.spell(column.heading)) for column in columns]
    texts = _spelled(screen, rows)
    if screen.width is None:
        _print_plain(screen, columns, texts)
        return
    layout = _choose_layout(columns, texts, screen.width)
    if layout is None:
        _print_stacked(screen, columns, texts)
        return
    _print_squeezed(screen, columns, texts, layout)
    left_out = [columns[i].name or columns[i].heading for i in range(len(columns)) if i not in layout.kept]
    if left_out:
        screen.wrapped(f"Left out at {screen.width} columns: {', '.join(left_out)}.", style="dim")


def fits(screen: Screen, columns: Sequence[Column], rows: Sequence[Row]) -> bool:
    """Whether the table fits the screen with every column and a gap of two."""
    if screen.width is None:
        return True
    texts = _spelled(screen, rows)
    least = _least_widths(columns, _natural_widths(columns, texts))
    return sum(least) + 2 * (len(columns) - 1) <= screen.width


def _spelled(screen: Screen, rows: Sequence[Row]) -> list[list[Cell]]:
    return [
        [
            Cell(screen.spell(cell)) if isinstance(cell, str) else Cell(screen.spell(cell.text), cell.style)
            for cell in row
        ]
        for row in rows
    ]


def _natural_widths(columns: Sequence[Column], texts: Sequence[Sequence[Cell]]) -> list[int]:
    return [
        max([cell_len(column.heading), *(cell_len(row[i].text) for row in texts)])
        for i, column in enumerate(columns)
    ]


def _least_widths(columns: Sequence[Column], natural: Sequence[int]) -> list[int]:
    return [
        min(width, max(column.min_width, cell_len(column.heading))) if column.shrinks else width
        for column, width in zip(columns, natural, strict=True)
    ]


def _choose_layout(columns: Sequence[Column], texts: Sequence[Sequence[Cell]], room: int) -> _Layout | None:
    """The gentlest squeeze that fits: gaps, then text columns, then columns left out; None if none does."""
    natural = _natural_widths(columns, texts)
    least = _least_widths(columns, natural)
    kept = list(range(len(columns)))
    while True:
        for gap in (2, 1):
            spare = room - sum(least[i] for i in kept) - gap * (len(kept) - 1)
            if spare >= 0 and (gap == 1 or spare >= _wanted(columns, natural, least, kept)):
                return _Layout(tuple(kept), tuple(_share(natural, least, kept, spare)), gap)
        droppable = [i for i in kept if columns[i].drop > 0]
        if not droppable:
            return None
        kept.remove(max(droppable, key=lambda i: (columns[i].drop, i)))


def _wanted(
    columns: Sequence[Column], natural: Sequence[int], least: Sequence[int], kept: Sequence[int]
) -> int:
    """How far short columns are allowed to fall before the gap closes: long prose never widens a gap."""
    return sum(min(natural[i] - least[i], 8) for i in kept if columns[i].shrinks)


def _share(natural: Sequence[int], least: Sequence[int], kept: Sequence[int], spare: int) -> list[int]:
    """Widths of the kept columns, the spare cells given where they are missed, a cell at a time."""
    widths = {i: least[i] for i in kept}
    while spare > 0:
        hungry = [i for i in kept if widths[i] < natural[i]]
        if not hungry:
            break
        for i in hungry[:spare]:
            widths[i] += 1
        spare -= min(spare, len(hungry))
    return [widths[i] for i in kept]


def _padded(text: str, width: int, align: str) -> str:
    blank = " " * max(0, width - cell_len(text))
    return blank + text if align == "right" else text + blank


def _print_plain(screen: Screen, columns: Sequence[Column], texts: Sequence[Sequence[Cell]]) -> None:
    widths = _natural_widths(columns, texts)
    headings = [column.heading for column in columns]
    for row in [headings, *([cell.text for cell in row] for row in texts)]:
        padded = [_padded(*each) for each in zip(row, widths, [c.align for c in columns], strict=True)]
        screen.line("  ".join(padded))


def _print_squeezed(
    screen: Screen, columns: Sequence[Column], texts: Sequence[Sequence[Cell]], layout: _Layout
) -> None:
    from rich.box import Box
    from rich.table import Table
    from rich.text import Text

    # Our own look: no frame, a thin rule under the headings and nothing else.
    rule = "─" if screen.unicode else "-"
    box = Box("    \n    \n " + rule * 2 + " \n    \n    \n    \n    \n    \n")
    table = Table(
        box=box, show_edge=False, pad_edge=False, padding=(0, layout.gap - 1, 0, 0), header_style="bold",
        collapse_padding=False, width=sum(layout.widths) + layout.gap * (len(layout.widths) - 1),
    )  # fmt: skip
    for i, width in zip(layout.kept, layout.widths, strict=True):
        column = columns[i]
        table.add_column(
            Text(column.heading), justify=column.align, width=width, no_wrap=not column.shrinks,
            overflow="fold",
        )  # fmt: skip
    for row in texts:
        table.add_row(*(Text(row[i].text, style=row[i].style) for i in layout.kept))
    screen.show(table)


def _print_stacked(screen: Screen, columns: Sequence[Column], texts: Sequence[Sequence[Cell]]) -> None:
    """A window too narrow for any table: each record as a short paragraph of heading and value."""
    for number, row in enumerate(texts):
        if number:
            screen.line("")
        for column, cell in zip(columns, row, strict=True):
            if not cell.text:
                continue
            pieces = fold(f"{column.name or column.heading}: {cell.text}", screen.width, hang=2)
            for place, piece in enumerate(pieces):
                screen.line("  " if place else "", Span(piece, cell.style))
