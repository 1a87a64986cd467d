"""Temperature of dust grains in starlight, and where their light peaks."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from campaign.physics.constants import (
    AU_KM,
    BOLTZMANN_J_K,
    LIGHT_M_S,
    PLANCK_J_S,
    SOLAR_LUMINOSITY_W,
    STEFAN_BOLTZMANN,
)

FloatArray = NDArray[np.float64]

_AU_M = 1000.0 * AU_KM
_UM_M = 1e-6


def grain_temperature_k(
    luminosity_lsun: ArrayLike,
    distance_au: ArrayLike,
    emissivity_index: ArrayLike = 1.0,
    grain_radius_um: ArrayLike = 0.1,
) -> FloatArray:
    """Equilibrium temperature of a grain that absorbs all starlight and emits poorly at long wavelengths.

    Parameters
    ----------
    luminosity_lsun : array_like
        Luminosity of all stars together, nominal solar luminosities, > 0.
    distance_au : array_like
        Distance from them, au, > 0; much larger than that between the stars.
    emissivity_index : array_like
        s of Q_ir = (2 pi a / lambda)^s (dimensionless), >= 0; 0 is a grey grain, 1 suits amorphous carbon.
    grain_radius_um : array_like
        Radius a, um, > 0; without effect on a grey grain.

    Returns
    -------
    ndarray
        Temperature, kelvin; broadcast shape.

    Notes
    -----
    Q of starlight is 1: stars hotter than 20,000 K shine where even small grains absorb well. Where the law
    would let the grain emit better than a black body, at thousands of kelvin, it is taken as grey.
    Accuracy: exact for the model; real optical constants move the temperature by about 10 %.

    Source: L / (16 pi r^2) = sigma T^4 <Q>, with the Planck mean <Q> = (k T 2 pi a / h c)^s
    Gamma(4+s) zeta(4+s) / (Gamma(4) zeta(4)) (Draine 2011, Physics of the Interstellar and Intergalactic
    Medium, ch. 24; memory).

    Examples
    --------
    >>> round(float(grain_temperature_k(1.0, 1.0, 0.0)), 2)
    278.33
    >>> round(float(grain_temperature_k(3e5, 65.77, 1.0, 0.628 / (2 * np.pi))), 1)
    1200.0
    """
    absorbed = (
        np.asarray(luminosity_lsun, dtype=float)
        * SOLAR_LUMINOSITY_W
        / (16.0 * np.pi * (np.asarray(distance_au, dtype=float) * _AU_M) ** 2)
    )
    s = np.asarray(emissivity_index, dtype=float)
    at_one_kelvin = power_law_emission(1.0, s, grain_radius_um)
    grey = (absorbed / STEFAN_BOLTZMANN) ** 0.25
    selective = (absorbed / (STEFAN_BOLTZMANN * at_one_kelvin)) ** (1.0 / (4.0 + s))
    hottest: FloatArray = np.maximum(grey, selective)
    return hottest


def power_law_emission(
    temperature_k: ArrayLike, emissivity_index: ArrayLike, grain_radius_um: ArrayLike
) -> FloatArray:
    """Planck mean of an emissivity that falls as a power of the wavelength, without any ceiling.

    Parameters
    ----------
    temperature_k : array_like
        Temperature, kelvin, > 0.
    emissivity_index : array_like
        s of Q = (2 pi a / lambda)^s (dimensionless), >= 0.
    grain_radius_um : array_like
        Radius a, um, > 0. Inputs broadcast.

    Returns
    -------
    ndarray
        <Q> (dimensionless); above 1 the law is beyond its domain, for no grain emits better than a black
        body of its size.

    Notes
    -----
    Accuracy: exact for the power law. Cutting Q off at 1 would change <Q> by 2e-6 at 1200 K and by 0.03 %
    at 1800 K (a = 0.1 um, s = 1).

    Source: integral of x^(3+s)/(e^x - 1) over that of x^3/(e^x - 1) (Draine 2011, ch. 24; memory).

    Examples
    --------
    >>> round(float(power_law_emission(1200.0, 1.0, 0.628 / (2 * np.pi))), 9)
    0.200723837
    """
    from scipy.special import gamma, zeta

    s = np.asarray(emissivity_index, dtype=float)
    radius, temperature = (np.asarray(x, dtype=float) for x in (grain_radius_um, temperature_k))
    size = BOLTZMANN_J_K * temperature * 2.0 * np.pi * radius * _UM_M / (PLANCK_J_S * LIGHT_M_S)
    mean: FloatArray = size**s * gamma(4.0 + s) * zeta(4.0 + s, 1) / (gamma(4.0) * zeta(4.0, 1))
    return mean


def peak_wavelength_um(temperature_k: ArrayLike, emissivity_index: float = 1.0) -> FloatArray:
    """Wavelength at which the flux per unit wavelength of warm grains is largest.

    Parameters
    ----------
    temperature_k : array_like
        Temperature, kelvin, > 0.
    emissivity_index : float
        s of Q_ir proportional to lambda^-s (dimensionless), >= 0; 0 is a black body.

    Returns
    -------
    ndarray
        Wavelength, um, in the shape of the temperatures.

    Notes
    -----
    The peak per unit frequency lies at a longer wavelength (1.76 times for a black body).
    Accuracy: 1e-12.

    Source: Wien's displacement law for lambda^-s B_lambda: x = (5 + s)(1 - e^-x), x = h c/(lambda k T).

    Examples
    --------
    >>> round(float(peak_wavelength_um(1000.0, 0.0)), 4)
    2.8978
    """
    from scipy.special import lambertw

    n = 5.0 + emissivity_index
    x = n + float(lambertw(-n * np.exp(-n)).real)
    peak: FloatArray = (
        PLANCK_J_S * LIGHT_M_S / (BOLTZMANN_J_K * x * np.asarray(temperature_k, dtype=float)) / _UM_M
    )
    return peak
