"""What a seen radius says of the way travelled: limb, ring or plume, and light across a shell."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

from campaign.errors import InputRefused
from campaign.physics.constants import JULIAN_YEAR_D, LIGHT_TIME_AU_D, SPEED_OF_LIGHT_KMS
from campaign.physics.shellvalues import Sided

FloatArray = NDArray[np.float64]

# Light travel matters when it moves an age by more than this share of its error.
MATTERS_SIGMA = 0.3
_LEAST_FACTOR = 1e-3


class Projection(NamedTuple):
    """Seen radius over true radius, between its least and largest value, and the assumption in words.

    ``out_of_sky_deg`` is the angle of the feature out of the plane of the sky, positive towards the
    observer, and NaN where it is not known. ``factor_sigma`` comes from the inclination (or from the
    unknown direction) alone.
    """

    factor: float
    factor_sigma: float
    least: float
    largest: float
    out_of_sky_deg: float
    statement: str


def project_limb() -> Projection:
    """Projection of the limb of a shell that is complete enough to have one.

    Parameters
    ----------
    None
        The limb has the true radius from everywhere (dimensionless factor 1).

    Returns
    -------
    Projection
        Factor 1 (dimensionless).

    Notes
    -----
    Accuracy: (v/c)^2/2, below 1e-4 for winds.

    Source: tangent ray of a sphere.

    Examples
    --------
    >>> project_limb().factor
    1.0
    """
    return Projection(
        1.0, 0.0, 1.0, 1.0, 0.0,
        "radii are those of the limb: the true ones, whatever the inclination",
    )  # fmt: skip


def project_ring(inclination_deg: Sided, from_node_deg: float | None = None) -> Projection:
    """Projection of a ring of dust in the plane of the orbit, at one position angle or along its long axis.

    Parameters
    ----------
    inclination_deg : Sided
        Inclination of the orbit to the sky, deg, 0 to 180; its error may be unknown.
    from_node_deg : float, optional
        Position angle of the measured place minus that of the node, deg; without it the radius is that of the
        long axis, which is the true one.

    Returns
    -------
    Projection
        Factor (dimensionless). Which side of the sky is nearer is not told by a position angle alone:
        ``out_of_sky_deg`` is given without sign, as if towards the observer.

    Raises
    ------
    InputRefused
        For an inclination outside 0 to 180 deg, or a ring seen edge-on away from its node.

    Notes
    -----
    Accuracy: exact factor; its error of first order in that of the inclination.

    Source: ellipse of a tilted circle, 1/factor^2 = cos^2 p + sin^2 p/cos^2 i at angle p from the node.

    Examples
    --------
    >>> round(project_ring(Sided(60.0, 2.0, 2.0), 90.0).factor, 6)
    0.5
    """
    tilt = _inclination_rad(inclination_deg)
    if from_node_deg is None:
        return Projection(
            1.0, 0.0, 1.0, 1.0, 0.0,
            "radii are those along the long axis of a ring in the plane of the orbit: the true ones",
        )  # fmt: skip
    angle = np.radians(from_node_deg)
    cosine = abs(np.cos(tilt))
    shape = np.hypot(cosine * np.cos(angle), np.sin(angle))
    factor = float(cosine / shape) if shape > 0.0 else 1.0
    if factor < _LEAST_FACTOR:
        raise InputRefused(
            "A ring seen edge-on has no radius away from its node.",
            why=f"At {from_node_deg:g} deg from the node it is seen at {factor:.1e} of its true radius.",
            hint="Use radii near the node, or another inclination.",
            code="projection-refused",
        )
    # d ln(factor)/d ln(cos i) = sin^2 p/shape^2.
    slope = factor * (np.sin(angle) / shape) ** 2 * abs(np.tan(tilt))
    sigma = float(slope * np.radians(inclination_deg.sigma))
    # Where the direction points out of the sky: the true way is 1, its projection the factor.
    out = float(np.degrees(np.arccos(min(factor, 1.0))))
    return Projection(
        factor, sigma, factor, factor, out,
        f"radii are those of a ring in the plane of the orbit, inclined by {inclination_deg.value:g} deg, "
        f"{from_node_deg:g} deg from its node: {factor:.3f} of the true ones",
    )  # fmt: skip


def project_plume(inclination_deg: Sided, from_node_in_orbit_deg: float | None = None) -> Projection:
    """Projection of a plume that left in one direction in the plane of the orbit.

    Parameters
    ----------
    inclination_deg : Sided
        Inclination of the orbit to the sky, deg, 0 to 180.
    from_node_in_orbit_deg : float, optional
        Direction of the plume in the plane of the orbit, deg from the node at which things recede, in the
        sense of the motion. Without it any direction is as probable.

    Returns
    -------
    Projection
        Factor (dimensionless): that of the direction, or the mean over all of them with its spread.

    Raises
    ------
    InputRefused
        For an inclination outside 0 to 180 deg, or a plume that points at the observer.

    Notes
    -----
    Accuracy: exact factor; its error of first order in that of the inclination.

    Source: sin(out of sky) = -sin i sin u for z away from the observer.

    Examples
    --------
    >>> plume = project_plume(Sided(90.0, 0.0, 0.0), -30.0)
    >>> round(plume.factor, 6), round(plume.out_of_sky_deg, 6)
    (0.866025, 30.0)
    """
    tilt = _inclination_rad(inclination_deg)
    if from_node_in_orbit_deg is None:
        around = np.radians(np.arange(0.25, 360.0, 0.5))
        factors = np.sqrt(1.0 - (np.sin(tilt) * np.sin(around)) ** 2)
        mean, least = float(factors.mean()), float(abs(np.cos(tilt)))
        return Projection(
            mean, float(factors.std()), least, 1.0, float("nan"),
            "radii are those of a plume of unknown direction in the plane of the orbit, inclined by "
            f"{inclination_deg.value:g} deg: {least:.2f} to 1 of the true ones, {mean:.2f} on average",
        )  # fmt: skip
    around = np.radians(from_node_in_orbit_deg)
    height = -np.sin(tilt) * np.sin(around)
    factor = float(np.sqrt(max(1.0 - height**2, 0.0)))
    if factor < _LEAST_FACTOR:
        raise InputRefused(
            "A plume that points at the observer has no radius on the sky.",
            why=f"It is seen at {factor:.1e} of its true length.",
            hint="Give another direction or inclination.",
            code="projection-refused",
        )
    slope = abs(height * np.cos(tilt) * np.sin(around)) / factor
    return Projection(
        factor,
        float(slope * np.radians(inclination_deg.sigma)),
        factor,
        factor,
        float(np.degrees(np.arcsin(height))),
        f"radii are those of a plume {from_node_in_orbit_deg:g} deg from the node of an orbit inclined by "
        f"{inclination_deg.value:g} deg: {factor:.3f} of the true ones",
    )


def apparent_speed_kms(speed_kms: ArrayLike, out_of_sky_deg: ArrayLike) -> FloatArray:
    """Speed at which a feature seems to move across the sky.

    Parameters
    ----------
    speed_kms : array_like
        True speed, km/s, below that of light.
    out_of_sky_deg : array_like
        Angle of its way out of the plane of the sky, deg, positive towards the observer.

    Returns
    -------
    ndarray
        km/s. The limb of a complete shell shows the true speed; use an angle of 0.

    Raises
    ------
    InputRefused
        If a speed reaches that of light.

    Notes
    -----
    Accuracy: exact for even motion.

    Source: v cos(psi)/(1 - (v/c) sin(psi)) (Rees 1966, Nature 211, 468; memory).

    Examples
    --------
    >>> round(float(apparent_speed_kms(1800.0, 30.0)), 6)
    1563.539593
    """
    speed, psi = (
        np.asarray(speed_kms, dtype=np.float64),
        np.radians(np.asarray(out_of_sky_deg, dtype=np.float64)),
    )
    if bool((np.abs(speed) >= SPEED_OF_LIGHT_KMS).any()):
        raise InputRefused(
            "A speed is not below that of light.",
            why=f"Light moves at {SPEED_OF_LIGHT_KMS} km/s, dust far slower.",
            hint="Give a speed such as 1800 km/s; check the unit.",
            code="speed-above-light",
        )
    seen: FloatArray = speed * np.cos(psi) / (1.0 - speed / SPEED_OF_LIGHT_KMS * np.sin(psi))
    return seen


def light_delay_yr(radius_au: ArrayLike, out_of_sky_deg: ArrayLike) -> FloatArray:
    """How much later light from the stars' distance left than light from a feature, seen together.

    Parameters
    ----------
    radius_au : array_like
        True distance of the feature from the stars, au.
    out_of_sky_deg : array_like
        Its angle out of the plane of the sky, deg, positive towards the observer.

    Returns
    -------
    ndarray
        yr; positive for a feature nearer than the stars, which is seen at a later, older stage: its age
        at the instant of the image, counted at the stars, is smaller by this than it looks.

    Notes
    -----
    Accuracy: exact.

    Source: 1 au/c = 499.004784 s (IAU 2012 Resolution B2).

    Examples
    --------
    >>> round(float(light_delay_yr(63241.077, 90.0)), 6)
    1.0
    """
    depth = np.asarray(radius_au, dtype=np.float64) * np.sin(np.radians(out_of_sky_deg))
    delay: FloatArray = depth * (LIGHT_TIME_AU_D / JULIAN_YEAR_D)
    return delay


def light_time_matters(delay_yr: ArrayLike, age_sigma_yr: ArrayLike) -> NDArray[np.bool_]:
    """Whether light on its way across a shell changes an age by more than 0.3 of its error.

    Parameters
    ----------
    delay_yr, age_sigma_yr : array_like
        Delay, or the largest that may be (radius over c), and error of the age, yr.

    Returns
    -------
    ndarray of bool
        Dimensionless; False where the error is unknown.

    Notes
    -----
    Accuracy: exact.

    Source: project convention (0.3 sigma).

    Examples
    --------
    >>> light_time_matters([0.1, 0.5], 1.0).tolist()
    [False, True]
    """
    delay, sigma = np.asarray(delay_yr, dtype=np.float64), np.asarray(age_sigma_yr, dtype=np.float64)
    return np.asarray(np.abs(delay) > MATTERS_SIGMA * sigma)


def _inclination_rad(inclination_deg: Sided) -> float:
    if not 0.0 <= inclination_deg.value <= 180.0:
        raise InputRefused(
            f"An inclination of {inclination_deg.value:g} deg cannot be.",
            why="It runs from 0 (face-on) over 90 (edge-on) to 180 deg (face-on, the other sense).",
            hint="Give an inclination such as 67±3 deg.",
            code="inclination-refused",
        )
    return float(np.radians(inclination_deg.value))
