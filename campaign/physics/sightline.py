"""What the observer looks through: the line of sight against the cone of the wind collision.

The axis of the cone runs from the star with the stronger wind through the other and beyond. The observer is
at minus z of ``campaign.physics.orbit``. A line of sight to either star ends up inside the weaker wind when
its angle to the axis is below the half-opening angle of the contact surface.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from campaign.physics.constants import AU_KM, DAY_S
from campaign.physics.domain import closed_orbit, positive

FloatArray = NDArray[np.float64]


def angle_to_axis_rad(
    true_anomaly_rad: ArrayLike, omega_weaker_rad: ArrayLike, inclination_rad: ArrayLike
) -> FloatArray:
    """Angle between the axis of the cone and the direction to the observer.

    Parameters
    ----------
    true_anomaly_rad : array_like
        True anomaly, rad.
    omega_weaker_rad : array_like
        Argument of periastron of the star with the weaker wind, rad: that of star B is used as it is if B has
        the weaker wind, half a turn is added if A has.
    inclination_rad : array_like
        Inclination, rad; all arguments broadcast.

    Returns
    -------
    ndarray
        Angle, rad, in [0, pi]: 90 degrees minus i at the conjunction with the weaker wind in front,
        90 degrees plus i at the other.

    Notes
    -----
    Accuracy: 1e-8 rad (an arc cosine near 0 and pi). The cone is taken as straight: its turn by the orbital
    motion is left out, see ``skew_rad``.

    Source: conventions of ``campaign.physics.orbit``: cos = -sin(nu + omega) sin i.

    Examples
    --------
    >>> round(float(np.degrees(angle_to_axis_rad(0.0, np.radians(270.0), np.radians(60.0)))), 6)
    30.0
    """
    phase_angle = np.asarray(true_anomaly_rad, dtype=np.float64) + np.asarray(omega_weaker_rad)
    cosine = -np.sin(phase_angle) * np.sin(np.asarray(inclination_rad, dtype=np.float64))
    return np.asarray(np.arccos(np.clip(cosine, -1.0, 1.0)))


def half_passage_rad(opening_rad: ArrayLike, inclination_rad: ArrayLike) -> FloatArray:
    """True anomaly on either side of the conjunction at which the line of sight crosses a cone.

    Parameters
    ----------
    opening_rad : array_like
        Half-opening angle of the cone, rad, in [0, pi].
    inclination_rad : array_like
        Inclination, rad; the arguments broadcast.

    Returns
    -------
    ndarray
        Angle, rad, in [0, pi]: the line of sight is inside the cone within this angle of the conjunction with
        the weaker wind in front. Not a number where it never enters, pi where it never leaves.

    Notes
    -----
    Accuracy: rounding only, of a straight cone.

    Source: ``angle_to_axis_rad`` solved for the true anomaly: cos x = cos t/sin i.

    Examples
    --------
    >>> round(float(np.degrees(half_passage_rad(np.radians(60.0), np.radians(60.0)))), 6)
    54.73561
    """
    sine = np.sin(np.asarray(inclination_rad, dtype=np.float64))
    cosine = np.cos(np.asarray(opening_rad, dtype=np.float64))
    cosine, sine = np.broadcast_arrays(cosine, sine)
    with np.errstate(invalid="ignore", divide="ignore"):
        ratio = cosine / sine
        inside = np.arccos(ratio)
    return np.where(
        cosine >= sine, np.where(cosine > sine, np.nan, 0.0), np.where(ratio <= -1.0, np.pi, inside)
    )


def skew_rad(
    period_d: ArrayLike,
    eccentricity: ArrayLike,
    semi_major_axis_au: ArrayLike,
    true_anomaly_rad: ArrayLike,
    wind_speed_kms: ArrayLike,
) -> FloatArray:
    """By how much the orbital motion turns the cone near its apex.

    Parameters
    ----------
    period_d : array_like
        Period, days, > 0.
    eccentricity : array_like
        e (dimensionless), 0 <= e < 1.
    semi_major_axis_au : array_like
        Semi-major axis of the relative orbit, au, > 0.
    true_anomaly_rad : array_like
        True anomaly, rad.
    wind_speed_kms : array_like
        Speed of the slower wind, km/s, > 0; all arguments broadcast.

    Returns
    -------
    ndarray
        Angle, rad, between the line of the stars and the axis of the cone near its apex.

    Raises
    ------
    InputRefused
        If e is outside [0, 1), or another argument is zero or negative.

    Notes
    -----
    Accuracy: a first estimate. Farther out the cone winds up into a spiral, one turn a period.

    Source: aberration, tan(skew) = v_orb/v_wind, with the velocity across the line of the stars,
    v_orb = 2 pi a (1 + e cos nu)/(P sqrt(1 - e^2)).

    Examples
    --------
    >>> round(float(np.degrees(skew_rad(3689.0, 0.8, 16.0, 0.0, 2500.0))), 3)
    3.241
    """
    e = closed_orbit(eccentricity)
    a_km = AU_KM * positive(semi_major_axis_au, "semi-major axis", "16 au")
    period_s = DAY_S * positive(period_d, "period", "3127.5 d")
    across = 2.0 * np.pi * a_km * (1.0 + e * np.cos(true_anomaly_rad)) / (period_s * np.sqrt(1.0 - e * e))
    return np.arctan(across / positive(wind_speed_kms, "wind speed", "2500 km/s"))
