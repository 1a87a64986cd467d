"""Masses, semi-major axes and periods: velocities of both stars, and Kepler's third law.

Years are Julian years of 365.25 d, the solar mass parameter is the IAU nominal one.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from campaign.physics.constants import AU_KM, DAY_S, GM_SUN_KM3_S2
from campaign.physics.domain import closed_orbit, positive

FloatArray = NDArray[np.float64]


def minimum_masses(
    period_d: ArrayLike, eccentricity: ArrayLike, k_a_kms: ArrayLike, k_b_kms: ArrayLike
) -> tuple[FloatArray, FloatArray]:
    """Masses of both stars times sin^3 of the inclination.

    Parameters
    ----------
    period_d : array_like
        Period, days, > 0.
    eccentricity : array_like
        e (dimensionless), 0 <= e < 1.
    k_a_kms, k_b_kms : array_like
        Velocity semi-amplitudes of stars A and B, km/s, > 0; all arguments broadcast.

    Returns
    -------
    tuple of ndarray
        M_A sin^3 i and M_B sin^3 i, solar masses. The lighter star has the larger K.

    Raises
    ------
    InputRefused
        If a period or semi-amplitude is not positive or e is outside [0, 1).

    Notes
    -----
    Accuracy: rounding only; 1.036149066e-7 is the factor for km/s and days. Point masses, no relativity.

    Source: M_A sin^3 i = P/(2 pi G) (1 - e^2)^1.5 (K_A + K_B)^2 K_B, from Kepler's third law about the
    barycentre; IAU 2015 Resolution B3 for GM of the Sun.

    Examples
    --------
    >>> star_a, star_b = minimum_masses(4766.0, 0.178, 27.9, 6.1)
    >>> round(float(star_a), 4), round(float(star_b), 4)
    (3.3181, 15.1762)
    """
    k_a, k_b = positive(k_a_kms, "semi-amplitude", "28 km/s"), positive(k_b_kms, "semi-amplitude", "28 km/s")
    seconds = positive(period_d, "period", "3127.5 d") * DAY_S
    e = closed_orbit(eccentricity)
    factor = seconds / (2.0 * np.pi * GM_SUN_KM3_S2) * ((1.0 - e) * (1.0 + e)) ** 1.5 * (k_a + k_b) ** 2
    return factor * k_b, factor * k_a


def masses_from_velocities(
    period_d: ArrayLike,
    eccentricity: ArrayLike,
    k_a_kms: ArrayLike,
    k_b_kms: ArrayLike,
    inclination_rad: ArrayLike,
) -> tuple[FloatArray, FloatArray]:
    """Masses of both stars from their velocities and the inclination.

    Parameters
    ----------
    period_d : array_like
        Period, days, > 0.
    eccentricity : array_like
        e (dimensionless), 0 <= e < 1.
    k_a_kms, k_b_kms : array_like
        Velocity semi-amplitudes of stars A and B, km/s, > 0.
    inclination_rad : array_like
        Inclination, rad, in (0, pi); all arguments broadcast.

    Returns
    -------
    tuple of ndarray
        M_A and M_B, solar masses; infinite face on, where velocities say nothing.

    Raises
    ------
    InputRefused
        If a period or semi-amplitude is not positive or e is outside [0, 1).

    Notes
    -----
    Accuracy: rounding only.

    Source: minimum masses divided by sin^3 i.

    Examples
    --------
    >>> import numpy as np
    >>> star_a, star_b = masses_from_velocities(4766.0, 0.178, 27.9, 6.1, np.radians(67.0))
    >>> round(float(star_a), 5), round(float(star_b), 4)
    (4.25414, 19.4574)
    """
    minimum_a, minimum_b = minimum_masses(period_d, eccentricity, k_a_kms, k_b_kms)
    cube = np.sin(np.asarray(inclination_rad, dtype=np.float64)) ** 3
    with np.errstate(divide="ignore"):
        return minimum_a / cube, minimum_b / cube


def projected_semi_major_axis_km(
    period_d: ArrayLike, eccentricity: ArrayLike, k_kms: ArrayLike
) -> FloatArray:
    """Semi-major axis of one star's own orbit about the barycentre, times sin i.

    Parameters
    ----------
    period_d : array_like
        Period, days, > 0.
    eccentricity : array_like
        e (dimensionless), 0 <= e < 1.
    k_kms : array_like
        Velocity semi-amplitude of that star, km/s, > 0; all arguments broadcast.

    Returns
    -------
    ndarray
        a sin i of the star, km.

    Raises
    ------
    InputRefused
        If a period or semi-amplitude is not positive or e is outside [0, 1).

    Notes
    -----
    Accuracy: rounding only.

    Source: a sin i = K P sqrt(1 - e^2)/(2 pi).

    Examples
    --------
    >>> round(float(projected_semi_major_axis_km(4766.0, 0.178, 27.9)), 1)
    1799287941.5
    """
    k = positive(k_kms, "semi-amplitude", "28 km/s")
    seconds = positive(period_d, "period", "3127.5 d") * DAY_S
    e = closed_orbit(eccentricity)
    return k * seconds * np.sqrt((1.0 - e) * (1.0 + e)) / (2.0 * np.pi)


def semi_major_axis_from_velocities(
    period_d: ArrayLike,
    eccentricity: ArrayLike,
    k_a_kms: ArrayLike,
    k_b_kms: ArrayLike,
    inclination_rad: ArrayLike,
) -> FloatArray:
    """Semi-major axis of the relative orbit from the velocities of both stars.

    Parameters
    ----------
    period_d : array_like
        Period, days, > 0.
    eccentricity : array_like
        e (dimensionless), 0 <= e < 1.
    k_a_kms, k_b_kms : array_like
        Velocity semi-amplitudes of stars A and B, km/s, > 0.
    inclination_rad : array_like
        Inclination, rad, in (0, pi); all arguments broadcast.

    Returns
    -------
    ndarray
        a, au; infinite face on.

    Raises
    ------
    InputRefused
        If a period or semi-amplitude is not positive or e is outside [0, 1).

    Notes
    -----
    Accuracy: rounding only.

    Source: a sin i = (K_A + K_B) P sqrt(1 - e^2)/(2 pi).

    Examples
    --------
    >>> import numpy as np
    >>> round(float(semi_major_axis_from_velocities(4766.0, 0.178, 27.9, 6.1, np.radians(67.0))), 4)
    15.923
    """
    both = positive(k_a_kms, "semi-amplitude", "28 km/s") + positive(k_b_kms, "semi-amplitude", "28 km/s")
    projected = projected_semi_major_axis_km(period_d, eccentricity, both)
    with np.errstate(divide="ignore"):
        return projected / np.sin(np.asarray(inclination_rad, dtype=np.float64)) / AU_KM


def semi_major_axis_au(period_d: ArrayLike, total_mass_msun: ArrayLike) -> FloatArray:
    """Semi-major axis from the period and the sum of the masses.

    Parameters
    ----------
    period_d : array_like
        Period, days, > 0.
    total_mass_msun : array_like
        M_A + M_B, solar masses, > 0; broadcast with the period.

    Returns
    -------
    ndarray
        a of the relative orbit, au.

    Raises
    ------
    InputRefused
        If a period or mass is not positive.

    Notes
    -----
    Accuracy: rounding only. a^3 = M P^2 in au, years and solar masses would be 2e-5 off in P: its year is
    the Gaussian one.

    Source: Kepler's third law, a^3 = G M P^2/(4 pi^2).

    Examples
    --------
    >>> round(float(semi_major_axis_au(12.9566659875 * 365.25, 24.4)), 8)
    16.0
    """
    seconds = positive(period_d, "period", "3127.5 d") * DAY_S
    gm = positive(total_mass_msun, "mass", "24 Msun") * GM_SUN_KM3_S2
    return np.cbrt(gm * (seconds / (2.0 * np.pi)) ** 2) / AU_KM


def orbital_period_d(semi_major_axis_au: ArrayLike, total_mass_msun: ArrayLike) -> FloatArray:
    """Period from the semi-major axis and the sum of the masses.

    Parameters
    ----------
    semi_major_axis_au : array_like
        a of the relative orbit, au, > 0.
    total_mass_msun : array_like
        M_A + M_B, solar masses, > 0; broadcast with the axis.

    Returns
    -------
    ndarray
        P, days.

    Raises
    ------
    InputRefused
        If an axis or mass is not positive.

    Notes
    -----
    Accuracy: rounding only.

    Source: Kepler's third law, P = 2 pi sqrt(a^3/(G M)).

    Examples
    --------
    >>> round(float(orbital_period_d(16.0, 24.4)) / 365.25, 8)
    12.95666599
    """
    a_km = positive(semi_major_axis_au, "semi-major axis", "16 au") * AU_KM
    gm = positive(total_mass_msun, "mass", "24 Msun") * GM_SUN_KM3_S2
    return 2.0 * np.pi * np.sqrt(a_km**3 / gm) / DAY_S


def total_mass_msun(period_d: ArrayLike, semi_major_axis_au: ArrayLike) -> FloatArray:
    """Sum of the masses from the period and the semi-major axis.

    Parameters
    ----------
    period_d : array_like
        Period, days, > 0.
    semi_major_axis_au : array_like
        a of the relative orbit, au, > 0; broadcast with the period.

    Returns
    -------
    ndarray
        M_A + M_B, solar masses.

    Raises
    ------
    InputRefused
        If a period or axis is not positive.

    Notes
    -----
    Accuracy: rounding only.

    Source: Kepler's third law, G M = 4 pi^2 a^3/P^2.

    Examples
    --------
    >>> round(float(total_mass_msun(12.9566659875 * 365.25, 16.0)), 8)
    24.4
    """
    seconds = positive(period_d, "period", "3127.5 d") * DAY_S
    a_km = positive(semi_major_axis_au, "semi-major axis", "16 au") * AU_KM
    return a_km**3 * (2.0 * np.pi / seconds) ** 2 / GM_SUN_KM3_S2
