"""Black bodies at a wavelength: the Planck function per unit frequency, and its slope with temperature."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from campaign.physics.constants import BOLTZMANN_J_K, LIGHT_M_S, PLANCK_J_S
from campaign.physics.domain import positive

FloatArray = NDArray[np.float64]

# h c/k in um K, and 2 h c in Jy um^3 / sr (1 Jy = 1e-26 W m^-2 Hz^-1; 1 um = 1e-6 m).
_HC_K_UM = PLANCK_J_S * LIGHT_M_S / BOLTZMANN_J_K * 1e6
_TWO_HC = 2.0 * PLANCK_J_S * LIGHT_M_S * 1e18 * 1e26


def planck_jy_sr(wavelength_um: ArrayLike, temperature_k: ArrayLike) -> FloatArray:
    """Intensity of a black body per unit frequency.

    Parameters
    ----------
    wavelength_um : array_like
        Wavelength, um, > 0.
    temperature_k : array_like
        Temperature, K, > 0. Inputs broadcast.

    Returns
    -------
    ndarray
        B_nu, Jy/sr; never B_lambda.

    Raises
    ------
    InputRefused
        If wavelength or temperature is not positive.

    Notes
    -----
    Accuracy: a few units in the last place; zero where h nu/(k T) passes 700.

    Source: Planck's law, B_nu = 2 h nu^3/c^2/(exp(h nu/k T) - 1), constants of SI 2019.

    Examples
    --------
    >>> f"{float(planck_jy_sr(11.5608, 600.0)):.9e}"
    '3.695207542e+15'
    """
    wavelength = positive(wavelength_um, "wavelength", "3.45 um")
    x = planck_exponent(wavelength, temperature_k)
    return np.asarray(_TWO_HC / wavelength**3 / np.expm1(np.minimum(x, 700.0)) * (x <= 700.0))


def planck_exponent(wavelength_um: ArrayLike, temperature_k: ArrayLike) -> FloatArray:
    """Energy of a photon over that of the heat.

    Parameters
    ----------
    wavelength_um : array_like
        Wavelength, um, > 0.
    temperature_k : array_like
        Temperature, K, > 0. Inputs broadcast.

    Returns
    -------
    ndarray
        h c/(lambda k T) (dimensionless).

    Raises
    ------
    InputRefused
        If wavelength or temperature is not positive.

    Notes
    -----
    Accuracy: one unit in the last place.

    Source: SI 2019.

    Examples
    --------
    >>> round(float(planck_exponent(14387.768775, 1.0)), 9)
    1.0
    """
    wavelength = positive(wavelength_um, "wavelength", "3.45 um")
    return np.asarray(_HC_K_UM / (wavelength * positive(temperature_k, "temperature", "1000 K")))


def log_planck_slope(wavelength_um: ArrayLike, temperature_k: ArrayLike) -> FloatArray:
    """How steeply the intensity of a black body rises with its temperature.

    Parameters
    ----------
    wavelength_um : array_like
        Wavelength, um, > 0.
    temperature_k : array_like
        Temperature, K, > 0. Inputs broadcast.

    Returns
    -------
    ndarray
        d ln B_nu/d ln T (dimensionless): 1 at long wavelengths, h c/(lambda k T) at short ones.

    Raises
    ------
    InputRefused
        If wavelength or temperature is not positive.

    Notes
    -----
    Accuracy: a few units in the last place.

    Source: derivative of Planck's law, x/(1 - e^-x).

    Examples
    --------
    >>> round(float(log_planck_slope(1000.0, 1e6)), 6)
    1.000007
    """
    x = planck_exponent(wavelength_um, temperature_k)
    return np.asarray(x / -np.expm1(-x))


def flux_per_wavelength_w_cm2_um(flux_jy: ArrayLike, wavelength_um: ArrayLike) -> FloatArray:
    """A flux per unit frequency as one per unit wavelength.

    Parameters
    ----------
    flux_jy : array_like
        F_nu, Jy.
    wavelength_um : array_like
        Wavelength, um, > 0. Inputs broadcast.

    Returns
    -------
    ndarray
        F_lambda, W cm^-2 um^-1 (per square centimetre and um of wavelength).

    Raises
    ------
    InputRefused
        If a wavelength is not positive.

    Notes
    -----
    Accuracy: exact at one wavelength. In a band the isophotal wavelength and frequency of a star are not
    the same place: 0.1 % in Ks.

    Source: F_lambda = F_nu c/lambda^2.

    Examples
    --------
    >>> f"{float(flux_per_wavelength_w_cm2_um(666.7, 2.159)):.4e}"
    '4.2879e-14'
    """
    wavelength = positive(wavelength_um, "wavelength", "2.159 um")
    # 1e-26 W/m^2/Hz x c/lambda^2 in Hz/m, to cm^-2 (1e-4) and um^-1 (1e-6).
    in_w_m3 = np.asarray(flux_jy, dtype=np.float64) * 1e-26 * LIGHT_M_S / (wavelength * 1e-6) ** 2
    return np.asarray(in_w_m3 * 1e-10)
