"""Temperature of dust grains in starlight, and where their light peaks."""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import ArrayLike, NDArray

from campaign.physics.constants import AU_KM

FloatArray = NDArray[np.float64]

# IAU 2015 Resolution B3 (nominal), and SI since 2019 (exact).
SOLAR_LUMINOSITY_W = 3.828e26
PLANCK_J_S = 6.62607015e-34
BOLTZMANN_J_K = 1.380649e-23
LIGHT_M_S = 299_792_458.0
STEFAN_BOLTZMANN = 2.0 * math.pi**5 * BOLTZMANN_J_K**4 / (15.0 * PLANCK_J_S**3 * LIGHT_M_S**2)

_AU_M = 1000.0 * AU_KM
_UM_M = 1e-6


def grain_temperature_k(
    luminosity_lsun: ArrayLike,
    distance_au: ArrayLike,
    emissivity_index: float = 1.0,
    grain_radius_um: float = 0.1,
) -> FloatArray:
    """Equilibrium temperature of a grain that absorbs all starlight and emits poorly at long wavelengths.

    Parameters
    ----------
    luminosity_lsun : array_like
        Luminosity of all stars together, nominal solar luminosities, > 0.
    distance_au : array_like
        Distance from them, au, > 0; much larger than that between the stars.
    emissivity_index : float
        s of Q_ir = (2 pi a / lambda)^s (dimensionless), >= 0; 0 is a grey grain, 1 suits amorphous carbon.
    grain_radius_um : float
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
    from scipy.special import gamma, zeta

    absorbed = (
        np.asarray(luminosity_lsun, dtype=float)
        * SOLAR_LUMINOSITY_W
        / (16.0 * np.pi * (np.asarray(distance_au, dtype=float) * _AU_M) ** 2)
    )
    s = emissivity_index
    size = BOLTZMANN_J_K * 2.0 * np.pi * grain_radius_um * _UM_M / (PLANCK_J_S * LIGHT_M_S)
    mean = size**s * gamma(4.0 + s) * zeta(4.0 + s, 1) / (gamma(4.0) * zeta(4.0, 1))
    grey = (absorbed / STEFAN_BOLTZMANN) ** 0.25
    selective = (absorbed / (STEFAN_BOLTZMANN * mean)) ** (1.0 / (4.0 + s))
    hottest: FloatArray = np.maximum(grey, selective)
    return hottest


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
