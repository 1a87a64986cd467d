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

    # From stars that all but touch to orbits that no observer will see closed.
    return read_measured_or_bound(text, "d", "--period", low=0.01, high=3.6525e9)


def semi_major_axis(text: str | None) -> tuple[Measured | None, Measured | None]:
    """Size of an orbit as (au, arcsec): whichever the unit says."""
    if text is None:
        return None, None
    if any(word in text.casefold() for word in ("arcsec", "mas", '"', "″")):
        return None, measured(text, "arcsec", "--a", low=0.0, low_open=True)
    return measured(text, "au", "--a", low=0.0, low_open=True), None


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


def limited(text: str, unit: str, name: str, limit_sigma: str | None, **domain: Any) -> dict[str, Any]:
    """Value or limit of one observation, as fields of it."""
    from campaign.reading.numbers import read_number
    from campaign.reading.values import read_measured_or_bound

    sigma = 3.0 if limit_sigma is None else read_number(limit_sigma, "--limit-sigma")
    value = read_measured_or_bound(text, unit, name, limit_sigma=sigma, **domain)
    if isinstance(value, Range):
        raise InputRefused(
            f"{name}: a range is no observation.",
            why="An observation is a value with its error, or a limit.",
            hint="For example 7.31±0.03, or >12.1 for too faint, or <6.0 for saturated.",
            code="value-unreadable",
        )
    if isinstance(value, Limit):
        return {
            "value": Measured(value.bound),
            "unit": unit,
            "limit_side": value.side,
            "limit_sigma": value.limit_sigma,
        }
    return {"value": value, "unit": unit}


MOST_SHELLS = 10_000


def shell_index(text: str) -> int:
    """The index of a shell: 1 for the youngest visible."""
    from campaign.reading.numbers import read_number

    value = read_number(text, "--index")
    if value != int(value) or not 1 <= value <= MOST_SHELLS:
        raise InputRefused(
            f"A shell cannot have the index {text}.",
            why="The youngest visible shell has index 1, the next 2, and so on.",
            hint="For example --index 1, or leave it out when it is not known.",
            code="index-refused",
        )
    return int(value)


def whole_number(text: str, name: str, limit: int, example: int) -> int:
    """A whole number no farther from zero than ``limit``."""
    from campaign.reading.numbers import read_number

    value = read_number(text, name)
    if value == int(value) and abs(value) <= limit:
        return int(value)
    raise InputRefused(
        f"{name} {text} cannot be.",
        why=f"It is a whole number from {-limit} to {limit}.",
        hint=f"For example {name} {example}.",
        code="out-of-range",
    )


def plain_number(text: str | None, unit: str, name: str, **domain: Any) -> float | None:
    """A number with an optional unit, for what is kept without an error; an error given is refused."""
    if text is None:
        return None
    from campaign.reading.values import read_plain_value

    return read_plain_value(text, unit, name, **domain)


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


def count(text: str | None, name: str, low: int, high: int) -> int | None:
    """A whole number of draws, or a seed, within bounds."""
    if text is None:
        return None
    from campaign.reading.numbers import read_number

    value = read_number(text, name)
    if value == int(value) and low <= value <= high:
        return int(value)
    raise InputRefused(
        f"{name} {text} is out of range.",
        why=f"It is a whole number from {low} to {high}.",
        hint=f"For example {name} {max(low, 2000) if name == '--draws' else 1}.",
        code="out-of-range",
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
