"""Units and bands in the names of columns: ``RV (km/s)``, ``rho_mas``, ``Kmag``, ``e_J``."""

from __future__ import annotations

import re
from collections.abc import Collection, Mapping, Sequence

from campaign.model.loading import TableColumn
from campaign.reading.columnfields import error_names

_BRACKETED = re.compile(r"(?P<name>.*\S)\s*[\[({](?P<unit>[^\[\](){}]+)[\])}]")
_UNIT_WORDS = {
    "kms": "km/s", "jy": "Jy", "mjy": "mJy", "ujy": "uJy", "ghz": "GHz", "mhz": "MHz", "kev": "keV",
    "angstrom": "Angstrom", "mas": "mas", "arcsec": "arcsec", "deg": "deg", "rad": "rad", "mag": "mag",
    "mmag": "mmag", "nm": "nm", "d": "d", "yr": "yr", "pc": "pc", "kpc": "kpc", "au": "au", "s": "s",
}  # fmt: skip
_SUFFIXED = re.compile(rf"(?P<name>.+)_(?P<unit>{'|'.join(_UNIT_WORDS)})", re.IGNORECASE)
# Bands that stand alone as the name of a column of magnitudes; case counts (common practice, no source).
_BANDS = (
    "U", "B", "V", "R", "I", "Rc", "Ic", "Z", "Y", "J", "H", "K", "Ks", "L", "L'", "Lp", "M", "M'", "Mp", "N",
    "Q", "W1", "W2", "W3", "W4", "u", "g", "r", "i", "z", "y", "G", "BP", "RP",
)  # fmt: skip
_ANY_BAND = "|".join(sorted(map(re.escape, _BANDS), key=len, reverse=True))
_BAND_COLUMN = re.compile(rf"(?:mag[_ ]?)?(?P<band>{_ANY_BAND})[_ ]?(?P<mag>mag)?")

# A column of dates, and one of clock times beside it (common practice, no source).
DATE_NAMES = frozenset(
    ("date", "utdate", "utcdate", "dateut", "dateutc", "dateobs", "obsdate", "dateofobservation")
)
CLOCK_NAMES = frozenset(("time", "ut", "utc", "uttime", "utctime", "timeut", "timeutc", "obstime"))

# Place of a column from 1 and how the column of its errors is called, by band or star.
Found = dict[str, tuple[int, tuple[str, ...]]]


def split_brackets(name: str) -> tuple[str, str | None]:
    """The name of a column and what stands in brackets behind it."""
    found = _BRACKETED.fullmatch(name.strip())
    return (found["name"], found["unit"]) if found else (name.strip(), None)


def split_unit(name: str) -> tuple[str, str] | None:
    """The name of a column and the unit that is part of it, if there is one."""
    bare, unit = split_brackets(name)
    if unit is not None:
        return bare, unit
    found = _SUFFIXED.fullmatch(bare)
    if found is None:
        return None
    # Spelled in full it is a million, which no rule about case may make a thousandth.
    exact = "MJy" if found["unit"] == "MJy" else _UNIT_WORDS[found["unit"].casefold()]
    return found["name"], exact


def is_called(column: TableColumn, names: Sequence[str]) -> bool:
    """Whether a column is called by one of ``names``, whatever is in brackets behind it."""
    flat = re.sub(r"[\s_\-.]+", "", split_brackets(column.name)[0])
    return any(flat == name or flat.casefold() == name.casefold() for name in names)


def limit_names(band: str) -> tuple[str, ...]:
    """How the mark of a limit is called that belongs to a band."""
    bases = (band, f"{band}mag", f"mag{band}")
    return tuple(
        form.format(base) for base in bases for form in ("l{}", "lim{}", "limit{}", "{}lim", "{}limit")
    )


def band_columns(columns: Sequence[TableColumn], taken: Collection[int]) -> Found:
    """Columns named after a band, by band."""
    found: Found = {}
    alone = 0
    for number, column in enumerate(columns, start=1):
        name = split_brackets(column.name)[0]
        split = _BAND_COLUMN.fullmatch(name)
        if split is None or number in taken:
            continue
        band = split["band"]
        errors = error_names(band, f"{band}mag", f"mag{band}")
        is_marked = split["mag"] is not None or name.casefold().startswith("mag")
        alone += not (is_marked or any(is_called(each, errors) for each in columns))
        found.setdefault(band, (number, errors))
    # A single letter alone may be anything; two of them, or one with its error, are bands.
    return found if len(found) > 1 or not alone else {}


def lone_band(columns: Sequence[TableColumn]) -> dict[str, str]:
    """The one column that is called by nothing but a band, with the band; empty when there are several."""
    found = {
        column.name: split["band"]
        for column in columns
        if (split := _BAND_COLUMN.fullmatch(split_brackets(column.name)[0])) is not None
    }
    return found if len(found) == 1 else {}


def columns_called(
    columns: Sequence[TableColumn], taken: Collection[int], names: Mapping[str, Sequence[str]]
) -> Found:
    """Columns that are called by one of several sets of names."""
    found: Found = {}
    for word, called in names.items():
        for number, column in enumerate(columns, start=1):
            if number not in taken and is_called(column, called):
                found.setdefault(word, (number, error_names(*called)))
    return found
