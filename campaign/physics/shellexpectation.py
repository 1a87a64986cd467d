"""Where shells will be: radius at a date, how many are in view, when the newest can be resolved."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from campaign.errors import InputRefused
from campaign.physics.draws import stratified_normals
from campaign.physics.intervals import normal_quantiles
from campaign.physics.shellmotion import MOTION, RADIUS, SPACING, MotionFit
from campaign.physics.shellvalues import Spread, Spreads, Uncertain, spreads_of_draws

FloatArray = NDArray[np.float64]
BoolArray = NDArray[np.bool_]


@dataclass(frozen=True, slots=True, eq=False)
class ExpectedRadii:
    """One entry a shell: age in years, radius in arcsec, probability that it is launched by then.

    A shell that is probably not launched yet has a negative age and radius 0.
    """

    age_yr: FloatArray
    radius_arcsec: Spreads
    launched_probability: FloatArray


@dataclass(frozen=True, slots=True, eq=False)
class ShellsInView:
    """Which shells stand between the inner and the outer limit; bounds in arcsec, NaN where there is none.

    ``separable`` says whether neighbouring shells are farther apart than the resolution, None without one.
    """

    in_view: BoolArray
    probability: FloatArray
    beyond_outer: int
    within_inner: int
    inner_arcsec: float
    outer_arcsec: float
    separable: bool | None


def expected_radii(
    launch_yr: ArrayLike,
    launch_sigma_yr: ArrayLike,
    at_yr: float,
    motion_mas_yr: Uncertain,
    correlation: float = 0.0,
    seed: int = 1,
) -> ExpectedRadii:
    """Radii of shells at a date, from their launches and one motion.

    Parameters
    ----------
    launch_yr, launch_sigma_yr : array_like, shape (n,)
        Launch dates and errors, yr on any axis; NaN where an error is unknown.
    at_yr : float
        The date, yr on that axis.
    motion_mas_yr : Uncertain
        Proper motion with its draws, mas/yr.
    correlation : float
        Between launch and motion (dimensionless): near +1 where both come from old shells of one image.
    seed : int
        Of the draws of the launches (dimensionless).

    Returns
    -------
    ExpectedRadii
        Radii in arcsec. ``sigma`` is of first order; bounds come from draws and are never below 0.

    Raises
    ------
    InputRefused
        If the correlation is outside -1 to 1.

    Notes
    -----
    Accuracy: bounds to 1 % of sigma at 20,000 draws.

    Source: kinematics, r = mu (t - t_launch).

    Examples
    --------
    >>> from campaign.physics.shellvalues import Sided, draw_sided
    >>> motion = draw_sided("motion", Sided(80.0, 4.0, 4.0), 2000)
    >>> found = expected_radii([2020.0], [0.1], 2030.0, motion)
    >>> round(float(found.radius_arcsec.value[0]), 6), round(float(found.radius_arcsec.sigma[0]), 4)
    (0.8, 0.0408)
    """
    if not -1.0 <= correlation <= 1.0:
        raise InputRefused(
            f"A correlation of {correlation:g} between launch and motion cannot be.",
            why="It lies between -1 and 1.",
            hint="Give a correlation such as 0.5, or none.",
            code="correlation-refused",
        )
    launch = np.atleast_1d(np.asarray(launch_yr, dtype=np.float64))
    sigma = np.broadcast_to(np.asarray(launch_sigma_yr, dtype=np.float64), launch.shape)
    age = at_yr - launch
    motion, motion_sigma = motion_mas_yr.value / 1000.0, motion_mas_yr.sigma / 1000.0
    variance = (age * motion_sigma) ** 2 + (motion * sigma) ** 2
    variance = variance - 2.0 * correlation * age * motion_sigma * motion * sigma
    normals = stratified_normals(["shell launch"], motion_mas_yr.draws.size, seed)["shell launch"]
    if correlation != 0.0:
        # The motion's own deviate, by its rank, so that any distribution of it may be given.
        from scipy.special import ndtri

        rank = (np.argsort(np.argsort(motion_mas_yr.draws)) + 0.5) / motion_mas_yr.draws.size
        normals = correlation * ndtri(rank) + np.sqrt(1.0 - correlation**2) * normals
    ages = age[:, None] - sigma[:, None] * normals
    draws = np.maximum(ages, 0.0) * motion_mas_yr.draws / 1000.0
    radius = spreads_of_draws(np.maximum(age, 0.0) * motion, np.sqrt(np.maximum(variance, 0.0)), draws)
    return ExpectedRadii(age, radius, _share_below(-age, sigma))


def radii_from_fit(motion: MotionFit, cycle: ArrayLike, at_yr: float) -> Spreads:
    """Radii of shells at a date from a fit of images, with its full covariance.

    Parameters
    ----------
    motion : MotionFit
        With equal spacing, arcsec and yr.
    cycle : array_like of int, shape (n,)
        Cycles (dimensionless), also of shells not seen or not yet launched.
    at_yr : float
        The date, yr on the axis of the fit.

    Returns
    -------
    Spreads
        Radii, arcsec; negative before the launch.

    Raises
    ------
    InputRefused
        If the fit has no spacing.

    Notes
    -----
    Accuracy: exact, as the radius is linear in what was fitted.

    Source: Aitken 1935 (generalised least squares).

    Examples
    --------
    >>> from campaign.physics.shellmotion import fit_motion_and_period
    >>> from campaign.physics.shellradii import radius_errors
    >>> errors = radius_errors([0.01, 0.01, 0.01])
    >>> fit = fit_motion_and_period([2010.0, 2020.0, 2020.0], [4, 4, 5], [0.5, 1.0, 0.4], errors)
    >>> radii_from_fit(fit, [4, 5, 6], 2030.0).value.round(6).tolist()
    [1.5, 0.9, 0.3]
    """
    if motion.youngest is None:
        raise InputRefused(
            "A fit of single shells does not place other shells.",
            why="Only equal spacing says where shells are that were not seen.",
            hint="Fit all shells with one motion and one period.",
            code="spacing-missing",
        )
    names = motion.fit.names
    rows = np.zeros((np.atleast_1d(np.asarray(cycle)).size, len(names)))
    rows[:, names.index(RADIUS)] = 1.0
    rows[:, names.index(SPACING)] = motion.youngest - np.atleast_1d(np.asarray(cycle, dtype=np.float64))
    rows[:, names.index(MOTION)] = at_yr - motion.pivot_yr
    radius, covariance = motion.fit.combination(rows)
    sigma = np.sqrt(np.maximum(np.diag(covariance), 0.0))
    return Spreads(radius, sigma, *normal_quantiles(radius, sigma).T[1:])


def shells_in_view(
    radius_arcsec: ArrayLike,
    sigma_arcsec: ArrayLike,
    field_arcsec: float | None = None,
    resolution_arcsec: float | None = None,
    inner_working_angle_arcsec: float | None = None,
    outer_radius_arcsec: float | None = None,
    spacing_arcsec: float | None = None,
) -> ShellsInView:
    """How many shells an instrument can show: inside the field, outside what it cannot resolve.

    Parameters
    ----------
    radius_arcsec, sigma_arcsec : array_like, shape (n,)
        Radii and errors, arcsec; NaN where an error is unknown.
    field_arcsec : float, optional
        Full width of the field, arcsec, centred on the stars.
    resolution_arcsec, inner_working_angle_arcsec : float, optional
        Radii, arcsec, inside which nothing is told from the stars; the larger counts.
    outer_radius_arcsec : float, optional
        Largest radius, arcsec, at which shells are still bright enough.
    spacing_arcsec : float, optional
        Distance between shells, arcsec, for whether they are told apart.

    Returns
    -------
    ShellsInView
        Counts and probabilities (dimensionless), bounds in arcsec.

    Raises
    ------
    InputRefused
        If a limit is not positive, or nothing lies between them.

    Notes
    -----
    Accuracy: exact for normal errors. A shell counts as in view by its expected radius.

    Source: common practice, no source.

    Examples
    --------
    >>> view = shells_in_view([0.05, 0.8, 1.6, 20.0], [0.01] * 4, field_arcsec=28.0, resolution_arcsec=0.1)
    >>> int(view.in_view.sum()), view.beyond_outer, view.within_inner
    (2, 1, 1)
    """
    given = (field_arcsec, resolution_arcsec, inner_working_angle_arcsec, outer_radius_arcsec)
    if any(limit is not None and not limit > 0.0 for limit in given):
        raise InputRefused(
            "A field, resolution, inner working angle or outer radius is not above zero.",
            why="They bound the radii at which a shell can be seen.",
            hint="Give a field such as 28 arcsec and a resolution such as 0.1 arcsec.",
            code="view-refused",
        )
    inner = max((x for x in (resolution_arcsec, inner_working_angle_arcsec) if x is not None), default=0.0)
    halves = None if field_arcsec is None else 0.5 * field_arcsec
    outer = min((x for x in (halves, outer_radius_arcsec) if x is not None), default=float("inf"))
    if inner >= outer:
        raise InputRefused(
            f"Nothing lies between the inner limit of {inner:g} and the outer of {outer:g} arcsec.",
            why="The field is no larger than what cannot be resolved.",
            hint="The field is a full width; check both units.",
            code="view-refused",
        )
    radius = np.atleast_1d(np.asarray(radius_arcsec, dtype=np.float64))
    sigma = np.broadcast_to(np.asarray(sigma_arcsec, dtype=np.float64), radius.shape)
    within, beyond = radius < inner, radius > outer
    probability = _share_below(radius - outer, sigma) - _share_below(radius - inner, sigma)
    separable = None
    if spacing_arcsec is not None and resolution_arcsec is not None:
        separable = spacing_arcsec >= resolution_arcsec
    return ShellsInView(
        in_view=~(within | beyond) & (radius > 0.0),
        probability=np.maximum(probability, 0.0),
        beyond_outer=int(beyond.sum()),
        within_inner=int(within.sum()),
        inner_arcsec=inner if inner > 0.0 else float("nan"),
        outer_arcsec=outer if np.isfinite(outer) else float("nan"),
        separable=separable,
    )


def resolvable_yr(
    launch_yr: float, launch_sigma_yr: float, motion_mas_yr: Uncertain, limit_arcsec: float, seed: int = 1
) -> Spread:
    """When a shell grows past a radius: the date at which it can first be resolved.

    Parameters
    ----------
    launch_yr, launch_sigma_yr : float
        Launch and its error, yr on any axis; NaN where the error is unknown.
    motion_mas_yr : Uncertain
        Proper motion with its draws, mas/yr.
    limit_arcsec : float
        Resolution or inner working angle, arcsec, > 0.
    seed : int
        Of the draws of the launch (dimensionless).

    Returns
    -------
    Spread
        Instants, yr on that axis. ``sigma`` is of first order; bounds come from draws.

    Raises
    ------
    InputRefused
        If the limit is not positive.

    Notes
    -----
    Accuracy: bounds to 1 % of sigma at 20,000 draws.

    Source: kinematics, t = t_launch + limit/mu.

    Examples
    --------
    >>> from campaign.physics.shellvalues import Sided, draw_sided
    >>> motion = draw_sided("motion", Sided(80.0, 0.0, 0.0), 2000)
    >>> found = resolvable_yr(2030.0, 0.1, motion, 0.1)
    >>> round(found.value, 6), round(found.sigma, 6)
    (2031.25, 0.1)
    """
    if not limit_arcsec > 0.0:
        raise InputRefused(
            f"A resolution of {limit_arcsec:g} arcsec cannot be.",
            why="It is the smallest radius at which a shell is told from the stars.",
            hint="Give a resolution such as 0.1 arcsec.",
            code="view-refused",
        )
    wait = 1000.0 * limit_arcsec / motion_mas_yr.value
    sigma = float(np.hypot(launch_sigma_yr, wait * motion_mas_yr.sigma / motion_mas_yr.value))
    normals = stratified_normals(["shell launch"], motion_mas_yr.draws.size, seed)["shell launch"]
    draws = launch_yr + launch_sigma_yr * normals + 1000.0 * limit_arcsec / motion_mas_yr.draws
    return spreads_of_draws(np.array([launch_yr + wait]), np.array([sigma]), draws[None, :]).at(0)


def _share_below(value: FloatArray, sigma: FloatArray) -> FloatArray:
    """Probability that a normal quantity about ``value`` is below 0; a step where the error is zero."""
    from scipy.special import ndtr

    with np.errstate(divide="ignore", invalid="ignore"):
        share = np.where(sigma == 0.0, (value < 0.0).astype(np.float64), ndtr(-value / sigma))
    return np.asarray(share, dtype=np.float64)
