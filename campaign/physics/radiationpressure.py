"""Light against gravity on dust grains, and the speed that grains end up with."""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import ArrayLike, NDArray

from campaign.physics.constants import AU_KM, GM_SUN_KM3_S2, SOLAR_LUMINOSITY_W, SPEED_OF_LIGHT_KMS
from campaign.physics.domain import positive

FloatArray = NDArray[np.float64]

# beta of 1 cm^2/g at 1 Lsun and 1 Msun: 0.1 m^2/kg, c in m/s, GM in m^3/s^2.
_BETA_UNIT = 0.1 * SOLAR_LUMINOSITY_W / (4.0 * math.pi * SPEED_OF_LIGHT_KMS * 1e3 * GM_SUN_KM3_S2 * 1e9)


def radiation_pressure_ratio(
    luminosity_lsun: ArrayLike, mass_msun: ArrayLike, kappa_pr_cm2_g: ArrayLike
) -> FloatArray:
    """Force of the light on a grain over the pull of gravity on it.

    Parameters
    ----------
    luminosity_lsun : array_like
        Luminosity that shines on the grain, Lsun (IAU nominal), > 0; of both stars where both count.
    mass_msun : array_like
        Mass that pulls, Msun, > 0.
    kappa_pr_cm2_g : array_like
        Opacity for radiation pressure, cm^2 per gram of what is pushed, > 0: of dust for free grains;
        times the share of dust in the mass for grains that carry the gas with them. Inputs broadcast.

    Returns
    -------
    ndarray
        beta (dimensionless), independent of distance.

    Raises
    ------
    InputRefused
        If an input is not positive.

    Notes
    -----
    Accuracy: that of the constants (GM of the Sun and its luminosity, IAU 2015 Resolution B3, nominal).
    Optically thin: grains in the shade of others feel less.

    Source: beta = kappa_pr L/(4 pi c G M) (Burns, Lamy & Soter 1979, Icarus 40, 1, eq. 19; memory).

    Examples
    --------
    >>> round(float(radiation_pressure_ratio(3e5, 15.0, 5000.0)), 3)
    7656.49
    """
    light = positive(luminosity_lsun, "luminosity", "3e5 Lsun")
    mass = positive(mass_msun, "mass", "15 Msun")
    kappa = positive(kappa_pr_cm2_g, "opacity", "5000 cm2/g")
    return np.asarray(_BETA_UNIT * kappa * light / mass)


def geometric_opacity_cm2_g(
    size_um: ArrayLike, density_g_cm3: ArrayLike, efficiency: ArrayLike
) -> FloatArray:
    """Opacity of spheres whose cross-section is a given share of the geometric one.

    Parameters
    ----------
    size_um : array_like
        Radius of the grains, um, > 0.
    density_g_cm3 : array_like
        Density of their material, g/cm^3, > 0.
    efficiency : array_like
        Q (dimensionless), > 0; 1 for grains in light of much shorter wavelength than their size.

    Returns
    -------
    ndarray
        3 Q/(4 a rho), cm^2 per gram of dust; inputs broadcast.

    Raises
    ------
    InputRefused
        If an input is not positive.

    Notes
    -----
    Accuracy: exact for spheres.

    Source: pi a^2 Q over (4/3) pi a^3 rho.

    Examples
    --------
    >>> round(float(geometric_opacity_cm2_g(0.1, 1.8, 1.0)), 1)
    41666.7
    """
    size = positive(size_um, "grain size", "0.1 um")
    density = positive(density_g_cm3, "density", "1.8 g/cm3")
    q = positive(efficiency, "efficiency", "1")
    return np.asarray(3.0 * q / (4.0 * size * 1e-4 * density))


def terminal_speed_kms(
    launch_speed_kms: ArrayLike, launch_radius_au: ArrayLike, mass_msun: ArrayLike, beta: ArrayLike
) -> FloatArray:
    """Speed far from the star of what left a radius with a speed, under light and gravity alone.

    Parameters
    ----------
    launch_speed_kms : array_like
        Speed at the launch radius, outward, km/s, >= 0.
    launch_radius_au : array_like
        Where it was launched, au, > 0.
    mass_msun : array_like
        Mass that pulls, Msun, > 0.
    beta : array_like
        Radiation pressure over gravity (dimensionless), >= 0; see :func:`radiation_pressure_ratio`.
        Inputs broadcast.

    Returns
    -------
    ndarray
        Terminal speed, km/s; NaN where it falls back (beta below 1 and too slow).

    Raises
    ------
    InputRefused
        If radius or mass is not positive.

    Notes
    -----
    Accuracy: exact for a constant beta, a radial path, and neither gas drag nor mass loss by sputtering.

    Source: energy integral of dv/dt = (beta - 1) G M/r^2, v_inf^2 = v_0^2 + 2 (beta - 1) G M/r_0.

    Examples
    --------
    >>> round(float(terminal_speed_kms(1500.0, 50.0, 15.0, 5000.0)), 6)
    2216.044071
    """
    radius = positive(launch_radius_au, "launch radius", "50 au")
    mass = positive(mass_msun, "mass", "15 Msun")
    speed = np.asarray(launch_speed_kms, dtype=np.float64)
    push = np.asarray(beta, dtype=np.float64) - 1.0
    square = speed**2 + 2.0 * push * GM_SUN_KM3_S2 * mass / (radius * AU_KM)
    return np.sqrt(np.where(square >= 0.0, square, np.nan))
