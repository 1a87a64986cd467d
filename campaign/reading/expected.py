"""What one reading of a value expects, so that every refusal can say it and show a form that fits."""

from __future__ import annotations

from dataclasses import dataclass

from campaign.errors import InputRefused
from campaign.reading.numbers import refusal
from campaign.reading.units import FAMILIES


def short(number: float) -> str:
    """The shortest text that reads back to the same float, without a trailing ``.0``."""
    text = repr(float(number))
    return text.removesuffix(".0")


@dataclass(frozen=True, slots=True)
class Expected:
    """What one reading expects: the quantity's canonical unit, its name, and where it may lie.

    ``shown`` replaces the example that would be made up; ``with_error`` says whether that has an error.
    """

    unit: str
    name: str
    low: float | None = None
    high: float | None = None
    low_open: bool = False
    high_open: bool = False
    with_error: bool = True
    shown: str = ""

    def holds(self, value: float) -> bool:
        above = self.low is None or value > self.low or (value == self.low and not self.low_open)
        below = self.high is None or value < self.high or (value == self.high and not self.high_open)
        return above and below

    def in_words(self) -> str:
        symbol = FAMILIES[self.unit].symbol
        words = []
        if self.low is not None:
            words.append(f"{'above' if self.low_open else 'at least'} {short(self.low)}")
        if self.high is not None:
            words.append(f"{'below' if self.high_open else 'at most'} {short(self.high)}")
        return " and ".join(words) + (f" {symbol}" if symbol else "")

    def example(self) -> str:
        """An accepted form: the family's own if it lies in the range, otherwise a value inside."""
        if self.shown:
            return self.shown
        family = FAMILIES[self.unit]
        value = family.example_value
        error = f"±{short(family.example_error)}" if self.with_error else ""
        if not self.holds(value):
            error = ""
            if self.low is not None and self.high is not None:
                value = self.low + 0.5 * (self.high - self.low)
            elif self.low is not None:
                value = self.low + 1.0 + abs(self.low)
            elif self.high is not None:
                value = self.high - 1.0 - abs(self.high)
        return f"{short(value)}{error} {family.symbol}".strip()

    def refuse(self, text: str, why: str, accepted: str | None = None, code: str = "") -> InputRefused:
        return refusal(self.name, text, why, accepted or self.example(), code or "value-unreadable")
