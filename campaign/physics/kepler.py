"""Kepler's equation and the angles, separations and phases that follow from it.

Every function takes arrays that broadcast together and works through them in pieces that stay in the
processor's cache. Anomalies are in radians; those returned lie in (-pi, pi], so that an instant before
periastron is negative. NaN in gives NaN out.
"""

from __future__ import annotations

import math
from collections.abc import Callable

import numpy as np
from numpy.typing import ArrayLike, NDArray

from campaign.physics.domain import closed_orbit, finite_angle

FloatArray = NDArray[np.float64]

_BLOCK = 4096
# 2 pi in three pieces. The first two have 33 bits, so their products with a count of turns below 2^20
# are exact; beyond that the reduction goes through sine and cosine.
_TURN = (
    float.fromhex("0x1.921fb54400000p+2"),
    float.fromhex("0x1.0b4611a600000p-32"),
    float.fromhex("0x1.3198a2e037073p-67"),
)
_MOST_TURNS_RAD = 6.0e6
# Taylor coefficients, highest first, of (E - sin E)/E^3 and (1 - cos E)/E^2 in E^2. On [0, pi] the first
# neglected term is below 1e-16 and 1e-13 of the sum; the second series only steers a correction.
_SINE_TERMS = tuple((-1.0) ** k / math.factorial(2 * k + 3) for k in range(13, -1, -1))
_COSINE_TERMS = tuple((-1.0) ** k / math.factorial(2 * k + 2) for k in range(12, -1, -1))


def eccentric_anomaly(mean_anomaly_rad: ArrayLike, eccentricity: ArrayLike) -> FloatArray:
    """Solve Kepler's equation M = E - e sin E.

    Parameters
    ----------
    mean_anomaly_rad : array_like
        Mean anomaly M, rad, any finite value; whole turns are removed first.
    eccentricity : array_like
        e (dimensionless), 0 <= e < 1; broadcast with ``mean_anomaly_rad``.

    Returns
    -------
    ndarray
        Eccentric anomaly E, rad, in (-pi, pi], of the broadcast shape; odd in M.

    Raises
    ------
    InputRefused
        If an eccentricity is outside [0, 1) or a mean anomaly is infinite.

    Notes
    -----
    Accuracy: a few units in the last place for the numbers as given, at every e < 1 and every M above the
    subnormal range (1e-290). The result's sensitivity to e itself is larger: e sin E/(E (1 - e cos E)),
    1e4 at e = 0.9999 near periastron.

    Source: Markley 1995, Celest. Mech. Dyn. Astron. 63, 101: cubic starter from a Pade approximant of the
    sine, then one correction of fifth order, no iteration. The residual is formed as
    (1 - e) E + e (E - sin E) - M, whose terms do not cancel near periastron.

    Examples
    --------
    >>> import numpy as np
    >>> round(float(np.degrees(eccentric_anomaly(np.radians(5.0), 0.1))), 6)
    5.554589
    """
    mean, e = finite_angle(mean_anomaly_rad, "mean anomaly"), closed_orbit(eccentricity)
    return _in_blocks(_solve, mean, e)


def true_anomaly(mean_anomaly_rad: ArrayLike, eccentricity: ArrayLike) -> FloatArray:
    """True anomaly from the mean anomaly.

    Parameters
    ----------
    mean_anomaly_rad : array_like
        Mean anomaly M, rad, any finite value.
    eccentricity : array_like
        e (dimensionless), 0 <= e < 1; broadcast with ``mean_anomaly_rad``.

    Returns
    -------
    ndarray
        True anomaly nu, rad, in (-pi, pi].

    Raises
    ------
    InputRefused
        If an eccentricity is outside [0, 1) or a mean anomaly is infinite.

    Notes
    -----
    Accuracy: a few units in the last place for the numbers as given.

    Source: Kepler's equation and tan(nu/2) = sqrt((1 + e)/(1 - e)) tan(E/2); Meeus, Astronomical
    Algorithms, ch. 30.

    Examples
    --------
    >>> import numpy as np
    >>> round(float(np.degrees(true_anomaly(np.radians(5.0), 0.1))), 6)
    6.139762
    """
    mean, e = finite_angle(mean_anomaly_rad, "mean anomaly"), closed_orbit(eccentricity)
    return _in_blocks(lambda m, x: _true(_solve(m, x), x), mean, e)


def true_from_eccentric(eccentric_anomaly_rad: ArrayLike, eccentricity: ArrayLike) -> FloatArray:
    """True anomaly from the eccentric anomaly.

    Parameters
    ----------
    eccentric_anomaly_rad : array_like
        Eccentric anomaly E, rad, any finite value.
    eccentricity : array_like
        e (dimensionless), 0 <= e < 1; broadcast with the anomaly.

    Returns
    -------
    ndarray
        True anomaly nu, rad, in (-pi, pi].

    Raises
    ------
    InputRefused
        If an eccentricity is outside [0, 1) or an anomaly is infinite.

    Notes
    -----
    Accuracy: a few units in the last place.

    Source: tan(nu/2) = sqrt((1 + e)/(1 - e)) tan(E/2).

    Examples
    --------
    >>> import numpy as np
    >>> round(float(np.degrees(true_from_eccentric(np.radians(21.7867892982618), 0.8))), 10)
    60.0
    """
    anomaly, e = finite_angle(eccentric_anomaly_rad, "eccentric anomaly"), closed_orbit(eccentricity)
    return _in_blocks(lambda E, x: _true(_within_half_turn(E), x), anomaly, e)


def eccentric_from_true(true_anomaly_rad: ArrayLike, eccentricity: ArrayLike) -> FloatArray:
    """Eccentric anomaly from the true anomaly.

    Parameters
    ----------
    true_anomaly_rad : array_like
        True anomaly nu, rad, any finite value.
    eccentricity : array_like
        e (dimensionless), 0 <= e < 1; broadcast with the anomaly.

    Returns
    -------
    ndarray
        Eccentric anomaly E, rad, in (-pi, pi].

    Raises
    ------
    InputRefused
        If an eccentricity is outside [0, 1) or an anomaly is infinite.

    Notes
    -----
    Accuracy: a few units in the last place.

    Source: tan(E/2) = sqrt((1 - e)/(1 + e)) tan(nu/2).

    Examples
    --------
    >>> import numpy as np
    >>> round(float(np.degrees(eccentric_from_true(np.radians(60.0), 0.8))), 10)
    21.7867892983
    """
    anomaly, e = finite_angle(true_anomaly_rad, "true anomaly"), closed_orbit(eccentricity)
    return _in_blocks(lambda nu, x: _eccentric(_within_half_turn(nu), x), anomaly, e)


def mean_from_eccentric(eccentric_anomaly_rad: ArrayLike, eccentricity: ArrayLike) -> FloatArray:
    """Mean anomaly from the eccentric anomaly: Kepler's equation read forwards.

    Parameters
    ----------
    eccentric_anomaly_rad : array_like
        Eccentric anomaly E, rad, any finite value.
    eccentricity : array_like
        e (dimensionless), 0 <= e < 1; broadcast with the anomaly.

    Returns
    -------
    ndarray
        Mean anomaly M, rad, in (-pi, pi].

    Raises
    ------
    InputRefused
        If an eccentricity is outside [0, 1) or an anomaly is infinite.

    Notes
    -----
    Accuracy: a few units in the last place, also near periastron at e close to 1, where E - e sin E
    written out would lose most of its digits.

    Source: M = E - e sin E = (1 - e) E + e (E - sin E).

    Examples
    --------
    >>> round(float(mean_from_eccentric(0.3, 0.8)), 12)
    0.063583834671
    """
    anomaly, e = finite_angle(eccentric_anomaly_rad, "eccentric anomaly"), closed_orbit(eccentricity)
    return _in_blocks(lambda E, x: _mean(_within_half_turn(E), x), anomaly, e)


def mean_from_true(true_anomaly_rad: ArrayLike, eccentricity: ArrayLike) -> FloatArray:
    """Mean anomaly from the true anomaly.

    Parameters
    ----------
    true_anomaly_rad : array_like
        True anomaly nu, rad, any finite value.
    eccentricity : array_like
        e (dimensionless), 0 <= e < 1; broadcast with the anomaly.

    Returns
    -------
    ndarray
        Mean anomaly M, rad, in (-pi, pi].

    Raises
    ------
    InputRefused
        If an eccentricity is outside [0, 1) or an anomaly is infinite.

    Notes
    -----
    Accuracy: a few units in the last place for the numbers as given; near apastron at high e the result
    is insensitive to nu.

    Source: tan(E/2) = sqrt((1 - e)/(1 + e)) tan(nu/2), then Kepler's equation.

    Examples
    --------
    >>> import numpy as np
    >>> round(float(np.degrees(mean_from_true(np.radians(60.0), 0.8))), 10)
    4.774354811
    """
    anomaly, e = finite_angle(true_anomaly_rad, "true anomaly"), closed_orbit(eccentricity)
    return _in_blocks(lambda nu, x: _mean(_eccentric(_within_half_turn(nu), x), x), anomaly, e)


def phase_from_true(true_anomaly_rad: ArrayLike, eccentricity: ArrayLike) -> FloatArray:
    """Phase from periastron at a true anomaly.

    Parameters
    ----------
    true_anomaly_rad : array_like
        True anomaly nu, rad, any finite value.
    eccentricity : array_like
        e (dimensionless), 0 <= e < 1; broadcast with the anomaly.

    Returns
    -------
    ndarray
        Phase (dimensionless, in periods), in (-0.5, 0.5]; negative before periastron.

    Raises
    ------
    InputRefused
        If an eccentricity is outside [0, 1) or an anomaly is infinite.

    Notes
    -----
    Accuracy: a few units in the last place for the numbers as given.

    Source: M/(2 pi), with M from nu through E.

    Examples
    --------
    >>> import numpy as np
    >>> round(float(phase_from_true(np.radians(-60.0), 0.8)), 12)
    -0.013262096697
    """
    return mean_from_true(true_anomaly_rad, eccentricity) / (2.0 * np.pi)


def separation_ratio(eccentric_anomaly_rad: ArrayLike, eccentricity: ArrayLike) -> FloatArray:
    """Separation of the stars in units of the semi-major axis.

    Parameters
    ----------
    eccentric_anomaly_rad : array_like
        Eccentric anomaly E, rad, any finite value.
    eccentricity : array_like
        e (dimensionless), 0 <= e < 1; broadcast with the anomaly.

    Returns
    -------
    ndarray
        r/a (dimensionless), in [1 - e, 1 + e].

    Raises
    ------
    InputRefused
        If an eccentricity is outside [0, 1) or an anomaly is infinite.

    Notes
    -----
    Accuracy: a few units in the last place, also near periastron at e close to 1.

    Source: r/a = 1 - e cos E = (1 - e) + 2 e sin^2(E/2).

    Examples
    --------
    >>> round(float(separation_ratio(1e-8, 0.9999)), 12)
    0.0001
    """
    anomaly, e = finite_angle(eccentric_anomaly_rad, "eccentric anomaly"), closed_orbit(eccentricity)

    def ratio(E: FloatArray, x: FloatArray) -> FloatArray:
        half_sine = np.sin(0.5 * E)
        return (1.0 - x) + 2.0 * x * half_sine * half_sine

    return _in_blocks(ratio, anomaly, e)


def half_window_phase(separation_over_a: ArrayLike, eccentricity: ArrayLike) -> FloatArray:
    """Phase after periastron at which the separation has grown to a given value.

    Parameters
    ----------
    separation_over_a : array_like
        Separation in units of the semi-major axis (dimensionless).
    eccentricity : array_like
        e (dimensionless), 0 <= e < 1; broadcast with the separation.

    Returns
    -------
    ndarray
        Phase (dimensionless, in periods), in [0, 0.5]: the separation is at most the given one between
        minus this phase and plus this phase. NaN where it never gets so small (below 1 - e), 0.5 where
        it always is (at or above 1 + e).

    Raises
    ------
    InputRefused
        If an eccentricity is outside [0, 1).

    Notes
    -----
    Accuracy: a few units in the last place for the numbers as given; close to r/a = 1 - e the phase goes
    as the square root of what is left, so errors of the inputs are magnified there.

    Source: 1 - e cos E = r/a solved as tan^2(E/2) = (r/a - (1 - e))/((1 + e) - r/a), then Kepler's equation.

    Examples
    --------
    >>> round(float(half_window_phase(0.4, 0.8)), 9)
    0.030809848
    """
    ratio, e = np.asarray(separation_over_a, dtype=np.float64), closed_orbit(eccentricity)

    def phase(q: FloatArray, x: FloatArray) -> FloatArray:
        above = q - (1.0 - x)
        below = (1.0 + x) - q
        with np.errstate(invalid="ignore", divide="ignore"):
            found = _mean(2.0 * np.arctan(np.sqrt(above / below)), x) / (2.0 * np.pi)
        return np.where(below <= 0.0, 0.5, np.where(above < 0.0, np.nan, found))

    return _in_blocks(phase, ratio, e)


def _in_blocks(
    kernel: Callable[[FloatArray, FloatArray], FloatArray], x: FloatArray, e: FloatArray
) -> FloatArray:
    iterator = np.nditer(
        [x, e, None],
        flags=["external_loop", "buffered", "zerosize_ok"],
        op_flags=[["readonly"], ["readonly"], ["writeonly", "allocate"]],
        op_dtypes=[np.float64, np.float64, np.float64],
        buffersize=_BLOCK,
    )
    with iterator:
        for part, part_e, out in iterator:
            out[...] = kernel(part, part_e)
        result: FloatArray = iterator.operands[2]
    return result[()]


def _within_half_turn(angle: FloatArray) -> FloatArray:
    size = np.abs(angle)
    if not bool((size > np.pi).any()):
        return angle
    turns = np.rint(angle * (0.5 / np.pi))
    reduced = ((angle - turns * _TURN[0]) - turns * _TURN[1]) - turns * _TURN[2]
    reduced = np.where(reduced > np.pi, ((reduced - _TURN[0]) - _TURN[1]) - _TURN[2], reduced)
    reduced = np.where(reduced < -np.pi, ((reduced + _TURN[0]) + _TURN[1]) + _TURN[2], reduced)
    huge = size > _MOST_TURNS_RAD
    if bool(huge.any()):
        reduced[huge] = np.arctan2(np.sin(angle[huge]), np.cos(angle[huge]))
    return reduced


def _horner(x: FloatArray, coefficients: tuple[float, ...]) -> FloatArray:
    total = x * coefficients[0]
    total += coefficients[1]
    for coefficient in coefficients[2:]:
        total *= x
        total += coefficient
    return total


def _mean(E: FloatArray, e: FloatArray) -> FloatArray:
    square = E * E
    sine_deficit = _horner(square, _SINE_TERMS)
    sine_deficit *= square
    sine_deficit *= E
    return (1.0 - e) * E + e * sine_deficit


def _true(E: FloatArray, e: FloatArray) -> FloatArray:
    half: FloatArray = np.arctan(np.sqrt((1.0 + e) / (1.0 - e)) * np.tan(0.5 * E))
    return 2.0 * half


def _eccentric(nu: FloatArray, e: FloatArray) -> FloatArray:
    half: FloatArray = np.arctan(np.sqrt((1.0 - e) / (1.0 + e)) * np.tan(0.5 * nu))
    return 2.0 * half


def _solve(mean: FloatArray, e: FloatArray) -> FloatArray:
    reduced = _within_half_turn(mean)
    m = np.abs(reduced)
    rest = 1.0 - e
    E = _starter(m, e, rest)
    square = E * E
    sine_deficit = _horner(square, _SINE_TERMS)
    sine_deficit *= square
    sine_deficit *= E
    f0 = rest * E + e * sine_deficit - m
    f1 = _horner(square, _COSINE_TERMS)
    f1 *= square
    f1 *= e
    f1 += rest
    f2 = 0.5 * e * (E - sine_deficit)
    f3 = (1.0 - f1) / 6.0
    np.negative(f0, out=f0)
    step = f0 / (f1 + f0 * f2 / f1)
    step = f0 / (f1 + step * (f2 + step * f3))
    step = f0 / (f1 + step * (f2 + step * (f3 - step * f2 / 12.0)))
    E += step
    np.minimum(E, np.pi, out=E)
    return np.copysign(E, reduced)


def _starter(m: FloatArray, e: FloatArray, rest: FloatArray) -> FloatArray:
    """Markley's cubic: E to 3e-4 of itself for 0 <= M <= pi."""
    alpha = (3.0 * np.pi**2 + 1.6 * np.pi * (np.pi - m) / (1.0 + e)) / (np.pi**2 - 6.0)
    d = 3.0 * rest + alpha * e
    square = m * m
    alpha *= d
    r = (3.0 * alpha * (d - rest) + square) * m
    q = 2.0 * alpha * rest - square
    w = np.cbrt(r + np.sqrt(q * q * q + r * r))
    w *= w
    return (2.0 * r * w / (w * w + w * q + q * q) + m) / d
