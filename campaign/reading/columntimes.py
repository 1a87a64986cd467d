"""Columns of instants, thousands at a time, by the very rules of ``campaign.reading.instants``.

Counts of days and dates with a clock time to the second are turned over together, in whole numbers, so that
each is the same to the last bit as when it is read alone. Everything else is read by itself.
"""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass, field
from decimal import Decimal, InvalidOperation, localcontext
from itertools import repeat
from typing import get_args

import numpy as np
from numpy.typing import NDArray

from campaign.errors import InputRefused
from campaign.model.instants import Place, Scale, TypedInstant
from campaign.model.loading import TimeMeaning
from campaign.reading.columncells import CellFault, decimal_text, plain_numbers
from campaign.reading.dates import END_MJD, FIRST_MJD, UTC_FROM_MJD
from campaign.reading.instants import read_instant
from campaign.reading.numbers import read_number
from campaign.reading.timenames import EXAMPLES

FloatArray = NDArray[np.float64]

SCALES: tuple[Scale, ...] = get_args(Scale)
PLACES: tuple[Place, ...] = get_args(Place)
_MOST_DECIMALS = 15
# A decimal is recovered from its nearest float while that is off by less than this part of its last digit.
_SURE = 0.4
_FEWEST_JD, _MOST_MJD = 100_000.0, 2_400_000.0
_PREFIX: dict[Place | None, str] = {"barycentre": "B", "heliocentre": "H"}
_SAYS_SCALE = re.compile(
    r"[zZ]$|[0-9]{2}:[0-9]{2}.*[+-][0-9]{2}:?(?:[0-9]{2})?$|UTC|\bUT\b|GMT|TT|TDB|TAI|^\s*(?:[BH]M?JD|[JB]\s?[0-9])",
    re.IGNORECASE,
)
# Days, months and decimal years are wider than what the scales differ by.
_NEEDS_SCALE = re.compile(r"[0-9]:[0-9]|JD", re.IGNORECASE)
_BARE_NUMBER = re.compile(r"\s*[0-9]{5,7}(?:\.[0-9]*)?\s*")
# Days in which UTC may have a length of its own: ends of months, and all before 1972.
_UNIFORM_FROM_MJD = 41_317
_MONTH_DAYS = np.array([0, 31, 28, 31, 30, 31, 30, 31, 31, 30, 31, 30, 31])


@dataclass(slots=True)
class TimeCells:
    """Instants of a block: MJD in two parts, errors in days (NaN: unknown), scale and place by number.

    ``texts`` keep each as it would be typed alone. What is among ``faults`` has no meaning.
    """

    day: FloatArray
    fraction: FloatArray
    minus_d: FloatArray
    plus_d: FloatArray
    scale: NDArray[np.int8]
    place: NDArray[np.int8]
    texts: list[str]
    faults: list[CellFault] = field(default_factory=list)


def read_times(
    cells: Sequence[str],
    meaning: TimeMeaning,
    name: str,
    longitudes_deg_east: Sequence[float | None] | None = None,
) -> TimeCells:
    """The instants of a column.

    Parameters
    ----------
    cells
        As they stand.
    meaning
        What the column holds; a count of days has its scale.
    name
        Of the column, for the reasons.
    longitudes_deg_east
        Of the site of each row, by which the middle of a night is known.
    """
    size = len(cells)
    times = TimeCells(
        np.zeros(size), np.zeros(size), np.full(size, np.nan), np.full(size, np.nan),
        np.full(size, SCALES.index(meaning.scale or "utc"), dtype=np.int8),
        np.full(size, PLACES.index(meaning.place or "observatory"), dtype=np.int8),
        [""] * size,
    )  # fmt: skip
    done = _counts(cells, meaning, times) if meaning.count != "text" else _clocks(cells, meaning, times)
    reader = _Alone(meaning, name)
    for place in np.flatnonzero(~done).tolist():
        longitude = None if longitudes_deg_east is None else longitudes_deg_east[place]
        reader.read(place, cells[place], longitude, times)
    return times


def _counts(cells: Sequence[str], meaning: TimeMeaning, times: TimeCells) -> NDArray[np.bool_]:
    """Counts of days with a whole offset; which of them could be done together."""
    none = np.zeros(len(cells), dtype=np.bool_)
    if meaning.offset_d.denominator != 1:
        return none
    numbers = plain_numbers(cells)
    if numbers is None:
        return none
    joined = "".join(cells)
    if "e" in joined or "E" in joined or "+" in joined:
        return none
    if " " in joined:
        cells = [cell.strip(" ") for cell in cells]
    size = len(cells)
    points = np.fromiter(map(str.find, cells, repeat(".")), dtype=np.int64, count=size)
    lengths = np.fromiter(map(len, cells), dtype=np.int64, count=size)
    decimals = np.where(points < 0, 0, lengths - points - 1)
    known = np.isfinite(numbers)
    safe = np.where(known, numbers, 0.0)
    scale = 10.0 ** np.minimum(decimals, _MOST_DECIMALS)
    whole = np.floor(safe)
    digits = np.rint((safe - whole) * scale)
    carry = digits >= scale
    whole, digits = whole + carry, np.where(carry, 0.0, digits)
    offset = float(meaning.offset_d)
    counted = whole + offset
    if meaning.count == "jd":
        # MJD = JD - 2400000.5: half a day later in the day before.
        top, bottom = 2.0 * digits + scale, 2.0 * scale
        over = top >= bottom
        day, top = counted - 2_400_001.0 + over, np.where(over, top - bottom, top)
        usual = counted >= _FEWEST_JD
    else:
        day, top, bottom = counted, digits, scale
        usual = counted < _MOST_MJD
    done = (
        known
        & (decimals <= _MOST_DECIMALS)
        & (0.5 * np.spacing(np.abs(safe)) * scale < _SURE)
        & usual
        & (safe >= 0.0)
        & (day >= FIRST_MJD)
        & (day < END_MJD)
    )
    if meaning.scale in ("utc", "ut"):
        done &= day >= UTC_FROM_MJD
    times.day[:] = day
    times.fraction[:] = top / bottom
    prefix = f"{_PREFIX.get(meaning.place, '')}{meaning.count.upper()}_{(meaning.scale or 'utc').upper()} "
    if not offset:
        times.texts[:] = [prefix + cell for cell in cells]
    else:
        wholes = counted.astype(np.int64).tolist()
        # Few different days; each is written out once.
        heads = {number: f"{prefix}{number}" for number in set(wholes)}
        if size and (points == points[0]).all() and points[0] >= 0:
            point = int(points[0])
            times.texts[:] = [
                heads[number] + cell[point:] for number, cell in zip(wholes, cells, strict=True)
            ]
        else:
            times.texts[:] = [
                heads[number] + (cell[point:] if point >= 0 else "")
                for number, cell, point in zip(wholes, cells, points.tolist(), strict=True)
            ]
    return done


def _clocks(cells: Sequence[str], meaning: TimeMeaning, times: TimeCells) -> NDArray[np.bool_]:
    """Dates with a clock time to the second; which of them could be done together."""
    done = np.zeros(len(cells), dtype=np.bool_)
    joined = "".join(cells)
    if not joined.isascii():
        return done
    lengths = np.fromiter(map(len, cells), dtype=np.int64, count=len(cells))
    suffix = f" {meaning.scale.upper()}" if meaning.scale else ""
    for length in np.unique(lengths).tolist():
        if not 19 <= length <= 32:
            continue
        places = np.flatnonzero(lengths == length)
        group = [cells[place] for place in places.tolist()]
        letters = np.frombuffer("".join(group).encode("ascii"), dtype=np.uint8).reshape(len(group), length)
        ends_in_z = (letters[:, -1] == ord("Z")) | (letters[:, -1] == ord("z"))
        for zulu in (True, False):
            # With a scale of its own the column contradicts the Z, and each cell is read alone.
            if not (meaning.scale in (None, "utc") if zulu else meaning.scale is not None):
                continue
            own = ends_in_z == zulu
            if not own.any():
                continue
            clock = letters[own][:, : length - 1] if zulu else letters[own]
            sure, day, fraction = _clock_numbers(clock, meaning.scale or "utc")
            where = places[own]
            times.day[where], times.fraction[where] = day, fraction
            times.minus_d[where] = times.plus_d[where] = 0.0
            done[where] = sure
            for place in where[sure].tolist():
                times.texts[place] = cells[place] if zulu else cells[place] + suffix
    return done


def _clock_numbers(
    letters: NDArray[np.uint8], scale: str
) -> tuple[NDArray[np.bool_], FloatArray, FloatArray]:
    """``2031-04-07T03:12:10.25`` letter by letter: which are sure, MJD day and fraction of it."""
    width = letters.shape[1]
    zero = ord("0")
    numbers = letters.astype(np.int64) - zero
    separators = [4, 7, 10, 13, 16] + ([19] if width > 19 else [])
    figures = [place for place in range(width) if place not in separators]
    if width == 20 or width - 20 > 9:
        return np.zeros(len(letters), dtype=np.bool_), np.zeros(len(letters)), np.zeros(len(letters))
    sure = ((numbers[:, figures] >= 0) & (numbers[:, figures] <= 9)).all(axis=1)
    for place, mark in ((4, "-"), (7, "-"), (13, ":"), (16, ":")):
        sure &= letters[:, place] == ord(mark)
    sure &= np.isin(letters[:, 10], [ord("T"), ord("t"), ord(" ")])
    if width > 19:
        sure &= letters[:, 19] == ord(".")

    def number(first: int, last: int) -> NDArray[np.int64]:
        total = np.zeros(len(letters), dtype=np.int64)
        for place in range(first, last):
            total = 10 * total + numbers[:, place]
        return total

    year, month, date = number(0, 4), number(5, 7), number(8, 10)
    hour, minute, second = number(11, 13), number(14, 16), number(17, 19)
    scale_s = 10 ** max(0, width - 20)
    parts = number(20, width) if width > 19 else np.zeros(len(letters), dtype=np.int64)
    in_range = (month >= 1) & (month <= 12) & (year >= 1)
    month_length = _MONTH_DAYS[np.where(in_range, month, 1)] + (
        (month == 2) & (((year % 4 == 0) & (year % 100 != 0)) | (year % 400 == 0))
    )
    sure &= in_range & (date >= 1) & (date <= month_length) & (hour <= 23) & (minute <= 59) & (second <= 59)
    day = _mjd_of(year, month, date)
    if scale == "utc":
        sure &= (day >= _UNIFORM_FROM_MJD) & (date < month_length)
    ticks = (3600 * hour + 60 * minute + second) * scale_s + parts
    # Both whole numbers are exact as floats, so that the quotient is rounded once.
    return sure, day.astype(np.float64), ticks.astype(np.float64) / (86_400.0 * scale_s)


def _mjd_of(year: NDArray[np.int64], month: NDArray[np.int64], date: NDArray[np.int64]) -> NDArray[np.int64]:
    """MJD of Gregorian dates, counted from the first of March so that the leap day comes last."""
    shifted = np.where(month > 2, month - 3, month + 9)
    years = year - (month <= 2)
    leap_days: NDArray[np.int64] = years // 4 - years // 100 + years // 400
    mjd: NDArray[np.int64] = 365 * years + leap_days + (153 * shifted + 2) // 5 + date - 678_882
    return mjd


class _Alone:
    """Reads cells one by one; equal cells once."""

    def __init__(self, meaning: TimeMeaning, name: str) -> None:
        self._meaning = meaning
        self._name = name
        self._known: dict[tuple[str, float | None], tuple[TypedInstant, str] | CellFault] = {}

    def read(self, place: int, cell: str, longitude: float | None, times: TimeCells) -> None:
        key = (cell, longitude)
        found = self._known.get(key)
        if found is None:
            found = self._known[key] = self._read(cell, longitude)
        if isinstance(found, CellFault):
            times.faults.append(CellFault(place, found.code, found.why))
            return
        typed, text = found
        times.day[place], times.fraction[place] = typed.mjd_day, typed.mjd_fraction
        times.minus_d[place] = np.nan if typed.minus_d is None else typed.minus_d
        times.plus_d[place] = np.nan if typed.plus_d is None else typed.plus_d
        times.scale[place], times.place[place] = SCALES.index(typed.scale), PLACES.index(typed.place)
        times.texts[place] = text

    def _read(self, cell: str, longitude: float | None) -> tuple[TypedInstant, str] | CellFault:
        if not cell.strip():
            return CellFault(0, "time-missing", "The row has no time.")
        try:
            text = self._counted(cell) if self._meaning.count != "text" else self._written(cell)
            typed = read_instant(
                text,
                self._meaning.scale or "utc",
                self._meaning.place or "observatory",
                self._name,
                longitude_deg_east=longitude,
            )
        except InputRefused as refused:
            return CellFault(0, refused.code, refused.why or refused.message)
        return typed, text

    def _counted(self, cell: str) -> str:
        """A number of days as it would be typed alone."""
        meaning = self._meaning
        head, mark, error = decimal_text(cell).replace("+/-", "±").replace("+-", "±").partition("±")
        read_number(head, self._name, "2451234.5")
        with localcontext(prec=80):
            try:
                offset = Decimal(meaning.offset_d.numerator) / Decimal(meaning.offset_d.denominator)
                number = Decimal(head.strip()) + offset
            except InvalidOperation:
                number = Decimal(0)
        prefix = f"{_PREFIX.get(meaning.place, '')}{meaning.count.upper()}_{(meaning.scale or 'utc').upper()}"
        return f"{prefix} {number:f}" + (f" ±{error.strip()} d" if mark else "")

    def _written(self, cell: str) -> str:
        """A date as it would be typed alone: with the scale of the column, if it has none itself."""
        text = " ".join(cell.split())
        if _BARE_NUMBER.fullmatch(text):
            raise InputRefused(
                "A number of days is expected to be counted from a stated origin.",
                why=f"A bare number does not say which date it is; columns are named as {EXAMPLES}.",
                code="time-unclear",
            )
        if _SAYS_SCALE.search(text) or not _NEEDS_SCALE.search(text):
            return text
        if self._meaning.scale is None:
            raise InputRefused(
                "The time scale is missing.",
                why="Neither the cell nor the column says whether the time is UTC, TT or TDB.",
                code="scale-missing",
            )
        return f"{text} {self._meaning.scale.upper()}"
