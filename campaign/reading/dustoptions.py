"""What ``campaign dust`` is given beside plain values: opacities, zero points, levels, ranges."""

from __future__ import annotations

import re

from campaign.errors import InputRefused
from campaign.model.dust import DustOpacity, LevelGiven, ZeroPointGiven
from campaign.model.measured import Limit, Measured, Range
from campaign.reading.numbers import MAX_NUMBER_LENGTH, check_plain_text, refusal
from campaign.reading.values import read_measured, read_measured_or_bound, read_plain_value

_POWER_LAW = re.compile(r"(?P<kappa>.+?)\s+at\s+(?P<wave>.+?)\s*,\s*(?:index|s)\s*=?\s*(?P<index>.+)", re.I)
_ZERO_POINT = re.compile(r"(?P<flux>.+?)\s+at\s+(?P<wave>.+)", re.I)
_OPACITY_FORM = '"1000±300 cm2/g at 10 um, index 1.2"'
_ZERO_POINT_FORM = '"K=640±20 Jy at 2.19 um"'
_LEVEL_FORM = '"K=7.31±0.02"'
_NAME = re.compile(r"[A-Za-z][A-Za-z0-9.-]*")


def read_opacity(text: str, name: str = "--opacity") -> DustOpacity:
    """Read the name of a table, or a power law such as ``1000±300 cm2/g at 10 um, index 1.2``.

    Raises
    ------
    InputRefused
        Neither; or a value that cannot be.
    """
    plain = check_plain_text(text, name, MAX_NUMBER_LENGTH).strip()
    if _NAME.fullmatch(plain):
        return DustOpacity(table=plain)
    found = _POWER_LAW.fullmatch(plain)
    if found is None:
        why = "It is the name of a table such as zubko-0.1, or a power law per gram of dust."
        raise refusal(name, text, why, _OPACITY_FORM, "opacity-refused")
    return DustOpacity(
        kappa_cm2_g=read_measured(found["kappa"], "cm2/g", name, low=0.0, low_open=True),
        wavelength_um=read_plain_value(found["wave"], "um", name, low=0.0, low_open=True),
        index=read_plain_value(found["index"], "", name, low=-1.0, high=4.0),
    )


def read_zero_point(text: str, name: str = "--zero-point") -> ZeroPointGiven:
    """Read ``K=640±20 Jy at 2.19 um``, or ``K of Cold Mesa=640±20 Jy at 2.19 um`` for one system.

    Raises
    ------
    InputRefused
        Another form; or a value that cannot be.
    """
    band, value = _assignment(text, name, _ZERO_POINT_FORM)
    found = _ZERO_POINT.fullmatch(value)
    if found is None:
        why = "A zero point is the flux of magnitude zero and the wavelength of the band."
        raise refusal(name, text, why, _ZERO_POINT_FORM, "zero-point-refused")
    band, _, system = (part.strip() for part in band.partition(" of "))
    return ZeroPointGiven(
        band,
        system or None,
        read_measured(found["flux"], "jy", name, low=0.0, low_open=True),
        read_plain_value(found["wave"], "um", name, low=0.0, low_open=True, high=1000.0),
    )


def read_zero_points_of(text: str, name: str = "--zero-points") -> tuple[str, str]:
    """Read ``Johnson-Glass``, for every system that is not known, or ``Cold Mesa JHKLM=Johnson-Glass``.

    Raises
    ------
    InputRefused
        An empty name.
    """
    plain = check_plain_text(text, name, MAX_NUMBER_LENGTH).strip()
    system, mark, other = (part.strip() for part in plain.partition("="))
    if not mark and system:
        return "*", system
    if not other:
        why = "It names the photometric system whose zero points stand in."
        raise refusal(name, text, why, '"Cold Mesa JHKLM=Johnson-Glass"', "zero-point-refused")
    return system, other


def read_level(text: str, name: str = "--level") -> LevelGiven:
    """Read ``K=7.31±0.02``, or ``N=none`` where the stars do not matter.

    Raises
    ------
    InputRefused
        Another form; a level without an error.
    """
    band, value = _assignment(text, name, _LEVEL_FORM)
    if value.casefold() == "none":
        return LevelGiven(band, None)
    mag = read_measured(value, "mag", name, low=-10.0, high=40.0)
    if not mag.error_known:
        why = "The stars' level is taken from every point of the band, so that its error counts."
        raise refusal(name, text, why, _LEVEL_FORM, "error-missing")
    return LevelGiven(band, mag)


def read_extinction(text: str, name: str = "--extinction") -> Measured:
    """Read the extinction in K, mag; without its error it would be taken for exact.

    Raises
    ------
    InputRefused
        Another form; a value without an error.
    """
    mag = read_measured(text, "mag", name, low=0.0, high=10.0)
    if not mag.error_known:
        why = "The extinction makes every band brighter, so that its error counts."
        raise refusal(name, text, why, "0.35±0.05", "error-missing")
    return mag


def read_value_or_range(text: str, unit: str, name: str, **domain: float) -> Measured | Range:
    """Read a value with errors, or a range such as ``1000..1800 K``; a limit is refused.

    Raises
    ------
    InputRefused
        A limit; or a value outside its domain.
    """
    value = read_measured_or_bound(text, unit, name, **domain)  # type: ignore[arg-type]
    if isinstance(value, Limit):
        raise InputRefused(
            f"{name}: a limit is not enough.",
            why="A value with its error is needed, or a range from one value to another.",
            hint=f'For example {name} "1000..1800 K", or {name} "1200±100 K".',
            code="value-unreadable",
        )
    return value


def read_distances(text: str, name: str = "--at-distance") -> tuple[float, ...]:
    """Read distances such as ``20,50,100 au``.

    Raises
    ------
    InputRefused
        A distance that is not positive, or none at all.
    """
    plain = check_plain_text(text, name, MAX_NUMBER_LENGTH)
    unit = re.search(r"[A-Za-z]+\s*$", plain)
    parts = [part.strip() for part in plain[: unit.start() if unit else None].split(",")]
    tail = unit.group() if unit else ""
    return tuple(
        read_plain_value(f"{part} {tail}".strip(), "au", name, low=0.0, low_open=True) for part in parts
    )


def _assignment(text: str, name: str, form: str) -> tuple[str, str]:
    plain = check_plain_text(text, name, MAX_NUMBER_LENGTH)
    left, mark, right = (part.strip() for part in plain.partition("="))
    if not mark or not left or not right:
        raise refusal(name, text, "It is a band, an equals sign and a value.", form, "assignment-refused")
    return left, right
