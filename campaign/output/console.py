"""The screen that a result is written to: its width, and which characters and colours it can show.

Nothing here reads the environment: a command passes it in, and a test makes any screen it likes.
"""

from __future__ import annotations

import io
import os
from collections.abc import Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING, TextIO

from campaign.output.safe import visible

if TYPE_CHECKING:
    from rich.console import Console, RenderableType

DEFAULT_WIDTH = 80
SMALLEST_WIDTH = 20

# What a screen without Unicode shows instead of the characters that we use ourselves.
_PLAIN_FORMS = str.maketrans(
    {
        "±": "+-", "−": "-", "–": "-", "—": "-", "…": "..", "·": ".", "×": "x", "°": " deg", "σ": "sigma",
        "─": "-", "│": "|", "╵": "|", "┬": "+", "▾": "v", "◇": "o", "╌": "-", "²": "^2", "→": "->",
        "●": "*", "◆": "#", "○": "o", "△": "^", "▽": "v", "┤": "+", "└": "+",
        "░": ":", "▒": "=", "▓": "%", "█": "#", "▏": "|", "▌": "#", "é": "e",
    }
)  # fmt: skip


@dataclass(frozen=True, slots=True)
class Span:
    """A piece of a line with the style that code (never data) gives it."""

    text: str
    style: str = ""


@dataclass(frozen=True, slots=True)
class Screen:
    """Where text goes. ``width`` is None in a pipe: lines then keep their natural length."""

    stream: TextIO | None
    is_terminal: bool = False
    width: int | None = None
    colour: bool = False
    unicode: bool = True

    def write(self, text: str) -> None:
        """Write as it is, but for characters that the stream cannot carry."""
        if self.stream is not None:
            self.stream.write(self._encodable(text))

    def spell(self, text: str) -> str:
        """``text`` as this screen shows it: made safe, and in characters that it has. Lay out only this."""
        text = visible(text)
        return self._encodable(text if self.unicode else text.translate(_PLAIN_FORMS))

    def _encodable(self, text: str) -> str:
        encoding = getattr(self.stream, "encoding", None) or "utf-8"
        return text if text.isascii() else text.encode(encoding, "backslashreplace").decode(encoding)

    def line(self, *spans: str | Span) -> None:
        """One line, cut nowhere: the caller keeps it inside the width. Text is made safe."""
        pieces = [(self.spell(_text(span)), _style(span)) for span in spans]
        while pieces and not (pieces[-1][0].rstrip()):
            pieces.pop()
        if pieces:
            pieces[-1] = (pieces[-1][0].rstrip(), pieces[-1][1])
        shown = [_styled(text, style) if self.colour and style else text for text, style in pieces]
        self.write("".join(shown) + "\n")

    def heading(self, text: str) -> None:
        """A title over a part of the screen."""
        self.wrapped(text, style="bold")

    def wrapped(self, text: str, *, label: str = "", hang: int = 0, style: str = "") -> None:
        """A paragraph within the width; further lines are indented by ``hang`` cells."""
        for number, piece in enumerate(fold(self.spell(label + text), self.width, hang)):
            indent = " " * hang if number else ""
            self.line(indent, Span(piece, style))

    def show(self, renderable: RenderableType) -> None:
        """Write something that rich draws."""
        console = rich_console(self)
        console.print(renderable, no_wrap=True, overflow="ignore", crop=False)
        drawn = console.file
        assert isinstance(drawn, io.StringIO)
        self.write(drawn.getvalue())


def _text(span: str | Span) -> str:
    return span.text if isinstance(span, Span) else span


def _style(span: str | Span) -> str:
    return span.style if isinstance(span, Span) else ""


def _styled(text: str, style: str) -> str:
    """``text`` between the codes of ``style``, in the sixteen colours that every terminal has."""
    from rich.color import ColorSystem
    from rich.style import Style

    return Style.parse(style).render(text, color_system=ColorSystem.STANDARD)


def fold(text: str, width: int | None, hang: int = 0) -> list[str]:
    """``text`` broken at spaces to ``width`` cells, lines after the first being ``hang`` cells shorter.

    Words that are too long are cut, so that no line is ever wider.
    """
    from rich.cells import cell_len, chop_cells

    if width is None or cell_len(text) <= width:
        return [text]
    lines: list[str] = []
    line = ""
    # Blanks in front are an indent and stay; those between words are where a line may end.
    indent = len(text) - len(text.lstrip(" ")) if text.strip() else 0
    words = text[indent:].split(" ")
    words[0] = text[:indent] + words[0]
    for word in words:
        trial = f"{line} {word}" if line else word
        if cell_len(trial) <= width - (hang if lines else 0):
            line = trial
            continue
        if line.strip():
            lines.append(line.rstrip())
        line = word
        while cell_len(line) > (room := max(2, width - (hang if lines else 0))):
            piece = chop_cells(line, room)[0]
            lines.append(piece)
            line = line[len(piece) :]
    return [*lines, line.rstrip()] if line or not lines else lines


def rich_console(screen: Screen, file: TextIO | None = None) -> Console:
    """A rich console with the limits of ``screen``, into ``file`` (by default into memory).

    Markup, highlighting and emoji names are off: style comes from code only. It is interactive only on
    a real terminal, whatever the environment claims.
    """
    from rich.console import Console

    return Console(
        file=file if file is not None else io.StringIO(),
        force_terminal=screen.colour,
        force_interactive=screen.is_terminal,
        force_jupyter=False,
        color_system="standard" if screen.colour else None,
        no_color=not screen.colour,
        width=screen.width or 10_000,
        height=25,
        markup=False,
        highlight=False,
        emoji=False,
        legacy_windows=False,
        safe_box=False,
        _environ={},
    )


def screen_for(stream: TextIO | None, environ: Mapping[str, str], width: int | None = None) -> Screen:
    """The screen behind ``stream``; ``width`` overrides what a terminal says of itself."""
    is_terminal = stream is not None and stream.isatty()
    terminal_kind = environ.get("TERM", "")
    encoding = (getattr(stream, "encoding", None) or "utf-8").lower().replace("-", "").replace("_", "")
    return Screen(
        stream=stream,
        is_terminal=is_terminal,
        width=(width or _terminal_width(stream, environ)) if is_terminal else None,
        colour=is_terminal and terminal_kind not in {"", "dumb"} and not environ.get("NO_COLOR"),
        unicode=encoding.startswith("utf"),
    )


def _terminal_width(stream: TextIO | None, environ: Mapping[str, str]) -> int:
    told = environ.get("COLUMNS", "")
    columns = int(told) if told.isascii() and told.isdigit() else 0
    if columns <= 0 and stream is not None:
        try:
            columns = os.get_terminal_size(stream.fileno()).columns
        except (OSError, ValueError):
            columns = 0
    return max(columns, SMALLEST_WIDTH) if columns > 0 else DEFAULT_WIDTH
