"""Text cells that a spreadsheet would run as a formula, guarded by an apostrophe and set free again.

A text that begins with ``=``, ``+``, ``-``, ``@`` (or their full-width forms, also after spaces), or with
a tab or line feed, gets one apostrophe in front, and so does one that looks guarded already. Taking one
apostrophe from every text that looks guarded therefore gives back each text exactly. Numbers are left
alone.
"""

from __future__ import annotations

import re

# Nothing else can begin a text that needs the guard: most texts are done after one look.
_FIRST = frozenset("=+-@＝＋－＠' \t\r\n")
_RUNS = re.compile(r"'*(?:[ \t\r\n]*[=+\-@＝＋－＠]|[\t\r\n])")
_GUARDED = re.compile(r"'+(?:[ \t\r\n]*[=+\-@＝＋－＠]|[\t\r\n])")


def guarded(text: str) -> str:
    """``text`` as a cell that no spreadsheet runs.

    >>> guarded("=1+1"), guarded("-45"), guarded("'=x"), guarded("Lantern 3")
    ("'=1+1", "'-45", "''=x", 'Lantern 3')
    """
    if text and text[0] in _FIRST and _RUNS.match(text):
        return "'" + text
    return text


def unguarded(text: str) -> str:
    """The text that :func:`guarded` was given.

    >>> unguarded("'=1+1"), unguarded("''=x"), unguarded("'t Hooft"), unguarded("=1")
    ('=1+1', "'=x", "'t Hooft", '=1')
    """
    if text and text[0] == "'" and _GUARDED.match(text):
        return text[1:]
    return text
