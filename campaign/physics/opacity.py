"""How well carbon dust absorbs and emits, by wavelength: tables by name, and power laws.

Everything here is per gram of DUST; an opacity per gram of gas and dust is about a hundred times smaller.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

from campaign.errors import NotFound
from campaign.physics.constants import SOLAR_LUMINOSITY_W, SOLAR_MASS_KG, STEFAN_BOLTZMANN
from campaign.physics.domain import positive
from campaign.physics.planck import planck_exponent

FloatArray = NDArray[np.float64]

_ZUBKO = "optical constants of Zubko et al. 1996, MNRAS 282, 1321 (sample not named in the file)"
_PREIBISCH = "optical constants of Preibisch et al. 1993, A&A 279, 577"
_SPHERES = "; Mie theory (miepython 3.3.0), spheres, 1.8 g/cm3"
_SHORT = (1.235, 1.662)
_LONG = (2.159, 3.3526, 4.6028, 10.0, 11.5608, 22.0883)
# Farther than this beyond its ends a table says nothing of a single band.
_BEYOND = 1.10


class Opacity(NamedTuple):
    """Absorption per gram of dust at wavelengths, straight between them and beyond in the logarithms.

    One wavelength and ``end_index`` make a power law. ``sigma_ln`` is the error of the whole as a natural
    logarithm; None when it was not told.
    """

    name: str
    wavelength_um: tuple[float, ...]
    kappa_cm2_g: tuple[float, ...]
    source: str
    grain_radius_um: float | None
    sigma_ln: float | None
    end_index: float | None = None


# Published carbons of one size differ by 30 % in the near infrared and more beyond 20 um.
_BETWEEN_MATERIALS = 0.3

OPACITIES: tuple[Opacity, ...] = (
    Opacity(
        "zubko-0.01", _SHORT + _LONG, (16659.2, 10359.2, 6994.9, 3858.7, 2566.2, 989.9, 833.5, 342.0),
        _ZUBKO + _SPHERES + " of 0.01 um", 0.01, _BETWEEN_MATERIALS,
    ),
    Opacity(
        "zubko-0.1", _SHORT + _LONG, (26178.3, 14086.3, 8615.8, 4282.7, 2733.6, 1011.6, 848.1, 344.7),
        _ZUBKO + _SPHERES + " of 0.1 um", 0.1, _BETWEEN_MATERIALS,
    ),
    Opacity(
        "zubko-0.5", _LONG, (13165.0, 15036.0, 9597.0, 1656.0, 1263.0, 413.0),
        _ZUBKO + _SPHERES + " of 0.5 um", 0.5, _BETWEEN_MATERIALS,
    ),
    Opacity(
        "preibisch-0.01", _SHORT + _LONG, (13159.4, 8949.2, 6389.9, 3450.0, 2340.8, 997.2, 828.1, 407.1),
        _PREIBISCH + _SPHERES + " of 0.01 um", 0.01, _BETWEEN_MATERIALS,
    ),
    Opacity(
        "preibisch-0.1", _SHORT + _LONG, (19671.9, 11578.4, 7594.5, 3761.3, 2459.9, 1012.0, 837.8, 408.8),
        _PREIBISCH + _SPHERES + " of 0.1 um", 0.1, _BETWEEN_MATERIALS,
    ),
)  # fmt: skip
DEFAULT_OPACITY = "zubko-0.1"


def opacity_named(name: str) -> Opacity:
    """A table of opacities by its name.

    Parameters
    ----------
    name : str
        Name such as ``zubko-0.1`` (no unit), whatever its case.

    Returns
    -------
    Opacity
        Wavelengths in um, absorption in cm^2 per gram of dust, source.

    Raises
    ------
    NotFound
        If there is no such table; the details hold the names.

    Notes
    -----
    Accuracy: 1 % at the wavelengths of the table for the stated material and spheres of one size; the real
    material of a system may differ by 30 to 100 %.

    Source: each table names its own.

    Examples
    --------
    >>> opacity_named("Zubko-0.1").kappa_cm2_g[2]
    8615.8
    """
    for each in OPACITIES:
        if each.name == name.strip().casefold():
            return each
    known = [each.name for each in OPACITIES]
    raise NotFound(
        f"There is no table of opacities '{name}'.",
        why="Known here: " + ", ".join(known) + ".",
        hint='Name one of these, or give a power law such as "1000 cm2/g at 10 um, index 1.2".',
        code="opacity-not-found",
        details={"known": known},
    )


def power_law_opacity(
    kappa_cm2_g: float, wavelength_um: float, index: float, sigma_ln: float | None = None
) -> Opacity:
    """An opacity that falls as a power of the wavelength.

    Parameters
    ----------
    kappa_cm2_g : float
        At ``wavelength_um``, cm^2 per gram of dust, > 0.
    wavelength_um : float
        um, > 0.
    index : float
        s of kappa proportional to lambda^-s (dimensionless).
    sigma_ln : float, optional
        Error of the natural logarithm of kappa (dimensionless); None where it is not known.

    Returns
    -------
    Opacity
        cm^2 per gram of dust, at any wavelength in um.

    Raises
    ------
    InputRefused
        If opacity or wavelength is not positive.

    Notes
    -----
    Accuracy: exact for the law.

    Source: given by the user.

    Examples
    --------
    >>> law = power_law_opacity(1000.0, 10.0, 1.0)
    >>> round(float(opacity_cm2_g(law, 5.0)), 6)
    2000.0
    """
    kappa = float(positive(kappa_cm2_g, "opacity", "1000 cm2/g"))
    wavelength = float(positive(wavelength_um, "wavelength", "10 um"))
    name = f"{kappa:g} cm2/g at {wavelength:g} um, index {index:g}"
    return Opacity(name, (wavelength,), (kappa,), "as given", None, sigma_ln, index)


def reaches(opacity: Opacity, wavelength_um: float) -> bool:
    """Whether an opacity is known at a wavelength.

    Parameters
    ----------
    opacity : Opacity
        A table or a power law, cm^2/g.
    wavelength_um : float
        um.

    Returns
    -------
    bool
        True (dimensionless) inside the table and up to 10 % beyond its ends; always for a power law.

    Notes
    -----
    Accuracy: a convention. Source: project convention.

    Examples
    --------
    >>> reaches(opacity_named("zubko-0.5"), 1.24), reaches(opacity_named("zubko-0.1"), 1.22)
    (False, True)
    """
    if opacity.end_index is not None:
        return True
    return opacity.wavelength_um[0] / _BEYOND <= wavelength_um <= opacity.wavelength_um[-1] * _BEYOND


def opacity_cm2_g(opacity: Opacity, wavelength_um: ArrayLike) -> FloatArray:
    """Absorption at wavelengths.

    Parameters
    ----------
    opacity : Opacity
        A table or a power law.
    wavelength_um : array_like
        um, > 0.

    Returns
    -------
    ndarray
        cm^2 per gram of dust.

    Raises
    ------
    InputRefused
        If a wavelength is not positive.

    Notes
    -----
    Accuracy: straight lines in the logarithms, 1 to 2 % between the wavelengths of a table for grains of
    0.1 um and smaller, 10 % for larger ones. Beyond its ends a table is continued with its last slope.

    Source: that of the opacity.

    Examples
    --------
    >>> opacity_cm2_g(opacity_named("zubko-0.1"), [2.159, 10.0]).round(1).tolist()
    [8615.8, 1011.6]
    """
    x = np.log(positive(wavelength_um, "wavelength", "3.45 um"))
    nodes, values = np.log(opacity.wavelength_um), np.log(opacity.kappa_cm2_g)
    if opacity.end_index is not None:
        return np.asarray(np.exp(values[0] - opacity.end_index * (x - nodes[0])))
    slopes = np.diff(values) / np.diff(nodes)
    place = np.clip(np.searchsorted(nodes, x) - 1, 0, slopes.size - 1)
    return np.asarray(np.exp(values[place] + slopes[place] * (x - nodes[place])))


def planck_mean_cm2_g(opacity: Opacity, temperature_k: ArrayLike) -> FloatArray:
    """Opacity averaged over the light that dust of a temperature would emit as a black body.

    Parameters
    ----------
    opacity : Opacity
        A table or a power law.
    temperature_k : array_like
        Temperature of the dust, K, > 0, one-dimensional or a number.

    Returns
    -------
    ndarray
        Planck mean, cm^2 per gram of dust.

    Raises
    ------
    InputRefused
        If a temperature is not positive.

    Notes
    -----
    Accuracy: the integral 1e-4; tables are continued beyond their ends with the last slope.

    Source: integral of kappa B over that of B.

    Examples
    --------
    >>> law = power_law_opacity(1000.0, 10.0, 0.0)
    >>> round(float(planck_mean_cm2_g(law, 700.0)), 3)
    1000.0
    """
    temperature = positive(temperature_k, "temperature", "1000 K")
    # In x = h c/(lambda k T) the weight x^3/(e^x - 1) is the same for every temperature.
    x, weight = _planck_weights()
    hc_k = float(planck_exponent(1.0, 1.0))
    wavelength = hc_k / (x * temperature[..., None])
    return np.asarray((opacity_cm2_g(opacity, wavelength) * weight).sum(axis=-1))


def _planck_weights() -> tuple[FloatArray, FloatArray]:
    """Nodes in x and normalised weights of the Planck mean, even in ln x."""
    x = np.exp(np.linspace(np.log(1e-3), np.log(60.0), 400))
    weight = x**4 / np.expm1(x)
    return x, weight / weight.sum()


def dust_luminosity_lsun(mass_msun: ArrayLike, temperature_k: ArrayLike, opacity: Opacity) -> FloatArray:
    """Light of optically thin dust of one temperature.

    Parameters
    ----------
    mass_msun : array_like
        Mass of the dust, Msun, >= 0.
    temperature_k : array_like
        Its temperature, K, > 0. Inputs broadcast.
    opacity : Opacity
        cm^2 per gram of dust.

    Returns
    -------
    ndarray
        Luminosity, Lsun (IAU nominal).

    Raises
    ------
    InputRefused
        If a temperature is not positive.

    Notes
    -----
    Accuracy: that of :func:`planck_mean_cm2_g`, and 2e-5 for the mass of the Sun in kilograms.

    Source: L = 4 M <kappa>(T) sigma T^4 (each gram emits 4 pi kappa B).

    Examples
    --------
    >>> grey = power_law_opacity(1000.0, 10.0, 0.0)
    >>> round(float(dust_luminosity_lsun(1e-8, 1000.0, grey)), 1)
    1178.2
    """
    temperature = np.asarray(temperature_k, dtype=np.float64)
    # 0.1 m^2/kg is 1 cm^2/g.
    a_gram = 0.1 * planck_mean_cm2_g(opacity, temperature) * 4.0 * STEFAN_BOLTZMANN * temperature**4
    return np.asarray(np.asarray(mass_msun) * SOLAR_MASS_KG * a_gram / SOLAR_LUMINOSITY_W)
