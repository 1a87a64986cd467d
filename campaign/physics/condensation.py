"""How far from hot stars carbon is cool enough to condense, and how soon the gas gets there."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from campaign.errors import InputRefused
from campaign.physics.constants import AU_KM, SOLAR_LUMINOSITY_W, STEFAN_BOLTZMANN
from campaign.physics.domain import positive
from campaign.physics.grains import power_law_emission

FloatArray = NDArray[np.float64]

# Above this no solid carbon forms at the pressures of a wind (graphite sublimes near 3900 K at one bar).
HOTTEST_CONDENSATION_K = 2500.0
# L/(16 pi sigma r^2) of 1 Lsun at 1 au, K^4.
_GREY_K4 = SOLAR_LUMINOSITY_W / (16.0 * np.pi * STEFAN_BOLTZMANN * (AU_KM * 1e3) ** 2)


def condensation_radius_au(
    luminosity_lsun: ArrayLike,
    temperature_k: ArrayLike,
    emissivity_index: ArrayLike = 1.0,
    grain_radius_um: ArrayLike = 0.1,
) -> FloatArray:
    """Distance at which grains have a temperature; the inverse of ``grains.grain_temperature_k``.

    Parameters
    ----------
    luminosity_lsun : array_like
        Luminosity of all stars together, Lsun (IAU nominal), > 0.
    temperature_k : array_like
        Temperature, K, in (0, 2500]; carbon condenses at about 1000 to 1800 K (memory).
    emissivity_index : array_like
        s of Q_ir = (2 pi a/lambda)^s (dimensionless), in [0, 4].
    grain_radius_um : array_like
        Radius a, um, > 0. Inputs broadcast.

    Returns
    -------
    ndarray
        Distance, au.

    Raises
    ------
    InputRefused
        If an input is outside its domain; above 2500 K nothing condenses.

    Notes
    -----
    Accuracy: exact for this emissivity, with Q = 1 for starlight. Optically thin: no shade, no light of
    other grains. The power law is *not* continued into the ultraviolet, where it would put the radius
    three times too far out.

    Source: r = (L/(16 pi sigma T^4 <Q>(T)))^(1/2), <Q> at most 1.

    Examples
    --------
    >>> round(float(condensation_radius_au(3e5, 1200.0, 1.0, 0.628 / (2 * np.pi))), 6)
    65.768573
    """
    temperature, s = _condensing(temperature_k), _checked_index(emissivity_index)
    radius = positive(grain_radius_um, "grain radius", "0.1 um")
    light = positive(luminosity_lsun, "luminosity", "3e5 Lsun")
    mean = np.minimum(power_law_emission(temperature, s, radius), 1.0)
    return np.asarray(np.sqrt(_GREY_K4 * light / (temperature**4 * mean)))


def power_law_temperature_k(
    luminosity_lsun: ArrayLike,
    distance_au: ArrayLike,
    star_temperature_k: ArrayLike,
    emissivity_index: ArrayLike,
) -> FloatArray:
    """Temperature of a grain whose emissivity is one power law at all wavelengths, the ultraviolet too.

    For comparison with papers that use it. Around hot stars it makes grains too hot: a real grain absorbs
    no more than its cross-section.

    Parameters
    ----------
    luminosity_lsun : array_like
        Luminosity of the star, Lsun, > 0.
    distance_au : array_like
        Distance from it, au, > 0.
    star_temperature_k : array_like
        Effective temperature of the star, K, > 0.
    emissivity_index : array_like
        s of Q proportional to lambda^-s (dimensionless), in [0, 4]. Inputs broadcast.

    Returns
    -------
    ndarray
        Temperature, K.

    Raises
    ------
    InputRefused
        If an input is outside its domain.

    Notes
    -----
    Accuracy: exact for the power law and a star that shines as a black body.

    Source: T = T_star (R_star/(2 r))^(2/(4+s)), from the balance of absorbed and emitted power.

    Examples
    --------
    >>> round(float(power_law_temperature_k(3e5, 100.0, 50000.0, 1.0)), 6)
    1551.908652
    """
    star = positive(star_temperature_k, "star temperature", "50000 K")
    s = _checked_index(emissivity_index)
    ratio = _half_star_au(luminosity_lsun, star) / positive(distance_au, "distance", "100 au")
    return np.asarray(star * ratio ** (2.0 / (4.0 + s)))


def power_law_condensation_radius_au(
    luminosity_lsun: ArrayLike,
    temperature_k: ArrayLike,
    star_temperature_k: ArrayLike,
    emissivity_index: ArrayLike,
) -> FloatArray:
    """Distance at which :func:`power_law_temperature_k` gives a temperature; for comparison only.

    Parameters
    ----------
    luminosity_lsun : array_like
        Luminosity of the star, Lsun, > 0.
    temperature_k : array_like
        Temperature of the grain, K, in (0, 2500].
    star_temperature_k : array_like
        Effective temperature of the star, K, > 0.
    emissivity_index : array_like
        s of Q proportional to lambda^-s (dimensionless), in [0, 4]. Inputs broadcast.

    Returns
    -------
    ndarray
        Distance, au.

    Raises
    ------
    InputRefused
        If an input is outside its domain.

    Notes
    -----
    Accuracy: exact for the power law.

    Source: r = (R_star/2) (T_star/T)^((4+s)/2).

    Examples
    --------
    >>> round(float(power_law_condensation_radius_au(3e5, 1200.0, 50000.0, 1.0)), 6)
    190.20077
    """
    temperature, star = (
        _condensing(temperature_k),
        positive(star_temperature_k, "star temperature", "50000 K"),
    )
    s = _checked_index(emissivity_index)
    return np.asarray(_half_star_au(luminosity_lsun, star) * (star / temperature) ** (0.5 * (4.0 + s)))


def travel_distance_au(
    condensation_radius_au: ArrayLike,
    separation_au: ArrayLike,
    stagnation_from_a_au: ArrayLike,
    luminosity_a_lsun: ArrayLike,
    luminosity_b_lsun: ArrayLike,
) -> FloatArray:
    """Way of the gas from the stagnation point to the condensation radius, along the axis behind star B.

    Parameters
    ----------
    condensation_radius_au : array_like
        From where the light comes from, au, > 0.
    separation_au : array_like
        Separation of the stars at that time, au, > 0.
    stagnation_from_a_au : array_like
        Distance of the stagnation point from star A on the line to B, au, >= 0.
    luminosity_a_lsun, luminosity_b_lsun : array_like
        Luminosities, Lsun, > 0: the centre of light divides the line in their ratio. Inputs broadcast.

    Returns
    -------
    ndarray
        Way, au; zero where the gas is cool enough from the start.

    Raises
    ------
    InputRefused
        If luminosities or separation are not positive.

    Notes
    -----
    Accuracy: on the axis; along the flank of the cone the way differs by up to the separation, which is a
    few per cent of a condensation radius.

    Source: geometry; the shocked gas streams away from star A if A has the stronger wind.

    Examples
    --------
    >>> round(float(travel_distance_au(66.0, 6.4, 5.0, 2e5, 2e5)), 6)
    64.2
    """
    d = positive(separation_au, "separation", "6.4 au")
    light_a = positive(luminosity_a_lsun, "luminosity", "3e5 Lsun")
    light_b = positive(luminosity_b_lsun, "luminosity", "3e5 Lsun")
    centre = d * light_b / (light_a + light_b)
    start = np.asarray(stagnation_from_a_au, dtype=np.float64) - centre
    return np.maximum(np.asarray(condensation_radius_au, dtype=np.float64) - start, 0.0)


def _half_star_au(luminosity_lsun: ArrayLike, star_temperature_k: FloatArray) -> FloatArray:
    """Half the radius of a star that shines as a black body: R^2 = L/(4 pi sigma T^4)."""
    light = positive(luminosity_lsun, "luminosity", "3e5 Lsun")
    return np.asarray(np.sqrt(_GREY_K4 * light) / star_temperature_k**2)


def _checked_index(index: ArrayLike) -> FloatArray:
    s = np.asarray(index, dtype=np.float64)
    outside = (s < 0.0) | (s > 4.0)
    if bool(outside.any()):
        raise InputRefused(
            f"An emissivity index of {float(s[outside].flat[0])!r} is none of a grain.",
            why="The emissivity of small grains falls as a power of the wavelength between 0 (grey) and 2.",
            hint="Give an index such as 1.2 for amorphous carbon.",
            code="emissivity-index-refused",
        )
    return s


def _condensing(temperature_k: ArrayLike) -> FloatArray:
    temperature = positive(temperature_k, "condensation temperature", "1200 K")
    if bool((temperature > HOTTEST_CONDENSATION_K).any()):
        wrong = float(temperature[temperature > HOTTEST_CONDENSATION_K].flat[0])
        raise InputRefused(
            f"Nothing condenses at {wrong:g} K.",
            why=f"Above {HOTTEST_CONDENSATION_K:g} K carbon stays gas; grains form at about 1000 to 1800 K.",
            hint='Give a condensation temperature or a range of it, such as 1200 K or "1000..1800 K".',
            code="condensation-temperature-refused",
            details={"temperature_k": wrong, "hottest_k": HOTTEST_CONDENSATION_K},
        )
    return temperature
