"""How hard two winds push, and where on the line between the stars they balance."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from campaign.physics.domain import positive

FloatArray = NDArray[np.float64]


def wind_momentum(mass_loss_msun_yr: ArrayLike, wind_speed_kms: ArrayLike) -> FloatArray:
    """Momentum that a wind carries away in a year.

    Parameters
    ----------
    mass_loss_msun_yr : array_like
        Mass loss, solar masses a year, > 0.
    wind_speed_kms : array_like
        Terminal speed, km/s, > 0; broadcast with the mass loss.

    Returns
    -------
    ndarray
        Momentum rate, solar masses km/s a year.

    Raises
    ------
    InputRefused
        If a mass loss or a speed is zero or negative.

    Notes
    -----
    Accuracy: rounding only. The wind is taken as spherical and at its terminal speed.

    Source: definition.

    Examples
    --------
    >>> round(float(wind_momentum(3e-5, 2500.0)), 6)
    0.075
    """
    rate = positive(mass_loss_msun_yr, "mass loss", "3.1e-5 Msun/yr")
    return rate * positive(wind_speed_kms, "wind speed", "2500 km/s")


def momentum_ratio(momentum_of_weaker: ArrayLike, momentum_of_stronger: ArrayLike) -> FloatArray:
    """Ratio eta of two wind momenta.

    Parameters
    ----------
    momentum_of_weaker, momentum_of_stronger : array_like
        Momentum rates in one unit, > 0; they broadcast.

    Returns
    -------
    ndarray
        eta (dimensionless): at most 1 when the names are right, above 1 when the roles are swapped.

    Raises
    ------
    InputRefused
        If a momentum is zero or negative.

    Notes
    -----
    Accuracy: rounding only. Values above 1 are kept, so that draws near 1 pass it without a fold.

    Source: eta = (Mdot v)_weaker / (Mdot v)_stronger.

    Examples
    --------
    >>> eta = momentum_ratio(wind_momentum(2e-7, 2800.0), wind_momentum(3e-5, 2500.0))
    >>> round(float(eta), 8)
    0.00746667
    """
    weaker = positive(momentum_of_weaker, "wind momentum", "0.075 Msun km/s a year")
    return weaker / positive(momentum_of_stronger, "wind momentum", "0.075 Msun km/s a year")


def stagnation_fractions(eta: ArrayLike) -> tuple[FloatArray, FloatArray]:
    """Where the ram pressures balance on the line between the stars.

    Parameters
    ----------
    eta : array_like
        Momentum ratio (dimensionless), > 0; above 1 the star named weaker is the stronger.

    Returns
    -------
    tuple of ndarray
        Distances from the weaker and from the stronger star in units of the separation (dimensionless);
        they sum to 1.

    Raises
    ------
    InputRefused
        If a ratio is zero or negative.

    Notes
    -----
    Accuracy: rounding only, for spherical winds at terminal speed. The stars' radii and the braking of
    one wind by the light of the other star are left out.

    Source: rho v^2 equal on both sides: r_weaker/r_stronger = sqrt(eta); Stevens, Blondin & Pollock 1992,
    ApJ 386, 265.

    Examples
    --------
    >>> weaker, stronger = stagnation_fractions(0.01)
    >>> round(float(weaker), 6), round(float(stronger), 6)
    (0.090909, 0.909091)
    """
    root = np.sqrt(positive(eta, "momentum ratio", "0.03"))
    return root / (1.0 + root), 1.0 / (1.0 + root)


def momentum_ratio_from_stagnation(from_weaker: ArrayLike, from_stronger: ArrayLike) -> FloatArray:
    """Momentum ratio from where the contact surface crosses the line between the stars.

    Parameters
    ----------
    from_weaker, from_stronger : array_like
        Distances of the crossing from the two stars, any one unit of length, > 0; they broadcast.

    Returns
    -------
    ndarray
        eta (dimensionless).

    Raises
    ------
    InputRefused
        If a distance is zero or negative.

    Notes
    -----
    Accuracy: rounding only, under the limits of ``stagnation_fractions``.

    Source: inverse of ``stagnation_fractions``.

    Examples
    --------
    >>> round(float(momentum_ratio_from_stagnation(10.0, 25.0)), 6)
    0.16
    """
    near = positive(from_weaker, "distance", "10 Rsun")
    return (near / positive(from_stronger, "distance", "25 Rsun")) ** 2
