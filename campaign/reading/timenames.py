"""What the name of a time column says: ``HJD-2450000``, ``BJD_TDB``, ``MJD (UTC)``, ``date``.

The place is in the name (heliocentre, barycentre, else the clock where it was observed). The scale is, too,
or it has to be told; only HJD and BJD have one by the usage of the trade, and that is said.
"""

from __future__ import annotations

import re
from dataclasses import replace
from fractions import Fraction

from campaign.errors import InputRefused
from campaign.model.instants import Place, Scale
from campaign.model.loading import TimeMeaning
from campaign.reading.numbers import MINUS_SIGN, quoted

JD_OF_MJD_0 = Fraction(4_800_001, 2)
_SCALES: dict[str, Scale] = {
    "utc": "utc", "ut": "utc", "gmt": "utc", "tt": "tt", "tdt": "tt", "et": "tt", "tdb": "tdb", "tai": "tai",
}  # fmt: skip
_SCALE = r"(?:[\s_(\[]*(?P<scale{0}>utc|ut|gmt|tt|tdt|et|tdb|tai)[)\]]*)?"
_NUMBER = r"[0-9]+(?:\.[0-9]+)?"
_OFFSET = rf"""(?:
    \s*-\s*(?P<minus>{_NUMBER})
  | \s*\(\s*-\s*(?P<minus_too>{_NUMBER})\s*\)
  | \s*[(\[]?\s*(?P<plus>{_NUMBER})\s*\+\s*[)\]]?
  | \s*[(\[]?\s*\+\s*(?P<plus_too>{_NUMBER})\s*[)\]]?
)?"""
_COUNT = re.compile(
    rf"(?P<kind>[bhg]?[mr]?jd|btjd|bkjd)(?:[\s_-]*(?:obs|mid))?{_SCALE.format(1)}{_OFFSET}{_SCALE.format(2)}",
    re.VERBOSE | re.IGNORECASE,
)
# Days counted from dates of their own, as two space telescopes publish them: BJD in TDB (common practice,
# no source).
_MISSION_COUNTS = {"btjd": Fraction(2_457_000), "bkjd": Fraction(2_454_833)}
_REDUCED = Fraction(2_400_000)
_DATE_WORDS = frozenset(
    ("date", "datetime", "dateobs", "dateofobservation", "obsdate", "obstime", "observed", "isot", "iso",
     "isotime", "timestamp", "when", "at", "time", "t", "times", "epoch", "night", "year", "decimalyear",
     "decyear", "instant", "midtime", "midexposure", "utdate", "utcdate", "obsepoch", "timetext")
)  # fmt: skip
_PLACE_OF_LETTER: dict[str, Place] = {"b": "barycentre", "h": "heliocentre", "g": "geocentre"}
EXAMPLES = "MJD_UTC, JD_UTC-2450000, HJD_UTC-2450000, BJD_TDB, or date_utc for dates written out"


def read_time_name(name: str) -> TimeMeaning | None:
    """What a column of that name holds, or None when the name is not one of a time."""
    plain = " ".join(name.replace(MINUS_SIGN, "-").replace("–", "-").split())
    found = _COUNT.fullmatch(plain)
    if found is None:
        return _dates(plain)
    kind = found["kind"].lower()
    words = {_SCALES[word.lower()] for word in (found["scale1"], found["scale2"]) if word}
    if len(words) > 1:
        return None
    scale = words.pop() if words else None
    minus = found["minus"] or found["minus_too"] or found["plus"] or found["plus_too"]
    offset = Fraction(minus) if minus else Fraction(0)
    if kind in _MISSION_COUNTS:
        return _normal(TimeMeaning("jd", offset + _MISSION_COUNTS[kind], scale or "tdb", "barycentre"))
    place = _PLACE_OF_LETTER.get(kind[0], "observatory")
    convention = ""
    if scale is None and kind[0] in "bh":
        scale = "tdb" if kind[0] == "b" else "utc"
        convention = f"{kind.upper()} is taken in {scale.upper()}, as is usual; the table does not say it"
    if kind.endswith("rjd"):
        return _normal(TimeMeaning("jd", offset + _REDUCED, scale, place, convention))
    count = "mjd" if kind.endswith("mjd") else "jd"
    return _normal(TimeMeaning(count, offset, scale, place, convention))  # type: ignore[arg-type]


def _dates(plain: str) -> TimeMeaning | None:
    key = re.sub(r"[\s_\-.()\[\]]+", " ", plain.casefold()).strip()
    words = key.split()
    scales = {_SCALES[word] for word in words if word in _SCALES}
    if len(scales) > 1:
        return None
    rest = "".join(word for word in words if word not in _SCALES)
    scale = scales.pop() if scales else None
    if rest.startswith(("utdate", "utcdate")):
        scale = scale or "utc"
    if rest in _DATE_WORDS or (not rest and scale is not None):
        return TimeMeaning("text", scale=scale)
    return None


def _normal(meaning: TimeMeaning) -> TimeMeaning:
    """The same with a whole offset where there is one: JD-2400000.5 is MJD."""
    if meaning.offset_d.denominator == 2:
        if meaning.count == "jd":
            return replace(meaning, count="mjd", offset_d=meaning.offset_d - JD_OF_MJD_0)
        return replace(meaning, count="jd", offset_d=meaning.offset_d + JD_OF_MJD_0)
    return meaning


def time_name(meaning: TimeMeaning) -> str | None:
    """A name of a column that says by itself what its counts of days mean; None for dates, or without one."""
    if meaning.count == "text" or meaning.scale is None or meaning.offset_d < 0:
        return None
    letter = {place: letter for letter, place in _PLACE_OF_LETTER.items()}.get(
        meaning.place or "observatory", ""
    )
    name = f"{letter}{meaning.count}".upper() + f"_{meaning.scale.upper()}"
    number = f"{float(meaning.offset_d):.15g}"
    if meaning.offset_d and (Fraction(number) != meaning.offset_d or "e" in number):
        return None
    return f"{name}-{number}" if meaning.offset_d else name


def from_origin(origin_jd: str, scale: Scale | None, place: Place | None) -> TimeMeaning | None:
    """What a column holds whose header states the origin of its days as a JD."""
    if not re.fullmatch(_NUMBER, origin_jd):
        return None
    return _normal(TimeMeaning("jd", Fraction(origin_jd), scale, place))


def stated(meaning: TimeMeaning, scale: Scale | None, place: Place | None, column: str) -> TimeMeaning:
    """The meaning with scale and place that somebody stated beside the name.

    Raises
    ------
    InputRefused
        ``time-contradicted``, when the name says otherwise; ``scale-missing``, when nobody said the scale
        of a count of days.
    """
    known = None if meaning.by_convention else meaning.scale
    if scale is not None and known is not None and scale != known:
        raise _contradicted(column, "scale", known, scale)
    named_place = meaning.place if meaning.place in ("heliocentre", "barycentre") else None
    if place is not None and named_place is not None and place != named_place:
        raise _contradicted(column, "place", named_place, place)
    merged = replace(meaning, scale=scale or meaning.scale, place=place or meaning.place)
    if scale is not None:
        merged = replace(merged, by_convention="")
    if merged.count != "text" and merged.scale is None:
        raise InputRefused(
            f"The time scale of the column {quoted(column)} is not known.",
            why=f"{merged.count.upper()} is counted in UTC, TT or TDB; they differ by more than a minute.",
            hint=f"Say it: --constant scale=utc, or name the column so: --column "
            f'"time={column} as {merged.count.upper()}_UTC".',
            code="scale-missing",
            details={"column": column, "accepted_form": "--constant scale=utc"},
        )
    return merged


def _contradicted(column: str, what: str, named: str, told: str) -> InputRefused:
    return InputRefused(
        f"The column {quoted(column)} and the {what} that was given contradict each other.",
        why=f"The name of the column says {named}, the option {told}.",
        hint=f"Leave --constant {what}={told} out, or say what the column holds: --column "
        f'"time={column} as ...".',
        code="time-contradicted",
        details={"column": column, what: told},
    )


def spoken(meaning: TimeMeaning) -> str:
    """The meaning in words, for the mapping that is shown."""
    where = {
        "observatory": "as observed from the Earth",
        "geocentre": "geocentric",
        "heliocentre": "heliocentric",
        "barycentre": "barycentric",
        None: "as observed from the Earth",
    }[meaning.place]
    scale = meaning.scale.upper() if meaning.scale else "in the scale that each cell says"
    if meaning.count == "text":
        return f"dates written out, {scale}, {where} unless a cell says otherwise"
    added = f", {float(meaning.offset_d):.15g} added" if meaning.offset_d else ""
    return f"{meaning.count.upper()}{added}, {scale}, {where}"
