"""Column types that refuse what a database would change in silence.

SQLite turns NaN into NULL, keeps a numpy integer as bytes, drops the offset of a date and ignores the
length of a text. These types stop such values before any statement runs, on every database alike.
"""

from __future__ import annotations

import json
import math
import operator
import unicodedata
from datetime import UTC, datetime
from typing import Any

from sqlalchemy import Dialect, Double, Integer, String, Text, TypeDecorator
from sqlalchemy.exc import DontWrapMixin

from campaign.errors import DatabaseUnusable, InputRefused

MOST_NEGATIVE_WHOLE = -(2**31)
MOST_POSITIVE_WHOLE = 2**31 - 1


class ValueRefused(InputRefused, DontWrapMixin):
    """A value that a column must not hold; reaches the caller as it is, unwrapped by SQLAlchemy."""

    default_code = "value-refused"


class StoredValueUnreadable(DatabaseUnusable, DontWrapMixin):
    """What the database holds is nothing that this program ever wrote there."""

    default_code = "database-damaged"


def unreadable(what: str) -> StoredValueUnreadable:
    """The error for a stored value that makes no sense."""
    return StoredValueUnreadable(
        f"The database holds {what}, which campaign never writes.",
        why="The file was damaged, or changed by another program.",
        hint="Keep the file as it is, and name a copy from before with --db.",
    )


class Names(dict[int, str]):
    """Names by number; a number that has none is damage, since references are kept whole."""

    def __missing__(self, number: int) -> str:
        raise unreadable(f"a reference to entry {number} that is not there")


def _shown(value: object) -> str:
    text = repr(value)
    return text if len(text) <= 60 else text[:57] + "..."


class Real(TypeDecorator[float]):
    """A finite float64. numpy.float64 passes; float32, bool, text and numpy integers do not."""

    impl = Double
    cache_ok = True

    def process_bind_param(self, value: Any, dialect: Dialect | None) -> float | None:
        if value is None:
            return None
        if isinstance(value, float):
            number = float(value)
        elif isinstance(value, int) and not isinstance(value, bool):
            number = float(value)
            if number != value:
                raise ValueRefused(
                    f"The whole number {_shown(value)} does not fit a float64.",
                    why="Its last digits would be lost.",
                )
        else:
            raise ValueRefused(
                f"{_shown(value)} is a {type(value).__name__}, not a float.",
                why="Only Python floats and numpy.float64 keep all digits of a measurement.",
                hint="Convert it first, for example with float(...).",
            )
        if not math.isfinite(number):
            raise ValueRefused(
                f"{number} is not a number that can be kept.",
                why="An unknown value is left out; NaN and infinities are never stored.",
                hint="Leave the value out when it is not known.",
            )
        return number


class Whole(TypeDecorator[int]):
    """An integer of 32 bits. numpy integers are converted; floats, bools and text are refused."""

    impl = Integer
    cache_ok = True

    def process_bind_param(self, value: Any, dialect: Dialect | None) -> int | None:
        if value is None:
            return None
        if type(value) is not int:
            if isinstance(value, bool):
                raise ValueRefused(f"{value} is a truth value, not a whole number.")
            try:
                value = operator.index(value)
            except TypeError:
                raise ValueRefused(
                    f"{_shown(value)} is a {type(value).__name__}, not a whole number.",
                    hint="Give a whole number without a decimal point.",
                ) from None
        if not MOST_NEGATIVE_WHOLE <= value <= MOST_POSITIVE_WHOLE:
            raise ValueRefused(
                f"{_shown(value)} is outside the whole numbers that every database can hold.",
                why=f"The limits are {MOST_NEGATIVE_WHOLE} and {MOST_POSITIVE_WHOLE}.",
            )
        return int(value)


def refuse_control_characters(text: str, *, allowed: str = "") -> None:
    """Refuse control, direction-changing and unpaired surrogate characters in ``text``.

    Raises
    ------
    ValueRefused
        With the position and the code point of the first such character.
    """
    if text.isprintable():
        return
    for position, character in enumerate(text):
        if character in allowed:
            continue
        if unicodedata.category(character) in {"Cc", "Cf", "Cs", "Zl", "Zp"}:
            raise ValueRefused(
                f"The text {_shown(text)} holds the invisible character U+{ord(character):04X}.",
                why="Control and direction-changing characters can forge what a terminal shows.",
                hint=f"Remove character {position + 1} and try again.",
                code="control-character",
                details={"position": position, "code_point": f"U+{ord(character):04X}"},
            )


def _text(value: Any, longest: int | None, allowed: str) -> str | None:
    if value is None:
        return None
    if not isinstance(value, str):
        raise ValueRefused(f"{_shown(value)} is a {type(value).__name__}, not text.")
    if longest is not None and len(value) > longest:
        raise ValueRefused(
            f"The text {_shown(value)} has {len(value)} characters.",
            why=f"At most {longest} can be kept here.",
            hint="Shorten it, or put the rest into the notes.",
        )
    refuse_control_characters(value, allowed=allowed)
    return str(value)


class Line(TypeDecorator[str]):
    """One line of text with a greatest length that holds on every database."""

    impl = String
    cache_ok = True

    def __init__(self, length: int) -> None:
        super().__init__(length)
        self.longest = length

    def process_bind_param(self, value: Any, dialect: Dialect | None) -> str | None:
        return _text(value, self.longest, "")


class Prose(TypeDecorator[str]):
    """Text of several lines: line feeds and tabs are kept, other control characters refused."""

    impl = Text
    cache_ok = True
    longest = 100_000

    def process_bind_param(self, value: Any, dialect: Dialect | None) -> str | None:
        return _text(value, self.longest, "\n\t")


class Choice(TypeDecorator[str]):
    """One word of a closed list. The list lives here and not in a CHECK, so that it can grow."""

    impl = String
    cache_ok = True

    def __init__(self, *words: str) -> None:
        super().__init__(32)
        self.words = words

    def process_bind_param(self, value: Any, dialect: Dialect | None) -> str | None:
        if value is not None and value not in self.words:
            raise ValueRefused(
                f"{_shown(value)} is not one of the words that are known here.",
                hint="Use one of: " + ", ".join(self.words) + ".",
                details={"accepted": list(self.words)},
            )
        return None if value is None else str(value)


def utc_text(instant: datetime) -> str:
    """An aware datetime as UTC text of fixed width, so that text order is time order.

    Raises
    ------
    ValueRefused
        For a naive datetime, or one that leaves the years 1 to 9999 when moved to UTC.
    """
    if not isinstance(instant, datetime):
        raise ValueRefused(f"{_shown(instant)} is a {type(instant).__name__}, not a date with time.")
    if instant.utcoffset() is None:
        raise ValueRefused(
            f"The time {instant.isoformat()} has no time zone.",
            why="Without its offset from UTC it could be any of 26 instants.",
            hint="Give an aware datetime, for example datetime.now(UTC).",
        )
    try:
        utc = instant.astimezone(UTC)
    except OverflowError:
        raise ValueRefused(f"The time {instant.isoformat()} is outside the years 1 to 9999 in UTC.") from None
    # strftime("%Y") does not pad years below 1000 on every platform.
    return (
        f"{utc.year:04d}-{utc.month:02d}-{utc.day:02d}"
        f"T{utc.hour:02d}:{utc.minute:02d}:{utc.second:02d}.{utc.microsecond:06d}Z"
    )


class UtcText(TypeDecorator[datetime]):
    """An aware datetime kept as ``2031-04-07T03:12:10.000000Z``."""

    impl = String
    cache_ok = True

    def __init__(self) -> None:
        super().__init__(27)

    def process_bind_param(self, value: Any, dialect: Dialect | None) -> str | None:
        return None if value is None else utc_text(value)

    def process_result_value(self, value: Any, dialect: Dialect | None) -> datetime | None:
        if value is None:
            return None
        try:
            return datetime.fromisoformat(value)
        except (TypeError, ValueError):
            raise unreadable(f"the time {_shown(value)}") from None


class JsonText(TypeDecorator[Any]):
    """A JSON document as text with sorted keys; the same document is always the same text."""

    impl = Text
    cache_ok = True

    def process_bind_param(self, value: Any, dialect: Dialect | None) -> str | None:
        return None if value is None else json_text(value)

    def process_result_value(self, value: Any, dialect: Dialect | None) -> Any:
        if value is None:
            return None
        try:
            return json.loads(value)
        except (TypeError, ValueError):
            raise unreadable(f"the document {_shown(value)}") from None


def json_text(value: Any) -> str:
    """``value`` as compact JSON with sorted keys and all digits.

    Raises
    ------
    ValueRefused
        For NaN, infinities and anything that JSON cannot hold.
    """
    try:
        return json.dumps(value, sort_keys=True, allow_nan=False, ensure_ascii=False, separators=(",", ":"))
    except (TypeError, ValueError) as error:
        raise ValueRefused(f"{_shown(value)} cannot be kept as JSON.", why=str(error)) from None
