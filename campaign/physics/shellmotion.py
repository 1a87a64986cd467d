"""Shells of several images: how each moves, how all move together, and the period that follows."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from campaign.errors import InputRefused
from campaign.physics.shellfit import ShellFit, Stated, least_squares
from campaign.physics.shellradii import RadiusErrors, check_radii
from campaign.physics.shellvalues import Sided, Spreads, ratio_of_normals

FloatArray = NDArray[np.float64]

RADIUS, SPACING, MOTION = "radius_arcsec", "spacing_arcsec", "motion_arcsec_yr"
# An exact period is stated with this relative error, far below any measurement, far above rounding.
_EXACT = 1e-7
_ROUNDS = 4


@dataclass(frozen=True, slots=True, eq=False)
class MotionFit:
    """A fit of radii through time. Radii are those at ``pivot_yr``; the spacing counts from ``youngest``.

    ``youngest`` is the cycle to which ``radius_arcsec`` belongs, and a cycle earlier is one spacing out;
    None where each shell has a radius of its own.
    """

    fit: ShellFit
    pivot_yr: float
    youngest: int | None = None


def fit_one_shell(
    time_yr: ArrayLike, radius_arcsec: ArrayLike, errors: RadiusErrors, pivot_yr: float | None = None
) -> MotionFit:
    """Fit r = a + mu (t - t_pivot) to one shell seen at several epochs.

    Parameters
    ----------
    time_yr : array_like, shape (n,)
        Instants, Julian years on any axis.
    radius_arcsec : array_like, shape (n,)
        Radii, arcsec, > 0.
    errors : RadiusErrors
        Their errors, arcsec.
    pivot_yr : float, optional
        Instant of the constant term, yr; where constant and motion are uncorrelated when not given.

    Returns
    -------
    MotionFit
        ``radius_arcsec`` at the pivot and ``motion_arcsec_yr``: arcsec and arcsec/yr.

    Raises
    ------
    InputRefused
        If a radius cannot be, or all are of one instant.

    Notes
    -----
    Accuracy: rounding; no choice of the pivot changes the launch date or its error.

    Source: Aitken 1935 (generalised least squares).

    Examples
    --------
    >>> from campaign.physics.shellradii import radius_errors
    >>> fit = fit_one_shell([2010.0, 2020.0], [0.5, 1.0], radius_errors([0.01, 0.01]))
    >>> launch_times_yr(fit).value.round(6).tolist()
    [2000.0]
    """
    time = np.atleast_1d(np.asarray(time_yr, dtype=np.float64))
    radius = np.atleast_1d(np.asarray(radius_arcsec, dtype=np.float64))
    check_radii(radius)
    if pivot_yr is None:
        weight = errors.sigma_arcsec**-2.0 if errors.known else np.ones_like(time)
        pivot_yr = float(weight @ time / weight.sum())
    design = np.column_stack([np.ones_like(time), time - pivot_yr])
    return MotionFit(least_squares((RADIUS, MOTION), design, radius, errors), pivot_yr)


def fit_each_shell(
    time_yr: ArrayLike, cycle: ArrayLike, radius_arcsec: ArrayLike, errors: RadiusErrors
) -> dict[int, MotionFit]:
    """Motion of each shell by itself, where it was seen at two instants or more.

    Parameters
    ----------
    time_yr, radius_arcsec : array_like, shape (n,)
        Instants, yr, and radii, arcsec.
    cycle : array_like of int, shape (n,)
        Which shell each radius is of (dimensionless); grows with the launch date.
    errors : RadiusErrors
        Errors of the radii, arcsec.

    Returns
    -------
    dict of int to MotionFit
        By cycle, in order; arcsec and arcsec/yr.

    Notes
    -----
    Accuracy: as :func:`fit_one_shell`. Shells of the same images share plate scales, so that the fits are
    not independent.

    Source: Aitken 1935 (generalised least squares).

    Examples
    --------
    >>> from campaign.physics.shellradii import radius_errors
    >>> errors = radius_errors([0.01, 0.01, 0.01])
    >>> fits = fit_each_shell([2010.0, 2020.0, 2020.0], [4, 4, 5], [0.5, 1.0, 0.4], errors)
    >>> list(fits)
    [4]
    """
    time, shells, radius = _columns(time_yr, cycle, radius_arcsec)
    found = {}
    for shell in np.unique(shells):
        chosen = shells == shell
        if np.unique(time[chosen]).size > 1:
            found[int(shell)] = fit_one_shell(time[chosen], radius[chosen], errors.only(chosen))
    return found


def fit_common_motion(
    time_yr: ArrayLike, cycle: ArrayLike, radius_arcsec: ArrayLike, errors: RadiusErrors
) -> MotionFit:
    """One motion for all shells, each with a launch of its own.

    Parameters
    ----------
    time_yr, radius_arcsec : array_like, shape (n,)
        Instants, yr, and radii, arcsec.
    cycle : array_like of int, shape (n,)
        Which shell each radius is of (dimensionless).
    errors : RadiusErrors
        Errors of the radii, arcsec.

    Returns
    -------
    MotionFit
        ``motion_arcsec_yr``, and ``radius_arcsec[k]`` at the pivot for each cycle k.

    Raises
    ------
    InputRefused
        If no shell was seen at two instants.

    Notes
    -----
    Accuracy: rounding.

    Source: Aitken 1935 (generalised least squares).

    Examples
    --------
    >>> from campaign.physics.shellradii import radius_errors
    >>> errors = radius_errors([0.01, 0.01, 0.01])
    >>> fit = fit_common_motion([2010.0, 2020.0, 2020.0], [4, 4, 5], [0.5, 1.0, 0.4], errors)
    >>> round(fit.fit.value("motion_arcsec_yr"), 6), fit.fit.names[1:]
    (0.05, ('radius_arcsec[4]', 'radius_arcsec[5]'))
    """
    time, shells, radius = _columns(time_yr, cycle, radius_arcsec)
    pivot = float(time.mean())
    each = np.unique(shells)
    design = np.column_stack([time - pivot, *(shells == shell for shell in each)]).astype(np.float64)
    names = (MOTION, *(f"{RADIUS}[{shell}]" for shell in each))
    return MotionFit(least_squares(names, design, radius, errors), pivot)


def fit_motion_and_period(
    time_yr: ArrayLike,
    cycle: ArrayLike,
    radius_arcsec: ArrayLike,
    errors: RadiusErrors,
    period_yr: Sided | None = None,
    motion_arcsec_yr: Sided | None = None,
) -> MotionFit:
    """Fit r = b + s (k_youngest - k) + mu (t - t_pivot): launches at equal intervals P = s/mu, one motion.

    Parameters
    ----------
    time_yr, radius_arcsec : array_like, shape (n,)
        Instants, yr, and radii, arcsec.
    cycle : array_like of int, shape (n,)
        Which shell each radius is of (dimensionless); grows by one from launch to launch.
    errors : RadiusErrors
        Errors of the radii, arcsec.
    period_yr, motion_arcsec_yr : Sided, optional
        Knowledge from elsewhere, yr and arcsec/yr. At one epoch one of them is needed.

    Returns
    -------
    MotionFit
        ``radius_arcsec`` of the youngest cycle at the pivot, ``spacing_arcsec``, ``motion_arcsec_yr``: arcsec
        and arcsec/yr.

    Raises
    ------
    InputRefused
        If radii and stated knowledge together do not fix all three.

    Notes
    -----
    Accuracy: exact without a stated period; with one, of first order in its relative error.

    Source: Aitken 1935 (generalised least squares).

    Examples
    --------
    >>> from campaign.physics.shellradii import radius_errors
    >>> errors = radius_errors([0.01, 0.01, 0.01])
    >>> fit = fit_motion_and_period([2010.0, 2020.0, 2020.0], [4, 4, 5], [0.5, 1.0, 0.4], errors)
    >>> launch_times_yr(fit, [4, 5]).value.round(6).tolist()
    [2000.0, 2012.0]
    """
    time, shells, radius = _columns(time_yr, cycle, radius_arcsec)
    pivot, youngest = float(time.mean()), int(shells.max())
    design = np.column_stack([np.ones_like(time), youngest - shells, time - pivot]).astype(np.float64)
    motion = _first_motion(time, shells, radius, period_yr, motion_arcsec_yr)
    names = (RADIUS, SPACING, MOTION)
    fit = least_squares(names, design, radius, errors, _stated(period_yr, motion_arcsec_yr, motion))
    for _ in range(_ROUNDS if period_yr is not None else 0):
        stated = _stated(period_yr, motion_arcsec_yr, fit.value(MOTION))
        fit = least_squares(names, design, radius, errors, stated)
    return MotionFit(fit, pivot, youngest)


def _first_motion(
    time: FloatArray,
    shells: NDArray[np.int64],
    radius: FloatArray,
    period: Sided | None,
    motion: Sided | None,
) -> float:
    """A motion to weigh a stated period by, before there is a fit."""
    if motion is not None:
        return motion.value
    if period is None:
        return 1.0
    age = time - (shells - shells.max()) * period.value
    span = float(np.ptp(age))
    return float(np.ptp(radius)) / span if span > 0.0 else 1.0


def _stated(period: Sided | None, motion: Sided | None, motion_arcsec_yr: float) -> Stated | None:
    rows, values, sigmas = [], [], []
    if period is not None:
        _refuse_unknown(period, "period")
        rows.append([0.0, 1.0, -period.value])
        values.append(0.0)
        sigmas.append(abs(motion_arcsec_yr) * max(period.sigma, _EXACT * period.value))
    if motion is not None:
        _refuse_unknown(motion, "proper motion")
        rows.append([0.0, 0.0, 1.0])
        values.append(motion.value)
        sigmas.append(max(motion.sigma, _EXACT * motion.value))
    return Stated(np.array(rows), np.array(values), np.array(sigmas)) if rows else None


def _refuse_unknown(sided: Sided, word: str) -> None:
    if not sided.known:
        raise InputRefused(
            f"The {word} has no error.",
            why="A fit weighs what is stated by its error, and an unknown error is not zero.",
            hint=f"Give the {word} with its error, or with ±0 where it is exact.",
            code="error-unknown",
        )


def launch_times_yr(motion: MotionFit, cycle: ArrayLike | None = None) -> Spreads:
    """Instants at which shells had zero radius, at constant speed.

    Parameters
    ----------
    motion : MotionFit
        Of any fit of this module, arcsec and yr.
    cycle : array_like of int, shape (m,), optional
        Cycles (dimensionless); not for the fit of one shell.

    Returns
    -------
    Spreads
        Instants, yr, on the axis of the fit. A bound that the motion leaves open is NaN.

    Notes
    -----
    Accuracy: ``sigma`` by the full covariance, of first order; the bounds are exact for normal errors.

    Source: var(t) = (C_aa - 2 (a/mu) C_ab + (a/mu)^2 C_bb)/mu^2; bounds: Fieller 1954, J. R. Statist.
    Soc. B 16, 175.

    Examples
    --------
    >>> from campaign.physics.shellradii import radius_errors
    >>> fit = fit_one_shell([2010.0, 2020.0], [0.5, 1.0], radius_errors([0.01, 0.01]), pivot_yr=0.0)
    >>> launch_times_yr(fit).sigma.round(4).tolist()
    [0.4472]
    """
    names = motion.fit.names
    wanted = [0] if cycle is None else [int(k) for k in np.atleast_1d(np.asarray(cycle))]
    rows = np.zeros((len(wanted), len(names)))
    for row, shell in zip(rows, wanted, strict=True):
        if motion.youngest is not None:
            row[names.index(RADIUS)] = -1.0
            row[names.index(SPACING)] = shell - motion.youngest
        else:
            row[names.index(RADIUS if RADIUS in names else f"{RADIUS}[{shell}]")] = -1.0
    back, covariance = motion.fit.combination(rows)
    place = names.index(MOTION)
    with_motion = rows @ motion.fit.covariance[:, place]
    found = ratio_of_normals(
        back, motion.fit.values[place], np.diag(covariance), with_motion, motion.fit.covariance[place, place]
    )
    at_pivot = motion.pivot_yr
    return Spreads(
        found.value + at_pivot,
        found.sigma,
        *(bound + at_pivot for bound in (found.lo68, found.hi68, found.lo95, found.hi95)),
    )


def _columns(
    time_yr: ArrayLike, cycle: ArrayLike, radius_arcsec: ArrayLike
) -> tuple[FloatArray, NDArray[np.int64], FloatArray]:
    time = np.atleast_1d(np.asarray(time_yr, dtype=np.float64))
    radius = np.atleast_1d(np.asarray(radius_arcsec, dtype=np.float64))
    check_radii(radius)
    return time, np.atleast_1d(np.asarray(cycle)).astype(np.int64), radius
