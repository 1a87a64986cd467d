"""Whether a shocked wind cools before it leaves: the cooling parameter, and speeds on the way to the shock.

The parameter is an indicator of how the gas behaves on the average. It says nothing of clumps, of carbon-rich
gas that cools faster, or of mixing, and published dust makers have it above 1 at every phase.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from campaign.physics.constants import AU_KM
from campaign.physics.domain import positive

FloatArray = NDArray[np.float64]

# The units of the definition: 1000 km/s, 1e12 cm and 1e-7 solar masses a year.
UNIT_SPEED_KMS = 1000.0
UNIT_DISTANCE_AU = 1e7 / AU_KM
UNIT_MASS_LOSS = 1e-7

_STEPS = 80


def cooling_parameter(
    speed_kms: ArrayLike, distance_au: ArrayLike, mass_loss_msun_yr: ArrayLike
) -> FloatArray:
    """Cooling time over escape time of one shocked wind.

    Parameters
    ----------
    speed_kms : array_like
        Speed before the shock, km/s, >= 0.
    distance_au : array_like
        From this wind's star to the contact surface, au, >= 0.
    mass_loss_msun_yr : array_like
        Mass loss of this star, solar masses a year, > 0; all arguments broadcast.

    Returns
    -------
    ndarray
        chi (dimensionless): below 1 the gas cools on the way (radiative), above 1 it stays hot (adiabatic).

    Raises
    ------
    InputRefused
        If a mass loss is zero or negative.

    Notes
    -----
    Accuracy: rounding only; as a criterion a factor of a few. Cooling is that of gas of solar abundances.
    Some papers put the separation of the stars in place of the distance to the contact surface.

    Source: Stevens, Blondin & Pollock 1992, ApJ 386, 265 (definition from memory): chi = v_8^4 d_12/Mdot_-7.

    Examples
    --------
    >>> round(float(cooling_parameter(2500.0, 2.0, 3e-5)), 7)
    3.8957779
    """
    rate = positive(mass_loss_msun_yr, "mass loss", "3.1e-5 Msun/yr") / UNIT_MASS_LOSS
    speed = np.asarray(speed_kms, dtype=np.float64) / UNIT_SPEED_KMS
    square = speed * speed
    return square * square * (np.asarray(distance_au, dtype=np.float64) / UNIT_DISTANCE_AU) / rate


def beta_law_speed(
    distance_au: ArrayLike, terminal_speed_kms: ArrayLike, radius_au: ArrayLike, beta: ArrayLike
) -> FloatArray:
    """Speed of a wind that gathers way from the star's surface.

    Parameters
    ----------
    distance_au : array_like
        From the centre of the star, au.
    terminal_speed_kms : array_like
        Terminal speed, km/s.
    radius_au : array_like
        Radius from which the wind starts, au, > 0.
    beta : array_like
        Exponent (dimensionless), > 0; all arguments broadcast.

    Returns
    -------
    ndarray
        Speed, km/s; not a number inside the star.

    Raises
    ------
    InputRefused
        If a radius or an exponent is zero or negative.

    Notes
    -----
    Accuracy: rounding only. The light of the other star, which can brake the wind, is left out.

    Source: v = v_inf (1 - R/r)^beta, Castor, Abbott & Klein 1975, ApJ 195, 157, as generalised later.

    Examples
    --------
    >>> round(float(beta_law_speed(2.945, 2500.0, 0.5, 1.0)), 3)
    2075.552
    """
    radius = positive(radius_au, "radius", "4.2 Rsun")
    exponent = positive(beta, "exponent of the velocity law", "1")
    distance = np.asarray(distance_au, dtype=np.float64)
    with np.errstate(invalid="ignore", divide="ignore"):
        speed = np.asarray(terminal_speed_kms, dtype=np.float64) * (1.0 - radius / distance) ** exponent
    return np.where(distance >= radius, speed, np.nan)


def distance_of_unit_cooling(terminal_speed_kms: ArrayLike, mass_loss_msun_yr: ArrayLike) -> FloatArray:
    """Distance of the contact surface at which the cooling parameter is 1, at constant speed.

    Parameters
    ----------
    terminal_speed_kms : array_like
        Speed before the shock, km/s, > 0.
    mass_loss_msun_yr : array_like
        Mass loss, solar masses a year, > 0; broadcast with the speed.

    Returns
    -------
    ndarray
        Distance, au; nearer than it chi is below 1.

    Raises
    ------
    InputRefused
        If a speed or a mass loss is zero or negative.

    Notes
    -----
    Accuracy: rounding only.

    Source: ``cooling_parameter`` solved for the distance.

    Examples
    --------
    >>> d = distance_of_unit_cooling(2500.0, 3e-5)
    >>> round(float(d), 6), round(float(cooling_parameter(2500.0, d, 3e-5)), 12)
    (0.513376, 1.0)
    """
    speed = positive(terminal_speed_kms, "wind speed", "2500 km/s") / UNIT_SPEED_KMS
    rate = positive(mass_loss_msun_yr, "mass loss", "3.1e-5 Msun/yr") / UNIT_MASS_LOSS
    return UNIT_DISTANCE_AU * rate / speed**4


def distance_of_unit_cooling_beta(
    terminal_speed_kms: ArrayLike, mass_loss_msun_yr: ArrayLike, radius_au: ArrayLike, beta: ArrayLike
) -> FloatArray:
    """Distance of the contact surface at which the cooling parameter is 1, for a wind that gathers way.

    Parameters
    ----------
    terminal_speed_kms : array_like
        Terminal speed, km/s, > 0.
    mass_loss_msun_yr : array_like
        Mass loss, solar masses a year, > 0.
    radius_au : array_like
        Radius from which the wind starts, au, > 0.
    beta : array_like
        Exponent (dimensionless), > 0; all arguments broadcast.

    Returns
    -------
    ndarray
        Distance from the star, au: above the radius, and above that of constant speed.

    Raises
    ------
    InputRefused
        If an argument is zero or negative.

    Notes
    -----
    Accuracy: 1e-14 relative, by bisection; chi grows with distance, so there is one such distance.

    Source: ``cooling_parameter`` with ``beta_law_speed``.

    Examples
    --------
    >>> d = distance_of_unit_cooling_beta(2500.0, 3e-5, 0.1, 1.0)
    >>> round(float(cooling_parameter(beta_law_speed(d, 2500.0, 0.1, 1.0), d, 3e-5)), 12)
    1.0
    """
    constant = distance_of_unit_cooling(terminal_speed_kms, mass_loss_msun_yr)
    radius = positive(radius_au, "radius", "4.2 Rsun")
    power = 4.0 * positive(beta, "exponent of the velocity law", "1")
    constant, radius, power = np.broadcast_arrays(constant, radius, power)
    # (1 - R/d)^(4 beta) d = d_0; at d = d_0 + 4 beta R the left side has passed d_0 when 4 beta >= 1.
    low = np.maximum(constant, radius)
    high = constant + np.maximum(power, 1.0) * radius
    for _ in range(_STEPS):
        middle = 0.5 * (low + high)
        short = (1.0 - radius / middle) ** power * middle < constant
        low, high = np.where(short, middle, low), np.where(short, high, middle)
    return np.where(np.isnan(constant + radius + power), np.nan, 0.5 * (low + high))
