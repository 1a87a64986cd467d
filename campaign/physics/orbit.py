"""Where the stars are on the sky and along the line of sight, and how fast they move along it.

Axes: north, east, and away from the observer. Position angles run from north through east. The
ascending node is the one at which star B recedes from star A, and omega of B (``omega_b_rad``) belongs to
the orbit of B about A; omega of A is half a turn further. Positive velocities recede.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

from campaign.physics.constants import AU_KM, DAY_S, LIGHT_TIME_AU_S
from campaign.physics.domain import closed_orbit, positive
from campaign.physics.kepler import phase_from_true

FloatArray = NDArray[np.float64]


class ThieleInnes(NamedTuple):
    """Constants that turn (cos E - e, sqrt(1 - e^2) sin E) into north (A, F), east (B, G), away (C, H)."""

    A: FloatArray
    B: FloatArray
    F: FloatArray
    G: FloatArray
    C: FloatArray
    H: FloatArray


def sky_position(
    true_anomaly_rad: ArrayLike,
    separation: ArrayLike,
    omega_b_rad: ArrayLike,
    inclination_rad: ArrayLike,
    node_rad: ArrayLike,
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Position of star B relative to star A.

    Parameters
    ----------
    true_anomaly_rad : array_like
        True anomaly, rad.
    separation : array_like
        Distance between the stars, any unit of length or angle.
    omega_b_rad : array_like
        Argument of periastron of B, rad.
    inclination_rad : array_like
        Inclination, rad; position angle grows with time below pi/2.
    node_rad : array_like
        Position angle of the ascending node, rad; all arguments broadcast.

    Returns
    -------
    tuple of ndarray
        North, east and away from the observer, in the unit of ``separation``.

    Notes
    -----
    Accuracy: rounding only. Light time across the orbit (minutes) is left out.

    Source: rotation of the orbital plane by omega, i and Omega; Meeus, Astronomical Algorithms, ch. 57.

    Examples
    --------
    >>> import numpy as np
    >>> north, east, away = sky_position(0.0, 3.2, *np.radians([120.0, 60.0, 50.0]))
    >>> round(float(north), 10), round(float(east), 10), round(float(away), 10)
    (-2.0899224926, -0.3349984702, 2.4)
    """
    u = _array(true_anomaly_rad) + _array(omega_b_rad)
    node, tilt, distance = _array(node_rad), _array(inclination_rad), _array(separation)
    along = distance * np.cos(u)
    across = distance * np.sin(u)
    north = along * np.cos(node) - across * np.sin(node) * np.cos(tilt)
    east = along * np.sin(node) + across * np.cos(node) * np.cos(tilt)
    return north, east, across * np.sin(tilt)


def position_angle_and_separation(north: ArrayLike, east: ArrayLike) -> tuple[FloatArray, FloatArray]:
    """Position angle and projected separation of a position on the sky.

    Parameters
    ----------
    north, east : array_like
        Offsets in one unit of length or angle (small angles); they broadcast.

    Returns
    -------
    tuple of ndarray
        Position angle, rad, in [0, 2 pi), from north through east; projected separation in the unit given.

    Notes
    -----
    Accuracy: rounding only, in the tangent plane.

    Source: definition of position angle; Meeus, Astronomical Algorithms, ch. 57.

    Examples
    --------
    >>> import numpy as np
    >>> angle, separation = position_angle_and_separation(-2.08992249, -0.33499847)
    >>> round(float(np.degrees(angle)), 5), round(float(separation), 6)
    (189.10661, 2.116601)
    """
    angle = np.arctan2(_array(east), _array(north))
    angle = np.where(angle < 0.0, angle + 2.0 * np.pi, angle)
    # An angle a hair below north rounds to a whole turn, which is north.
    return np.where(angle >= 2.0 * np.pi, 0.0, angle), np.hypot(_array(north), _array(east))


def thiele_innes(
    semi_major_axis: ArrayLike, omega_b_rad: ArrayLike, inclination_rad: ArrayLike, node_rad: ArrayLike
) -> ThieleInnes:
    """Thiele-Innes constants of the orbit of B about A.

    Parameters
    ----------
    semi_major_axis : array_like
        a, any unit of length or angle.
    omega_b_rad, inclination_rad, node_rad : array_like
        Argument of periastron of B, inclination, position angle of the ascending node, rad; all broadcast.

    Returns
    -------
    ThieleInnes
        A, B, F, G, C, H in the unit of ``semi_major_axis``.

    Notes
    -----
    Accuracy: rounding only.

    Source: Thiele 1883 and Innes; as printed in Heintz, Double Stars (1978), for A, B, F, G; C and H are the
    line of sight, with away positive.

    Examples
    --------
    >>> import numpy as np
    >>> constants = thiele_innes(0.907, *np.radians([219.907, 59.025, 23.717]))
    >>> round(float(constants.A), 9), round(float(constants.H), 9)
    (-0.516533443, -0.596528482)
    """
    omega, tilt, node, a = map(_array, (omega_b_rad, inclination_rad, node_rad, semi_major_axis))
    cos_w, sin_w = np.cos(omega), np.sin(omega)
    cos_i, sin_i = np.cos(tilt), np.sin(tilt)
    cos_o, sin_o = np.cos(node), np.sin(node)
    return ThieleInnes(
        A=a * (cos_w * cos_o - sin_w * sin_o * cos_i),
        B=a * (cos_w * sin_o + sin_w * cos_o * cos_i),
        F=a * (-sin_w * cos_o - cos_w * sin_o * cos_i),
        G=a * (-sin_w * sin_o + cos_w * cos_o * cos_i),
        C=a * sin_w * sin_i,
        H=a * cos_w * sin_i,
    )


def radial_velocity(
    true_anomaly_rad: ArrayLike,
    eccentricity: ArrayLike,
    k_kms: ArrayLike,
    omega_of_star_rad: ArrayLike,
    gamma_kms: ArrayLike = 0.0,
) -> FloatArray:
    """Radial velocity of one star, or of B relative to A.

    Parameters
    ----------
    true_anomaly_rad : array_like
        True anomaly, rad.
    eccentricity : array_like
        e (dimensionless), 0 <= e < 1.
    k_kms : array_like
        Semi-amplitude of this star, km/s.
    omega_of_star_rad : array_like
        Argument of periastron of this star's own orbit, rad: that of A is half a turn from that of B.
    gamma_kms : array_like
        Velocity of the barycentre, km/s; all arguments broadcast.

    Returns
    -------
    ndarray
        Velocity, km/s, positive when receding.

    Raises
    ------
    InputRefused
        If e is outside [0, 1).

    Notes
    -----
    Accuracy: rounding only; gravitational redshift and the second-order Doppler effect are left out.

    Source: V = gamma + K [cos(nu + omega) + e cos omega].

    Examples
    --------
    >>> import numpy as np
    >>> round(float(radial_velocity(0.0, 0.8, 30.0, np.radians(120.0), -12.0)), 9)
    -39.0
    """
    omega = _array(omega_of_star_rad)
    shape = np.cos(_array(true_anomaly_rad) + omega) + closed_orbit(eccentricity) * np.cos(omega)
    return _array(gamma_kms) + _array(k_kms) * shape


def semi_amplitude(
    period_d: ArrayLike, eccentricity: ArrayLike, semi_major_axis_au: ArrayLike, inclination_rad: ArrayLike
) -> FloatArray:
    """Velocity semi-amplitude from the size of the orbit.

    Parameters
    ----------
    period_d : array_like
        Period, days, > 0.
    eccentricity : array_like
        e (dimensionless), 0 <= e < 1.
    semi_major_axis_au : array_like
        a, au: of one star about the barycentre for its own K, of the relative orbit for the sum of both.
    inclination_rad : array_like
        Inclination, rad; all arguments broadcast.

    Returns
    -------
    ndarray
        K, km/s.

    Raises
    ------
    InputRefused
        If the period is not positive or e is outside [0, 1).

    Notes
    -----
    Accuracy: rounding only.

    Source: K = 2 pi a sin i/(P sqrt(1 - e^2)).

    Examples
    --------
    >>> import numpy as np
    >>> round(float(semi_amplitude(4766.0, 0.178, 15.92296309, np.radians(67.0))), 5)
    34.0
    """
    e = closed_orbit(eccentricity)
    seconds = positive(period_d, "period", "3127.5 d") * DAY_S
    a_km = _array(semi_major_axis_au) * AU_KM
    return 2.0 * np.pi * a_km * np.sin(_array(inclination_rad)) / (seconds * np.sqrt((1.0 - e) * (1.0 + e)))


def conjunction_phases(eccentricity: ArrayLike, omega_b_rad: ArrayLike) -> tuple[FloatArray, FloatArray]:
    """Phases at which one star stands in front of the other.

    Parameters
    ----------
    eccentricity : array_like
        e (dimensionless), 0 <= e < 1.
    omega_b_rad : array_like
        Argument of periastron of B, rad; broadcast with the eccentricity.

    Returns
    -------
    tuple of ndarray
        Phase from periastron (dimensionless, in periods), in [0, 1): of A in front (B behind), and of B in
        front.

    Raises
    ------
    InputRefused
        If e is outside [0, 1).

    Notes
    -----
    Accuracy: a few units in the last place of the angle nu. Light time across the orbit is left out.

    Source: B is behind A where nu + omega_B = 90 deg and in front where it is 270 deg, since z = r sin(nu +
    omega_B) sin i points away; Kepler's equation.

    Examples
    --------
    >>> import numpy as np
    >>> a_front, b_front = conjunction_phases(0.8, np.radians(120.0))
    >>> round(float(a_front), 12), round(float(b_front), 12)
    (0.994209177536, 0.160129880564)
    """
    omega = _array(omega_b_rad)
    return _phase(0.5 * np.pi - omega, eccentricity), _phase(1.5 * np.pi - omega, eccentricity)


def node_phases(eccentricity: ArrayLike, omega_b_rad: ArrayLike) -> tuple[FloatArray, FloatArray]:
    """Phases at which the stars pass the nodes.

    Parameters
    ----------
    eccentricity : array_like
        e (dimensionless), 0 <= e < 1.
    omega_b_rad : array_like
        Argument of periastron of B, rad; broadcast with the eccentricity.

    Returns
    -------
    tuple of ndarray
        Phase from periastron (dimensionless, in periods), in [0, 1): of the ascending node, where B recedes
        from A fastest for its distance, and of the descending one.

    Raises
    ------
    InputRefused
        If e is outside [0, 1).

    Notes
    -----
    Accuracy: a few units in the last place of the angle nu.

    Source: nu + omega_B = 0 and 180 deg; Kepler's equation.

    Examples
    --------
    >>> import numpy as np
    >>> ascending, descending = node_phases(0.8, np.radians(120.0))
    >>> round(float(ascending), 12)
    0.943599112418
    """
    omega = _array(omega_b_rad)
    return _phase(-omega, eccentricity), _phase(np.pi - omega, eccentricity)


def light_time_delay_s(
    true_anomaly_rad: ArrayLike,
    eccentricity: ArrayLike,
    a_star_au: ArrayLike,
    inclination_rad: ArrayLike,
    omega_of_star_rad: ArrayLike,
) -> FloatArray:
    """Delay of what a star sends, from its place on its orbit about the barycentre of the pair.

    Parameters
    ----------
    true_anomaly_rad : array_like
        True anomaly, rad.
    eccentricity : array_like
        e (dimensionless), 0 <= e < 1.
    a_star_au : array_like
        Semi-major axis of this star's orbit about the barycentre, au.
    inclination_rad, omega_of_star_rad : array_like
        Inclination, and argument of periastron of this star, rad; all arguments broadcast.

    Returns
    -------
    ndarray
        Delay, s, positive when the star is farther than the barycentre.

    Raises
    ------
    InputRefused
        If e is outside [0, 1).

    Notes
    -----
    Accuracy: first order in v/c (1e-3 of the delay at 300 km/s).

    Source: z/c with z = a sin i (1 - e^2) sin(nu + omega)/(1 + e cos nu).

    Examples
    --------
    >>> import numpy as np
    >>> round(float(light_time_delay_s(0.0, 0.8, 5.0, np.radians(60.0), np.radians(120.0))), 6)
    374.253588
    """
    e, nu = closed_orbit(eccentricity), _array(true_anomaly_rad)
    radius = _array(a_star_au) * (1.0 - e) * (1.0 + e) / (1.0 + e * np.cos(nu))
    away_au = radius * np.sin(_array(inclination_rad)) * np.sin(nu + _array(omega_of_star_rad))
    return away_au * LIGHT_TIME_AU_S


def _array(value: ArrayLike) -> FloatArray:
    return np.asarray(value, dtype=np.float64)


def _phase(true_anomaly_rad: FloatArray, eccentricity: ArrayLike) -> FloatArray:
    phase = phase_from_true(true_anomaly_rad, eccentricity)
    phase = np.where(phase < 0.0, phase + 1.0, phase)
    return np.where(phase >= 1.0, 0.0, phase)
