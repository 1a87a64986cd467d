"""Names as people type them: one key for all ways to write a name, and the names nearest to a wrong one."""

from __future__ import annotations

import unicodedata
from collections.abc import Mapping
from difflib import SequenceMatcher

from campaign.catalogue.types import refuse_control_characters
from campaign.errors import InputRefused

_DASHES = str.maketrans(dict.fromkeys("\u2010\u2011\u2012\u2013\u2014\u2212", "-"))


def tidy_name(name: str) -> str:
    """``name`` without spaces at its ends and with single spaces inside.

    Raises
    ------
    InputRefused
        For an empty name or one with control characters.
    """
    refuse_control_characters(name)
    tidy = " ".join(name.split())
    if not name_key(tidy):
        raise InputRefused(
            "A name must have at least one visible character.",
            hint='Give a name, for example "Lantern 3".',
            code="name-empty",
        )
    return tidy


def name_key(name: str) -> str:
    """The form in which names are compared: without case, spaces or kinds of dash.

    >>> name_key("Lantern  3") == name_key("lantern3")
    True
    """
    folded = unicodedata.normalize("NFKC", unicodedata.normalize("NFKC", name).casefold())
    return "".join(folded.split()).translate(_DASHES)


def nearest_names(wanted: str, names: Mapping[str, str], most: int = 3) -> list[str]:
    """The names most like ``wanted``, best first; ``names`` is what to show, by the key to compare.

    A key that begins with the wanted one, or holds it, counts as near however long it is.
    """
    key = name_key(wanted)
    if not key:
        return []
    matcher = SequenceMatcher(autojunk=False)
    matcher.set_seq2(key)
    scored = []
    for candidate, shown in names.items():
        matcher.set_seq1(candidate)
        likeness = matcher.ratio() if matcher.quick_ratio() >= 0.6 else 0.0
        if len(key) >= 2 and key in candidate:
            likeness = max(likeness, 0.95 if candidate.startswith(key) else 0.85)
        if likeness >= 0.6:
            scored.append((-likeness, shown))
    return list(dict.fromkeys(shown for _, shown in sorted(scored)))[:most]
