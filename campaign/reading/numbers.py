"""Plain numbers and plain names, read strictly: the same text means the same thing everywhere.

``float()`` accepts ``nan``, ``1_000``, full-width digits and turns ``1e400`` into infinity. None of
these may reach a catalogue, so every number that a person types goes through ``read_number``.
"""

from __future__ import annotations

import math
import re
import unicodedata

from campaign.errors import InputRefused

MINUS_SIGN = "\u2212"
# Exponents of up to four digits are enough to say "too large" properly; longer ones are refused as text.
UNSIGNED = r"(?:[0-9]+(?:\.[0-9]*)?|\.[0-9]+)(?:[eE][+-]?[0-9]{1,4})?"
_NUMBER = re.compile(rf"[+-]?{UNSIGNED}")
_REFUSED_CATEGORIES = {
    "Cc": "a control character",
    "Cf": "an invisible formatting character",
    "Cs": "half of a surrogate pair",
    "Zl": "a line separator",
    "Zp": "a paragraph separator",
}
_SHOWN_LENGTH = 60
MAX_NUMBER_LENGTH = 200


def quoted(text: str) -> str:
    """The text in quotes, safe to print: invisible characters escaped, long texts cut."""
    shown = "".join(c if c.isprintable() else f"\\u{ord(c):04x}" for c in text[:_SHOWN_LENGTH])
    return f'"{shown}{"…" if len(text) > _SHOWN_LENGTH else ""}"'


def refusal(
    name: str, text: str, why: str, accepted_form: str, code: str, *, message: str = "", remark: str = ""
) -> InputRefused:
    """An ``InputRefused`` with what, why and an accepted form, the same for every reader."""
    return InputRefused(
        message or f"{name}: cannot read {quoted(text)}.",
        why=why,
        hint=f"Write it like this: {accepted_form}{f' ({remark})' if remark else ''}",
        code=code,
        details={"name": name, "text": text, "accepted_form": accepted_form},
    )


def forbidden_character(text: str) -> str | None:
    """Describe the first character that plain text may not hold, or None."""
    for position, character in enumerate(text, start=1):
        kind = _REFUSED_CATEGORIES.get(unicodedata.category(character))
        if kind:
            return f"character {position} is {kind} (U+{ord(character):04X})"
    return None


def check_plain_text(text: str, name: str, max_length: int = 120) -> str:
    """Return ``text`` with its spaces trimmed and squeezed, or refuse it.

    Brackets and other markup are kept: they are plain characters here and are shown literally.

    Raises
    ------
    InputRefused
        Empty text, text longer than ``max_length``, control or invisible formatting characters,
        line and paragraph separators, lone surrogates.
    """
    squeezed = " ".join(text.split())
    visible = "".join(c for c in squeezed if unicodedata.category(c) not in _REFUSED_CATEGORIES)
    example = " ".join(visible.split())[:max_length].strip() or "Lantern 3"[:max_length].strip()
    found = forbidden_character(text)
    if found:
        why = f"One line of visible characters is expected, but {found}."
        raise refusal(name, text, why, example, "text-not-plain")
    if not squeezed:
        raise refusal(name, text, "A text is expected, but there is none.", example, "text-empty")
    if len(squeezed) > max_length:
        why = f"At most {max_length} characters are expected, but there are {len(squeezed)}."
        raise refusal(name, text, why, example, "text-too-long")
    return squeezed


def name_key(text: str) -> str:
    """The key under which a name is unique: compatibility forms unified, case and spaces ignored."""
    key = text
    while True:
        # Folding can undo the normal form and removing a space can let marks compose: repeat until stable.
        folded = "".join(unicodedata.normalize("NFKC", key).casefold().split())
        if folded == key:
            return key
        key = folded


def _reason(text: str) -> str:
    """Why ``text`` is not a number, as exactly as can be told."""
    found = forbidden_character(text)
    bare = text.lower().lstrip("+-")
    checks: tuple[tuple[bool, str], ...] = (
        (not text, "A number is expected, but there is none."),
        (len(text) > MAX_NUMBER_LENGTH, f"A number has at most {MAX_NUMBER_LENGTH} characters."),
        (found is not None, f"A number is expected, but {found}."),
        ("," in text, "A decimal point is expected; a comma is read neither as decimal nor thousands mark."),
        ("_" in text, "A number is expected; underscores between digits are not accepted."),
        (
            any(c.isnumeric() and not c.isascii() for c in text),
            "A number in the digits 0 to 9 is expected; other digits are not accepted.",
        ),
        (
            bare.startswith(("nan", "inf")),
            "A finite number is expected; leave out what is not known.",
        ),
        (
            re.fullmatch(rf"[+-]?{UNSIGNED}[0-9]*", text) is not None,
            "A finite number is expected; this exponent is beyond what can be computed with.",
        ),
    )
    for applies, reason in checks:
        if applies:
            return reason
    return "A number is expected: digits 0 to 9, an optional sign, decimal point and exponent."


def read_number(text: str, name: str = "number", example: str = "12.5") -> float:
    """Read one finite number.

    Accepted: the digits 0 to 9, a sign (``+``, ``-`` or U+2212), a decimal point, an exponent.

    Parameters
    ----------
    text
        What was typed.
    name
        The option or column that the text belongs to, for the refusal.
    example
        An accepted form to show in the refusal.

    Raises
    ------
    InputRefused
        Anything else, also numbers whose size overflows or vanishes in double precision.
    """
    squeezed = text.strip(" ").replace(MINUS_SIGN, "-")
    if len(squeezed) <= MAX_NUMBER_LENGTH and _NUMBER.fullmatch(squeezed):
        number = float(squeezed)
        vanished = number == 0.0 and any(c in "123456789" for c in re.split("[eE]", squeezed)[0])
        if math.isfinite(number) and not vanished:
            return number
    accepted, remark = example, ""
    with_point = squeezed.replace(",", ".")
    if squeezed.count(",") == 1 and _NUMBER.fullmatch(with_point) and math.isfinite(float(with_point)):
        without = squeezed.replace(",", "")
        accepted, remark = with_point, f"or {without}, if that is meant"
    raise refusal(name, text, _reason(squeezed), accepted, "number-unreadable", remark=remark)
