"""Shells of one image, equally spaced: the spacing, and how far the youngest has come."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from campaign.physics.draws import stratified_normals
from campaign.physics.shellfit import ShellFit, least_squares
from campaign.physics.shellradii import RadiusErrors, check_radii
from campaign.physics.shellvalues import Spreads, Uncertain, ratio_of_normals, spreads_of_draws

FloatArray = NDArray[np.float64]

NAMES = ("spacing_arcsec", "intercept_arcsec")


def fit_spacing(index: ArrayLike, radius_arcsec: ArrayLike, errors: RadiusErrors) -> ShellFit:
    """Fit R_j = s (j - 1 + f): the spacing s of one period, and the radius s f of the youngest.

    The youngest shell need not stand at one spacing, so slope and intercept are both free.

    Parameters
    ----------
    index : array_like, shape (n,)
        Index j of each shell (dimensionless), 1 for the youngest; gaps are allowed, and halves where two
        shells are blended.
    radius_arcsec : array_like, shape (n,)
        Radii, arcsec, > 0, growing with the index.
    errors : RadiusErrors
        Their errors, arcsec.

    Returns
    -------
    ShellFit
        ``spacing_arcsec`` and ``intercept_arcsec`` (the radius of index 1), both arcsec.

    Raises
    ------
    InputRefused
        If radii cannot be, or fewer than two different indices are given.

    Notes
    -----
    Accuracy: rounding. A common error of the plate scale adds its square times the product of the values to
    the covariance, and drops out of ages in periods.

    Source: unaccelerated expansion; Aitken 1935 (generalised least squares).

    Examples
    --------
    >>> from campaign.physics.shellradii import radius_errors
    >>> fit = fit_spacing([1, 2, 3], [0.83, 2.27, 3.75], radius_errors([0.03, 0.03, 0.04]))
    >>> round(fit.value("spacing_arcsec"), 3)
    1.458
    """
    j = np.atleast_1d(np.asarray(index, dtype=np.float64))
    radius = np.atleast_1d(np.asarray(radius_arcsec, dtype=np.float64))
    check_radii(radius, j)
    design = np.column_stack([j - 1.0, np.ones_like(j)])
    return least_squares(NAMES, design, radius, errors)


def age_in_periods(fit: ShellFit, index: ArrayLike) -> Spreads:
    """Age of shells in periods: j - 1 + f. It needs neither distance nor speed nor the plate scale.

    Parameters
    ----------
    fit : ShellFit
        Of :func:`fit_spacing`, arcsec.
    index : array_like, shape (m,)
        Indices (dimensionless); also of shells that were not seen.

    Returns
    -------
    Spreads
        Ages in periods.

    Notes
    -----
    Accuracy: exact bounds for the ratio of two normal quantities.

    Source: Fieller 1954, J. R. Statist. Soc. B 16, 175.

    Examples
    --------
    >>> from campaign.physics.shellradii import radius_errors
    >>> fit = fit_spacing([1, 2, 3], [0.5, 1.5, 2.5], radius_errors([0.01, 0.01, 0.01]))
    >>> age_in_periods(fit, [1, 4]).value.round(9).tolist()
    [0.5, 3.5]
    """
    j = np.atleast_1d(np.asarray(index, dtype=np.float64))
    rows = np.column_stack([j - 1.0, np.ones_like(j)])
    radius, covariance = fit.combination(rows)
    with_spacing = rows @ fit.covariance[:, 0]
    spacing = fit.values[0]
    return ratio_of_normals(radius, spacing, np.diag(covariance), with_spacing, fit.covariance[0, 0])


def ages_yr(
    fit: ShellFit,
    index: ArrayLike,
    period_yr: Uncertain | None = None,
    motion_mas_yr: Uncertain | None = None,
    seed: int = 1,
) -> Spreads:
    """Ages of shells: the age in periods times the period, the radius over the motion, or both together.

    Parameters
    ----------
    fit : ShellFit
        Of :func:`fit_spacing`, arcsec.
    index : array_like, shape (m,)
        Indices (dimensionless).
    period_yr, motion_mas_yr : Uncertain, optional
        Period, yr, and proper motion, mas/yr, at least one of them; neither may itself rest on this fit's
        spacing. Their draws are of one length and keep whatever correlation they have.
    seed : int
        Of the draws of the fit (dimensionless).

    Returns
    -------
    Spreads
        Ages, yr, to zero radius at constant speed. ``sigma`` is of first order; bounds come from the draws.

    Notes
    -----
    With both, the age is their best linear combination. Accuracy: bounds to 1 % of sigma at 20,000 draws.

    Source: kinematics; best linear combination: Lyons, Gibaut & Clifford 1988, Nucl. Instrum. Methods
    A 270, 110.

    Examples
    --------
    >>> from campaign.physics.shellradii import radius_errors
    >>> from campaign.physics.shellvalues import Sided, draw_sided
    >>> fit = fit_spacing([1, 2, 3], [0.5, 1.5, 2.5], radius_errors([0.01, 0.01, 0.01]))
    >>> ages_yr(fit, [1], period_yr=draw_sided("period", Sided(8.0, 0.1, 0.1), 2000)).value.round(6).tolist()
    [4.0]
    """
    j = np.atleast_1d(np.asarray(index, dtype=np.float64))
    known = [which for which in (period_yr, motion_mas_yr) if which is not None]
    spacing, intercept = _drawn(fit, known[0].draws.size, seed)
    radius = (j[:, None] - 1.0) * spacing + intercept
    found: list[tuple[FloatArray, FloatArray, FloatArray]] = []
    if period_yr is not None:
        turns = age_in_periods(fit, j)
        sigma = np.hypot(turns.value * period_yr.sigma, turns.sigma * period_yr.value)
        found.append((turns.value * period_yr.value, sigma, radius / spacing * period_yr.draws))
    if motion_mas_yr is not None:
        mean, covariance = fit.combination(np.column_stack([j - 1.0, np.ones_like(j)]))
        motion = motion_mas_yr.value / 1000.0
        age = mean / motion
        own = np.sqrt(np.diag(covariance)) / motion
        sigma = np.hypot(own, age * motion_mas_yr.sigma / motion_mas_yr.value)
        found.append((age, sigma, 1000.0 * radius / motion_mas_yr.draws))
    if len(found) == 1:
        return spreads_of_draws(*found[0])
    return _combined(*found)


def _drawn(fit: ShellFit, draws: int, seed: int) -> tuple[FloatArray, FloatArray]:
    """Draws of spacing and intercept, with their correlation; NaN where errors are unknown."""
    if np.isnan(fit.covariance).any():
        nothing = np.full(draws, np.nan)
        return nothing, nothing
    normals = stratified_normals(["shell spacing", "shell intercept"], draws, seed)
    root = np.linalg.cholesky(fit.covariance)
    first, second = normals["shell spacing"], normals["shell intercept"]
    return fit.values[0] + root[0, 0] * first, fit.values[1] + root[1, 0] * first + root[1, 1] * second


def _combined(
    one: tuple[FloatArray, FloatArray, FloatArray], other: tuple[FloatArray, FloatArray, FloatArray]
) -> Spreads:
    """Best linear combination of two ages of each shell, weights from the covariance of their draws."""
    centred = [draws - draws.mean(axis=1, keepdims=True) for *_, draws in (one, other)]
    aa, ab, bb = ((centred[i] * centred[k]).mean(axis=1) for i, k in ((0, 0), (0, 1), (1, 1)))
    spread = aa - 2.0 * ab + bb
    weight = np.where(spread > 1e-12 * (aa + bb), (bb - ab) / np.where(spread > 0.0, spread, 1.0), 0.5)
    value = weight * one[0] + (1.0 - weight) * other[0]
    variance = weight**2 * aa + 2.0 * weight * (1.0 - weight) * ab + (1.0 - weight) ** 2 * bb
    draws = weight[:, None] * one[2] + (1.0 - weight[:, None]) * other[2]
    return spreads_of_draws(value, np.sqrt(variance), draws)
