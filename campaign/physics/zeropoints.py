"""Flux densities of magnitude zero by photometric system and band, with wavelength and source."""

from __future__ import annotations

from typing import Literal, NamedTuple

from campaign.errors import NotFound

Basis = Literal["published", "memory"]

_COHEN = "Cohen, Wheaton & Megeath 2003, AJ 126, 1090"
_WISE = "Jarrett et al. 2011, ApJ 735, 112; WISE All-Sky Explanatory Supplement IV.4.h"
_WISE_OTHER = "WISE All-Sky Explanatory Supplement IV.4.h, table 1"
_MKO = "Tokunaga & Vacca 2005, PASP 117, 421"
_GLASS = "Bessell & Brett 1988, PASP 100, 1134; Bessell, Castelli & Plez 1998, A&A 333, 231"
_JOHNSON = "Campins, Rieke & Lebofsky 1985, AJ 90, 896"


class ZeroPoint(NamedTuple):
    """Flux density in Jy of magnitude zero of one band, at its isophotal or effective wavelength in um.

    ``sigma_jy`` is None where no error is known here. ``basis`` says whether value and wavelength were
    read (``published``) or recalled (``memory``); ``sigma_basis`` says it of the error.
    """

    photometric_system: str
    band: str
    wavelength_um: float
    flux_jy: float
    sigma_jy: float | None
    source: str
    basis: Basis = "published"
    sigma_basis: Basis = "published"


ZERO_POINTS: tuple[ZeroPoint, ...] = (
    ZeroPoint("2MASS", "J", 1.235, 1594.0, 27.8, _COHEN),
    ZeroPoint("2MASS", "H", 1.662, 1024.0, 20.0, _COHEN),
    ZeroPoint("2MASS", "Ks", 2.159, 666.7, 12.6, _COHEN),
    ZeroPoint("WISE", "W1", 3.3526, 309.540, 4.582, _WISE, sigma_basis="memory"),
    ZeroPoint("WISE", "W2", 4.6028, 171.787, 2.516, _WISE, sigma_basis="memory"),
    ZeroPoint("WISE", "W3", 11.5608, 31.674, 0.450, _WISE, sigma_basis="memory"),
    ZeroPoint("WISE", "W4", 22.0883, 8.363, 0.124, _WISE, sigma_basis="memory"),
    # The supplement's table has a second column, for another slope of the spectrum; W3 differs by 9 %.
    ZeroPoint("WISE second column", "W1", 3.3526, 306.682, None, _WISE_OTHER),
    ZeroPoint("WISE second column", "W2", 4.6028, 170.663, None, _WISE_OTHER),
    ZeroPoint("WISE second column", "W3", 11.5608, 29.045, None, _WISE_OTHER),
    ZeroPoint("WISE second column", "W4", 22.0883, 8.284, None, _WISE_OTHER),
    # Fluxes of J and K were read, their wavelengths recalled.
    ZeroPoint("MKO", "J", 1.250, 1560.0, None, _MKO, "memory"),
    ZeroPoint("MKO", "H", 1.644, 1040.0, None, _MKO),
    ZeroPoint("MKO", "Ks", 2.149, 670.0, None, _MKO),
    ZeroPoint("MKO", "K", 2.198, 645.0, None, _MKO, "memory"),
    ZeroPoint("MKO", "L'", 3.754, 249.0, None, _MKO),
    ZeroPoint("MKO", "M'", 4.702, 163.0, None, _MKO),
    ZeroPoint("Johnson-Glass", "J", 1.22, 1589.0, None, _GLASS, "memory"),
    ZeroPoint("Johnson-Glass", "H", 1.63, 1021.0, None, _GLASS, "memory"),
    ZeroPoint("Johnson-Glass", "K", 2.19, 640.0, None, _GLASS, "memory"),
    ZeroPoint("Johnson-Glass", "L", 3.45, 285.0, None, _GLASS, "memory"),
    ZeroPoint("Johnson-Glass", "M", 4.75, 154.0, None, _GLASS, "memory"),
    ZeroPoint("Johnson", "J", 1.26, 1603.0, None, _JOHNSON, "memory"),
    ZeroPoint("Johnson", "H", 1.60, 1075.0, None, _JOHNSON, "memory"),
    ZeroPoint("Johnson", "K", 2.22, 667.0, None, _JOHNSON, "memory"),
    ZeroPoint("Johnson", "L", 3.54, 288.0, None, _JOHNSON, "memory"),
    ZeroPoint("Johnson", "M", 4.80, 170.0, None, _JOHNSON, "memory"),
    ZeroPoint("Johnson", "N", 10.6, 36.0, None, _JOHNSON, "memory"),
)


def zero_point(photometric_system: str, band: str) -> ZeroPoint:
    """The flux density of magnitude zero in a band of a photometric system.

    Parameters
    ----------
    photometric_system : str
        Name such as ``2MASS`` or ``MKO`` (no unit), whatever its case and spaces. There is no default:
        K of one system is not K of another.
    band : str
        Band such as ``Ks`` or ``L'`` (no unit), as written: ``K`` and ``Ks`` are two bands.

    Returns
    -------
    ZeroPoint
        Flux density and its error in Jy, wavelength in um, source and basis.

    Raises
    ------
    NotFound
        If the system or the band of it is not in the table; the details hold what is.

    Notes
    -----
    Accuracy: as published; 1 to 2 % where an error is given. No colour correction is applied: for a
    spectrum other than that of the zero point divide the flux by its factor.

    Source: each entry names its own.

    Examples
    --------
    >>> zero_point("2mass", "Ks").flux_jy, zero_point("MKO", "L'").wavelength_um
    (666.7, 3.754)
    """
    key = "".join(photometric_system.casefold().split())
    of_system = [each for each in ZERO_POINTS if "".join(each.photometric_system.casefold().split()) == key]
    for each in of_system:
        if each.band == band:
            return each
    known = (
        [each.band for each in of_system]
        if of_system
        else list(dict.fromkeys(each.photometric_system for each in ZERO_POINTS))
    )
    what = f"band {band!r} of {photometric_system!r}" if of_system else f"system {photometric_system!r}"
    raise NotFound(
        f"There is no zero point of the photometric {what}.",
        why="Known here: " + ", ".join(known) + ".",
        hint="Name one of these, or give the flux of magnitude zero yourself.",
        code="zero-point-not-found",
        details={"known": known},
    )


def wavelength_um(photometric_system: str, band: str) -> float:
    """Isophotal or effective wavelength of a band of a photometric system.

    Parameters
    ----------
    photometric_system : str
        Name such as ``2MASS`` (no unit).
    band : str
        Band such as ``Ks`` (no unit).

    Returns
    -------
    float
        Wavelength, um.

    Raises
    ------
    NotFound
        If the system or the band of it is not in the table.

    Notes
    -----
    Accuracy: as published. The effective wavelength of a red source is longer than that of a hot star;
    W4 of WISE was later revised to 22.8 um (Brown, Jarrett & Cluver 2014, PASA 31, e049; memory).

    Source: see :func:`zero_point`.

    Examples
    --------
    >>> wavelength_um("WISE", "W1")
    3.3526
    """
    return zero_point(photometric_system, band).wavelength_um
