"""Options that several commands read the same way."""

from __future__ import annotations

from typing import Any

from campaign.errors import InputRefused
from campaign.model.instants import TypedInstant
from campaign.model.measured import Limit, Measured, Range


def measured(text: str | None, unit: str, name: str, **domain: Any) -> Measured | None:
    """A value with errors, or None when the option was not given."""
    if text is None:
        return None
    from campaign.reading.values import read_measured

    return read_measured(text, unit, name, **domain)


def period(text: str | None) -> Measured | Limit | Range | None:
    """A period in days: a value, a limit or a range."""
    if text is None:
        return None
    from campaign.reading.values import read_measured_or_bound

    return read_measured_or_bound(text, "d", "--period", low=0.0, low_open=True)


def elements_instant(text: str | None, name: str) -> TypedInstant | None:
    """An instant of orbital elements: BJD_TDB unless said otherwise."""
    if text is None:
        return None
    from campaign.reading.instants import read_instant

    return read_instant(text, default_scale="tdb", default_place="barycentre", name=name)


def clock_instant(text: str | None, name: str) -> TypedInstant | None:
    """An instant of the question (``--as-of``, ``--from``): UTC unless said otherwise."""
    if text is None:
        return None
    from campaign.reading.instants import read_instant

    return read_instant(text, default_scale="utc", default_place="geocentre", name=name)


def one_of(text: str | None, accepted: tuple[str, ...], name: str) -> str | None:
    """One of a few words, whatever its case."""
    if text is None:
        return None
    for word in accepted:
        if text.strip().casefold() == word.casefold():
            return word
    raise InputRefused(
        f"{name} '{text}' is not understood.",
        why=f"It is one of: {', '.join(accepted)}.",
        hint=f'For example {name} "{accepted[0]}".',
        code="choice-refused",
        details={"accepted": list(accepted), "accepted_form": accepted[0]},
    )


def plain(text: str | None, name: str, longest: int = 200) -> str | None:
    """Short text without control characters."""
    if text is None:
        return None
    from campaign.reading.numbers import check_plain_text

    return check_plain_text(text, name, longest)


def entry_number(text: str, name: str) -> int:
    """The number of an entry, as lists and the history show it."""
    if text.isascii() and text.isdigit() and 0 < len(text.lstrip("0")) < 10:
        return int(text)
    raise InputRefused(
        f"{name} '{text}' is not the number of an entry.",
        why="Entries are numbered 1, 2, 3, ...; lists and the history show the numbers.",
        hint="For example 12.",
        code="number-refused",
        details={"accepted_form": "12"},
    )


def upper_bound(text: str | None, default: int) -> int | None:
    """How many entries at most; 0 means no bound."""
    if text is None:
        return default
    if text.isascii() and text.isdigit() and len(text) < 10:
        return int(text) or None
    raise InputRefused(
        f"--limit '{text}' is not a whole number.",
        why="It says how many entries are shown at most.",
        hint="For example --limit 50, or --limit 0 for all.",
        code="number-refused",
        details={"accepted_form": "50"},
    )
