"""Time along a line of the screen: cells of equal length, with ticks and dates under them."""

from __future__ import annotations

import math
from collections.abc import Iterator
from datetime import date

# Periods shorter than this get days or hours; a calendar of days reaches from the year 1 to 9999.
_SHORT_D = 75.0
_DAY_STEPS = (1 / 24, 3 / 24, 6 / 24, 12 / 24, 1.0, 2.0, 5.0, 10.0, 20.0)
_ORDINAL_OF_MJD_0 = 678_576
_FIRST_DAY, _LAST_DAY = 2.0 - _ORDINAL_OF_MJD_0, float(date.max.toordinal() - _ORDINAL_OF_MJD_0 - 1)
_MONTH_STEPS = (1, 2, 3, 6, 12, 24, 60, 120, 240, 600, 1200, 2400, 6000, 12_000)


class TimeAxis:
    """Cells of equal length in days from ``start`` on (bmjd_tdb)."""

    def __init__(self, start: float, end: float, cells: int) -> None:
        self.start = start
        self.cells = max(cells, 1)
        self.step_d = (end - start) / self.cells

    def place(self, instant: float) -> int:
        """The cell of an instant, also outside the picture."""
        return int((instant - self.start) // self.step_d)

    def cell(self, instant: float) -> int | None:
        """The cell of an instant, None outside; the very end belongs to the last cell."""
        place = self.place(instant)
        if place == self.cells and instant <= self.start + self.step_d * self.cells:
            place -= 1
        return place if 0 <= place < self.cells else None

    def ticks(self) -> tuple[str, str]:
        """The axis with a tick at each labelled month or year, and the labels under it."""
        return self._drawn(self._months())

    def fine_ticks(self) -> tuple[str, str]:
        """The same, with days or hours where the axis is too short for months."""
        end = self.start + self.step_d * self.cells
        short = end - self.start < _SHORT_D and self.start >= _FIRST_DAY and end < _LAST_DAY
        return self._drawn(self._days() if short else self._months())

    def _drawn(self, labelled: Iterator[tuple[float, str]]) -> tuple[str, str]:
        rule, labels = ["─"] * self.cells, [" "] * self.cells
        free_from = 0
        for instant, text in labelled:
            place = self.cell(instant)
            if place is None:
                continue
            rule[place] = "┬"
            if place >= free_from and place + len(text) <= self.cells:
                labels[place : place + len(text)] = text
                free_from = place + len(text) + 1
        return "".join(rule), "".join(labels)

    def _months(self) -> Iterator[tuple[float, str]]:
        end = self.start + self.step_d * self.cells
        months = self._month_step()
        number = -(-_month_number(self.start) // months) * months
        while (instant := _month_start(number)) <= end:
            yield instant, _month_label(number, months)
            number += months

    def _days(self) -> Iterator[tuple[float, str]]:
        end = self.start + self.step_d * self.cells
        room = 11 * self.step_d
        step = next((step for step in _DAY_STEPS if step >= room), _DAY_STEPS[-1])
        count = math.ceil(round(self.start / step, 9))
        while (instant := count * step) <= end:
            day, hours = divmod(round(24.0 * instant), 24)
            text = f"{date.fromordinal(day + _ORDINAL_OF_MJD_0):%Y-%m-%d}"
            yield instant, text if step >= 1.0 else f"{text[5:]} {hours:02d}h"
            count += 1

    def _month_step(self) -> int:
        for months in _MONTH_STEPS:
            room = months * 30.436875 / self.step_d
            if room >= (8 if months < 12 else 6):
                return months
        return _MONTH_STEPS[-1] * max(1, round(self.step_d * 8 / (_MONTH_STEPS[-1] * 30.436875) + 0.5))


def _month_start(number: int) -> float:
    """MJD of the first day of a month counted from year 0, in the Gregorian calendar without end."""
    year, month0 = divmod(number, 12)
    # March begins the count, so that a leap day is the last of its year.
    shifted = year - (month0 < 2)
    month_from_march = (month0 - 2) % 12
    days = 365 * shifted + shifted // 4 - shifted // 100 + shifted // 400 + (153 * month_from_march + 2) // 5
    return float(days - 678_881)


def _month_number(instant: float) -> int:
    number = int((instant + 678_941.0) / 30.436875)
    while _month_start(number) > instant:
        number -= 1
    while _month_start(number + 1) <= instant:
        number += 1
    return number


def _month_label(number: int, months: int) -> str:
    year, month0 = divmod(number, 12)
    return f"{year}" if months >= 12 else f"{year}-{month0 + 1:02d}"
