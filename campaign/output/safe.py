"""Text from data, made harmless: nothing that steers a terminal or reorders a line gets through."""

from __future__ import annotations

import unicodedata
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from rich.text import Text

# Controls, format marks (bidi overrides, zero-width marks, tags), lone surrogates, line separators.
_STEERING = frozenset({"Cc", "Cf", "Cs", "Zl", "Zp"})


def visible(text: str) -> str:
    """``text`` with every steering character written as an escape that can be read.

    A newline is one of them, so that a name always stays on its line.
    """
    if text.isprintable():  # true of no character below, so that common text costs nothing
        return text
    return "".join(
        _escape(character) if unicodedata.category(character) in _STEERING else character
        for character in text
    )


def _escape(character: str) -> str:
    number = ord(character)
    if number < 0x100:
        return f"\\x{number:02x}"
    if number < 0x10000:
        return f"\\u{number:04x}"
    return f"\\U{number:08x}"


def safe_text(text: str, style: str = "") -> Text:
    """``text`` from data for rich: visible, and never read as markup or emoji names."""
    from rich.text import Text

    return Text(visible(text), style=style)
