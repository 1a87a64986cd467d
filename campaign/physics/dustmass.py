"""From a flux to grams of dust and back, the temperature behind a pair of fluxes, and the least size."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from campaign.physics.constants import AU_KM, PARSEC_AU, SOLAR_MASS_KG
from campaign.physics.domain import positive
from campaign.physics.planck import planck_exponent, planck_jy_sr

FloatArray = NDArray[np.float64]

_PC_M = PARSEC_AU * AU_KM * 1e3
# (1 pc)^2 / (1 cm^2/g) in solar masses.
_MASS_UNIT_MSUN = _PC_M**2 / 0.1 / SOLAR_MASS_KG
COOLEST_K, HOTTEST_K = 3.0, 1e6
# Halvings of the range of ln T, to 3e-3, and Newton steps from there, to the rounding.
_HALVINGS, _NEWTON_STEPS = 12, 4


def dust_mass_msun(
    flux_jy: ArrayLike,
    wavelength_um: ArrayLike,
    distance_pc: ArrayLike,
    temperature_k: ArrayLike,
    kappa_cm2_g: ArrayLike,
) -> FloatArray:
    """Mass of optically thin dust of one temperature that gives a flux.

    Parameters
    ----------
    flux_jy : array_like
        Flux density of the dust alone, Jy.
    wavelength_um : array_like
        um, > 0.
    distance_pc : array_like
        pc, > 0.
    temperature_k : array_like
        Temperature of the dust, K, > 0.
    kappa_cm2_g : array_like
        Absorption at that wavelength, cm^2 per gram of DUST, > 0. Inputs broadcast.

    Returns
    -------
    ndarray
        Mass of the dust, Msun; no gas.

    Raises
    ------
    InputRefused
        If wavelength, distance, temperature or opacity is not positive.

    Notes
    -----
    Accuracy: 2e-5, of the mass of the Sun in kilograms. A lower limit where the dust is not thin.

    Source: M = F_nu D^2/(kappa_nu B_nu(T)) (Hildebrand 1983, QJRAS 24, 267); neither pi nor 4 pi.

    Examples
    --------
    >>> f"{float(dust_mass_msun(10.0, 11.5608, 2000.0, 600.0, 1000.0)):.4e}"
    '5.1834e-08'
    """
    distance = positive(distance_pc, "distance", "2000 pc")
    kappa = positive(kappa_cm2_g, "opacity", "1000 cm2/g")
    shine = kappa * planck_jy_sr(wavelength_um, temperature_k)
    return np.asarray(np.asarray(flux_jy, dtype=np.float64) * _MASS_UNIT_MSUN * distance**2 / shine)


def dust_flux_jy(
    mass_msun: ArrayLike,
    wavelength_um: ArrayLike,
    distance_pc: ArrayLike,
    temperature_k: ArrayLike,
    kappa_cm2_g: ArrayLike,
) -> FloatArray:
    """Flux density of optically thin dust; the inverse of :func:`dust_mass_msun`.

    Parameters
    ----------
    mass_msun : array_like
        Mass of the dust, Msun.
    wavelength_um : array_like
        um, > 0.
    distance_pc : array_like
        pc, > 0.
    temperature_k : array_like
        Temperature, K, > 0.
    kappa_cm2_g : array_like
        cm^2 per gram of dust, > 0. Inputs broadcast.

    Returns
    -------
    ndarray
        Jy.

    Raises
    ------
    InputRefused
        If wavelength, distance, temperature or opacity is not positive.

    Notes
    -----
    Accuracy and source: see :func:`dust_mass_msun`. Accuracy: 2e-5. Source: Hildebrand 1983.

    Examples
    --------
    >>> round(float(dust_flux_jy(5.18342e-8, 11.5608, 2000.0, 600.0, 1000.0)), 4)
    10.0
    """
    distance = positive(distance_pc, "distance", "2000 pc")
    kappa = positive(kappa_cm2_g, "opacity", "1000 cm2/g")
    shine = kappa * planck_jy_sr(wavelength_um, temperature_k)
    return np.asarray(np.asarray(mass_msun, dtype=np.float64) * shine / (_MASS_UNIT_MSUN * distance**2))


def blackbody_radius_au(
    flux_jy: ArrayLike, wavelength_um: ArrayLike, distance_pc: ArrayLike, temperature_k: ArrayLike
) -> FloatArray:
    """Radius of the black disc that would give a flux: nothing of that temperature can be smaller.

    Parameters
    ----------
    flux_jy : array_like
        Jy, >= 0.
    wavelength_um : array_like
        um, > 0.
    distance_pc : array_like
        pc, > 0.
    temperature_k : array_like
        Temperature, K, > 0. Inputs broadcast.

    Returns
    -------
    ndarray
        Radius, au.

    Raises
    ------
    InputRefused
        If wavelength, distance or temperature is not positive.

    Notes
    -----
    Accuracy: exact for one temperature.

    Source: F = pi (R/D)^2 B(T).

    Examples
    --------
    >>> round(float(blackbody_radius_au(10.0, 11.5608, 2000.0, 600.0)), 3)
    12.108
    """
    distance = positive(distance_pc, "distance", "2000 pc")
    solid = np.asarray(flux_jy, dtype=np.float64) / planck_jy_sr(wavelength_um, temperature_k)
    return np.asarray(np.sqrt(solid / np.pi) * distance * PARSEC_AU)


def colour_temperature_k(
    flux_ratio: ArrayLike, wavelength_1_um: float, wavelength_2_um: float, opacity_ratio: float
) -> FloatArray:
    """Temperature of thin dust behind the ratio of its fluxes at two wavelengths.

    Parameters
    ----------
    flux_ratio : array_like
        F_1/F_2 of the dust (dimensionless).
    wavelength_1_um, wavelength_2_um : float
        um, > 0, not equal.
    opacity_ratio : float
        kappa_1/kappa_2 (dimensionless), > 0: (lambda_2/lambda_1)^s for a power law.

    Returns
    -------
    ndarray
        Temperature, K, between 3 and 1e6; NaN where no temperature gives the ratio (a bluer one than
        any, or not positive).

    Raises
    ------
    InputRefused
        If a wavelength or the ratio of opacities is not positive.

    Notes
    -----
    Accuracy: 1e-12 relative. Temperature and opacity index are degenerate in one pair: an index taken 1
    too small makes dust of 1000 K look like 1400 K.

    Source: F_1/F_2 = (kappa_1/kappa_2) B(lambda_1, T)/B(lambda_2, T).

    Examples
    --------
    >>> round(float(colour_temperature_k(1.07352682843, 3.3526, 4.6028, 4.6028 / 3.3526)), 4)
    1000.0
    """
    short, long = sorted((float(wavelength_1_um), float(wavelength_2_um)))
    kappa = float(positive(opacity_ratio, "ratio of opacities", "1.37"))
    ratio = np.asarray(flux_ratio, dtype=np.float64) / kappa
    with np.errstate(divide="ignore", invalid="ignore"):
        wanted = np.where(ratio > 0.0, np.log(ratio), np.nan)
    if wavelength_1_um > wavelength_2_um:
        wanted = -wanted
    # The ratio of a shorter to a longer wavelength rises with T: halve the range of ln T, then Newton.
    ends = (float(planck_exponent(short, 1.0)), float(planck_exponent(long, 1.0)))
    low, high = np.full(wanted.shape, np.log(COOLEST_K)), np.full(wanted.shape, np.log(HOTTEST_K))
    outside = ~((wanted > _log_ratio(low, *ends)[0]) & (wanted < _log_ratio(high, *ends)[0]))
    for _ in range(_HALVINGS):
        middle = 0.5 * (low + high)
        below = _log_ratio(middle, *ends)[0] < wanted
        low, high = np.where(below, middle, low), np.where(below, high, middle)
    log_t = 0.5 * (low + high)
    for _ in range(_NEWTON_STEPS):
        found, slope = _log_ratio(log_t, *ends)
        log_t = np.clip(log_t + (wanted - found) / slope, low, high)
    return np.where(outside, np.nan, np.exp(log_t))


def _log_ratio(log_temperature: FloatArray, short: float, long: float) -> tuple[FloatArray, FloatArray]:
    """ln B(short)/B(long) and its slope with ln T, from h c/(lambda k) of both in K, without overflow."""
    cold = np.exp(-log_temperature)
    x, y = short * cold, long * cold
    # ln(e^x - 1) = x + ln(1 - e^-x).
    less_x, less_y = -np.expm1(-x), -np.expm1(-y)
    logs = 3.0 * np.log(short / long) + (y + np.log(less_y)) - (x + np.log(less_x))
    return logs, x / less_x - y / less_y
