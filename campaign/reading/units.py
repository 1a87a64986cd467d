"""Which units a person may write for a quantity, and what they are in its canonical unit.

A canonical unit is the one that the catalogue keeps (``d``, ``pc``, ``kms``, ...). Spellings are
matched exactly, case included: ``mJy`` and ``MJy`` differ by nine orders of magnitude.
Sources: au, pc and the nominal solar radius and luminosity are IAU 2012 B2, 2015 B2 and 2015 B3;
a year is the Julian year of 365.25 d and a month its twelfth part.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass

from campaign.reading.numbers import quoted, refusal

AU_KM = 149_597_870.7
PC_AU = 648_000.0 / math.pi
LY_PC = 9_460_730_472_580.8 / (AU_KM * PC_AU)
RSUN_KM = 695_700.0
LSUN_W = 3.828e26
YEAR_D = 365.25
_TO_PLAIN = str.maketrans("⁰¹²³⁴⁵⁶⁷⁸⁹⁻⁺−·\u00b5\u212b☉", "0123456789-+- μÅ⊙")


@dataclass(frozen=True, slots=True)
class UnitFamily:
    """Units of one quantity. ``symbol`` is how the canonical unit is written out."""

    symbol: str
    example_value: float
    example_error: float
    shown: tuple[str, ...]
    factors: Mapping[str, float]


def _family(
    symbol: str, example: tuple[float, float], *groups: tuple[float, str], shown: str = ""
) -> UnitFamily:
    """Build a family from groups (factor, spellings separated by ``|``); the first of each is shown."""
    factors: dict[str, float] = {}
    for factor, spellings in groups:
        for spelling in spellings.split("|"):
            factors[_spelling_key(spelling)] = factor
    firsts = tuple(spellings.split("|")[0] for _, spellings in groups)
    return UnitFamily(symbol, *example, tuple(shown.split("|")) if shown else firsts, factors)


def _spelling_key(unit_text: str) -> str:
    """One key for the ways to set a compound unit: ``km s^-1``, ``km.s**-1``, ``km s⁻¹``; ``km / s``."""
    plain = unit_text.translate(_TO_PLAIN).replace("**-", "-").replace("^", "")
    return "/".join(" ".join(part.replace(".", " ").split()) for part in plain.split("/"))


_ARC = {"deg": 1.0, "arcmin": 1.0 / 60.0, "arcsec": 1.0 / 3600.0, "rad": 180.0 / math.pi}
_DEG = "deg|°|degree|degrees"
_ARCMIN = "arcmin|'|′|arcminute|arcminutes"
_ARCSEC = "arcsec|\"|″|''|as|arcsecond|arcseconds"
_UAS = "uas|μas|microarcsec"
_MAS = "mas|milliarcsec"
_KM_PER_S = "km/s|km s-1|km/sec|kms-1"

FAMILIES: Mapping[str, UnitFamily] = {
    "": _family("", (0.71, 0.02)),
    "fraction": _family("", (0.02, 0.005), (0.01, "%")),
    "d": _family(
        "d", (3127.5, 0.3),
        (1.0, "d|day|days"),
        (YEAR_D, "yr|yrs|year|years|a|Julian yr|Julian year|Julian years"),
        (YEAR_D / 12.0, "month|months"), (7.0, "week|weeks|wk"),
        (1.0 / 24.0, "h|hr|hrs|hour|hours"), (1.0 / 1440.0, "min|minute|minutes"),
        (1.0 / 86400.0, "s|sec|second|seconds"),
    ),
    "pc": _family(
        "pc", (2100.0, 200.0),
        (1.0, "pc|parsec|parsecs"), (1e3, "kpc"), (1e6, "Mpc"), (LY_PC, "ly|lyr|light-year|light-years"),
    ),
    "au": _family(
        "au", (6.4, 0.8),
        (1.0, "au|AU"), (RSUN_KM / AU_KM, "Rsun|R⊙|R_sun|Rsol"), (1.0 / AU_KM, "km"), (1e-3 / AU_KM, "m"),
    ),
    "deg": _family(
        "deg", (143.0, 2.0),
        (1.0, _DEG), (_ARC["rad"], "rad|radian|radians"), (_ARC["arcmin"], _ARCMIN),
        (_ARC["arcsec"], _ARCSEC), (1e-3 / 3600.0, _MAS),
    ),
    "arcsec": _family(
        "arcsec", (1.2, 0.05), (1.0, _ARCSEC), (1e-3, _MAS), (1e-6, _UAS), (60.0, _ARCMIN), (3600.0, _DEG),
    ),
    "mas": _family("mas", (0.48, 0.03), (1.0, _MAS), (1e-3, _UAS), (1e3, _ARCSEC), (6e4, _ARCMIN)),
    "mas/yr": _family(
        "mas/yr", (-3.1, 0.2),
        (1.0, "mas/yr|mas yr-1|mas/a|mas/year"), (1e3, "arcsec/yr|\"/yr|arcsec yr-1|arcsec/year"),
        (1e-3, "uas/yr|μas/yr|uas yr-1|μas yr-1"),
    ),
    "kms": _family("km/s", (1800.0, 100.0), (1.0, _KM_PER_S), (1e-3, "m/s|m s-1")),
    "msun": _family("Msun", (12.0, 1.5), (1.0, "Msun|M⊙|M_sun|Msol")),
    "rsun": _family(
        "Rsun", (4.0, 0.5), (1.0, "Rsun|R⊙|R_sun|Rsol"), (1.0 / RSUN_KM, "km"), (AU_KM / RSUN_KM, "au|AU"),
    ),
    "lsun": _family(
        "Lsun", (300000.0, 50000.0),
        (1.0, "Lsun|L⊙|L_sun|Lsol"), (1.0 / LSUN_W, "W"), (1e-7 / LSUN_W, "erg/s|erg s-1"),
    ),
    "K": _family("K", (70000.0, 5000.0), (1.0, "K|kelvin"), (1e3, "kK")),
    "msun/yr": _family(
        "Msun/yr", (3.1e-5, 2e-6),
        (1.0, "Msun/yr|Msun yr-1|M⊙/yr|M⊙ yr-1|M_sun/yr|M_sun yr-1|Msun/a|Msun/year"),
    ),
    "mag": _family("mag", (7.31, 0.03), (1.0, "mag|mags"), (1e-3, "mmag")),
    "jy": _family(
        "Jy", (2.4, 0.1),
        (1.0, "Jy"), (1e-3, "mJy"), (1e-6, "uJy|μJy"), (1e6, "MJy"),
        (1e26, "W m-2 Hz-1|W/m2/Hz"),
        (1e23, "erg s-1 cm-2 Hz-1|erg cm-2 s-1 Hz-1|erg/s/cm2/Hz|erg/cm2/s/Hz"),
    ),
    "erg/s/cm2": _family(
        "erg/s/cm2", (3.1e-12, 2e-13),
        (1.0, "erg/s/cm2|erg s-1 cm-2|erg cm-2 s-1|erg/cm2/s"), (1e3, "W/m2|W m-2"),
    ),
    "angstrom": _family(
        "Å", (-12.4, 0.5),
        (1.0, "Å|A|AA|Angstrom|angstrom|angstroms"), (1e-3, "mÅ|mA"), (10.0, "nm"), (1e4, "um|μm|micron"),
    ),
    "um": _family("um", (2.2, 0.1), (1.0, "um|μm|micron|microns"), (1e-3, "nm"), (1e-4, "Å|A|AA|angstrom")),
    "ghz": _family("GHz", (8.4, 0.1), (1.0, "GHz"), (1e-3, "MHz"), (1e3, "THz"), (1e-9, "Hz")),
    "kev": _family("keV", (2.0, 0.1), (1.0, "keV"), (1e-3, "eV"), (1e3, "MeV")),
    "cm2/g": _family(
        "cm2/g", (1000.0, 300.0), (1.0, "cm2/g|cm^2/g|cm2 g-1|cm²/g"), (10.0, "m2/kg|m^2/kg|m2 kg-1|m²/kg"),
    ),
    "g/cm3": _family(
        "g/cm3", (1.8, 0.2), (1.0, "g/cm3|g/cm^3|g cm-3|g/cm³"), (1e-3, "kg/m3|kg/m^3|kg m-3|kg/m³"),
    ),
    "m": _family("m", (2400.0, 10.0), (1.0, "m|metre|metres"), (1e3, "km"), (0.3048, "ft")),
}  # fmt: skip


def accepted_units(unit: str) -> str:
    """The units accepted for a quantity kept in ``unit``, for help texts and refusals."""
    shown = FAMILIES[unit].shown
    return ", ".join(shown) if shown else "none (it is a plain number)"


def unit_factor(unit_text: str, unit: str, name: str, text: str, accepted_form: str) -> float:
    """What to multiply by to get from ``unit_text`` to the canonical ``unit``; no text means canonical.

    Raises
    ------
    InputRefused
        The unit is not one of those accepted for this quantity.
    """
    if not unit_text.strip():
        return 1.0
    factor = FAMILIES[unit].factors.get(_spelling_key(unit_text))
    if factor is None:
        raise refusal(
            name,
            text,
            f"Units accepted here: {accepted_units(unit)}.",
            accepted_form,
            "unit-not-accepted",
            message=f"{name}: the unit {quoted(unit_text.strip())} is not accepted here.",
        )
    return factor
