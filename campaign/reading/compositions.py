"""The composition of a wind as people write it: the name of a mix, or mass fractions."""

from __future__ import annotations

import re

from campaign.errors import InputRefused
from campaign.model.compositions import MIXES, Composition
from campaign.model.measured import Measured
from campaign.reading.numbers import MAX_NUMBER_LENGTH, check_plain_text, refusal
from campaign.reading.values import read_measured

# Symbols that a mean molecular weight can be computed for.
SYMBOLS = ("H", "He", "C", "N", "O", "Ne", "Mg", "Si", "S", "Fe")
_ACCEPTED = '"He=0.5 C=0.4 O=0.1"'
_PAIR = re.compile(r"([A-Za-z]+)\s*=\s*([^=,;]+?)(?=$|[\s,;]+[A-Za-z]+\s*=)")
# How far from 1 a sum may be that was only rounded.
_ROUNDED = 0.02


def read_composition(text: str, name: str = "--composition-a") -> Composition:
    """Read ``solar``, ``WC``, ... or mass fractions such as ``He=0.5±0.1 C=0.4±0.1 O=0.1``.

    Fractions are those of mass and sum to 1 but for rounding. A fraction without an error belongs to the mix
    as stated.

    Raises
    ------
    InputRefused
        An unknown mix or element, an element given twice, fractions that do not sum to 1.
    """
    plain = check_plain_text(text, name, MAX_NUMBER_LENGTH)
    for mix in MIXES.values():
        if plain.casefold() == mix.name.casefold():
            return mix
    if "=" not in plain:
        raise _refused(name, text, f"It is one of {', '.join(MIXES)}, or mass fractions by element.")
    pairs = _PAIR.findall(plain)
    if _PAIR.sub("", plain).strip(" ,;"):
        raise _refused(name, text, "Mass fractions are pairs of an element and a number.")
    fractions: list[tuple[str, Measured]] = []
    for symbol, value in pairs:
        known = next((each for each in SYMBOLS if each.casefold() == symbol.casefold()), None)
        if known is None:
            raise _refused(name, text, f"'{symbol}' is none of {', '.join(SYMBOLS)}.")
        if any(known == each for each, _ in fractions):
            raise _refused(name, text, f"{known} is given twice.")
        fractions.append((known, read_measured(value, "fraction", name, low=0.0, high=1.0)))
    whole = sum(value.value for _, value in fractions)
    if abs(whole - 1.0) > _ROUNDED:
        raise _refused(name, text, f"Mass fractions sum to 1, these to {whole:.6g}.")
    shown = " ".join(f"{symbol} {value.value:g}" for symbol, value in fractions)
    return Composition(shown, tuple(fractions), "as given")


def _refused(name: str, text: str, why: str) -> InputRefused:
    return refusal(name, text, why, f"{name} {_ACCEPTED}", "composition-refused", remark="or WC, WN, solar")
