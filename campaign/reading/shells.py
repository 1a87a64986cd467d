"""Radii of nested shells as people type them: ``1.2±0.05 arcsec``, ``3=5.52±0.02 arcsec on 2019-06-03``."""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass

from campaign.errors import InputRefused
from campaign.model.instants import TypedInstant
from campaign.model.measured import Measured
from campaign.reading.instants import read_instant
from campaign.reading.numbers import quoted, read_number, refusal
from campaign.reading.values import read_measured

MOST_SHELLS = 10_000
# Nothing smaller than a microarcsecond is resolved, and nothing larger than this is one object's dust.
LEAST_ARCSEC, MOST_ARCSEC = 1e-6, 36_000.0
EXAMPLE = "1.20±0.05 arcsec"
_DATED = re.compile(r"(?P<radius>.*\S)\s+on\s+(?P<date>\S.*)", re.IGNORECASE | re.DOTALL)
_INDEXED = re.compile(r"\s*(?P<index>[^=<>]*?)\s*=\s*(?P<radius>[^=]*)", re.DOTALL)
# What is left of a value without a unit: digits, signs, brackets, the e of an exponent.
_BARE = re.compile(r"[\s0-9.,+\-−±/()eE×^]*")


@dataclass(frozen=True, slots=True)
class TypedRadius:
    """One radius with the index and the date typed with it, if any; ``has_unit`` whether a unit was."""

    radius_arcsec: Measured
    index: int | None
    instant: TypedInstant | None
    has_unit: bool
    text: str


def read_shell_index(text: str, name: str = "--index") -> int:
    """The index of a shell: 1 for the youngest visible.

    Raises
    ------
    InputRefused
        Anything but a whole number from 1 on.
    """
    value = read_number(text, name, "1" if name == "--index" else f"1={EXAMPLE}")
    if value != int(value) or not 1 <= value <= MOST_SHELLS:
        raise InputRefused(
            f"A shell cannot have the index {text}.",
            why="The youngest visible shell has index 1, the next 2, and so on.",
            hint="For example --index 1, or leave it out when it is not known."
            if name == "--index"
            else f'For example {name} "1={EXAMPLE}", or leave the index out when it is not known.',
            code="index-refused",
        )
    return int(value)


def read_shell_radius(text: str, name: str = "--radius") -> TypedRadius:
    """Read one radius, optionally with the index of its shell before it and the date of its image after.

    Raises
    ------
    InputRefused
        Unreadable, not positive, or in a unit that is no angle.
    """
    rest, index, instant = text, None, None
    dated = _DATED.fullmatch(rest)
    if dated:
        rest = dated["radius"]
        instant = read_instant(dated["date"], default_scale="utc", default_place="geocentre", name=name)
    indexed = _INDEXED.fullmatch(rest)
    if indexed:
        rest = indexed["radius"]
        index = read_shell_index(indexed["index"], name)
    radius = read_measured(rest, "arcsec", name, low=0.0, low_open=True, high=MOST_ARCSEC, shown=EXAMPLE)
    check_size(radius, text, name, EXAMPLE, least=LEAST_ARCSEC, most=MOST_ARCSEC)
    return TypedRadius(radius, index, instant, _BARE.fullmatch(rest) is None, text)


def read_shell_radii(texts: Sequence[str], name: str = "--radius") -> list[TypedRadius]:
    """Read several radii; a unit must then be clear for each of them.

    Raises
    ------
    InputRefused
        As ``read_shell_radius``; and where some radii bear a unit other than the arcsecond and others none.
    """
    radii = [read_shell_radius(text, name) for text in texts]
    bare = [each for each in radii if not each.has_unit]
    other = [each for each in radii if each.has_unit and not _is_in_arcsec(each.text)]
    if bare and other:
        raise InputRefused(
            f"{name}: {quoted(bare[0].text)} has no unit, and {quoted(other[0].text)} is not in arcsec.",
            why="A bare number is taken as arcsec; beside another unit that is probably not what is meant.",
            hint=f'Write the unit with each of them, for example {name} "{EXAMPLE}".',
            code="mixed-units",
            details={"accepted_form": EXAMPLE, "without_unit": [each.text for each in bare]},
        )
    if len({each.instant is None for each in radii}) > 1:
        raise InputRefused(
            f"{name}: some radii have the date of their image and others have none.",
            why="Radii of several images are told apart by their dates.",
            hint=f'Write it with each of them, for example {name} "{EXAMPLE} on 2031-04-07".',
            code="image-unclear",
        )
    return radii


def check_size(read: Measured, text: str, name: str, accepted: str, *, least: float, most: float) -> Measured:
    """Refuse a positive value too small to be meant, and an error larger than any value.

    Raises
    ------
    InputRefused
        Below ``least``, or with an error above ``most``, both in the unit of the value.
    """
    if read.value < least:
        why = "It is far smaller than anything that is measured; the unit or the exponent may be wrong."
        raise refusal(name, text, why, accepted, "out-of-range", message=f"{name} {quoted(text)} cannot be.")
    if max(read.minus or 0.0, read.plus or 0.0) > most:
        why = "Its error is larger than any value; leave it out when it is not known."
        raise refusal(name, text, why, accepted, "out-of-range", message=f"{name} {quoted(text)} cannot be.")
    return read


def _is_in_arcsec(text: str) -> bool:
    return re.search(r"(?<![A-Za-z])(arcsec\w*|as)(?![\w])|[\"″]|''", text) is not None


def read_with_unit(text: str, unit: str, name: str, accepted: str, **domain: float | bool | None) -> Measured:
    """Read a value whose unit must be typed, where a bare number would be taken for something else.

    Raises
    ------
    InputRefused
        Without a unit; and as ``read_measured``.
    """
    read = read_measured(text, unit, name, shown=accepted, **domain)  # type: ignore[arg-type]
    if _BARE.fullmatch(text):
        raise refusal(
            name, text, "Years and days are both common here, and it does not say which.", accepted,
            "unit-missing", message=f"{name} {quoted(text)} has no unit.",
        )  # fmt: skip
    return read
