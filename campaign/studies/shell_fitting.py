"""Fits to counted radii: spacing in one image, motion through several, and the ages that follow."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from campaign.errors import InputRefused
from campaign.model.measured import Measured
from campaign.model.shells import ShellMotion
from campaign.physics.shellfit import ShellFit, with_scaled_errors
from campaign.physics.shellmotion import (
    MOTION,
    SPACING,
    MotionFit,
    fit_common_motion,
    fit_each_shell,
    fit_motion_and_period,
    fit_one_shell,
    launch_times_yr,
)
from campaign.physics.shellnetwork import ShellInput
from campaign.physics.shellrelations import RelationSolution
from campaign.physics.shellspacing import age_in_periods, ages_yr, fit_spacing
from campaign.physics.shellvalues import Sided, Spreads, Uncertain, spreads_of_draws
from campaign.studies.shell_images import RadiusGroup, bmjd_of
from campaign.studies.shell_relations import none_if_nan

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]

SHELLS, SHELLS_AND_PERIOD = "shells", "shells and period"
# A motion that is negative by less than so many of its errors is none; by more, the count is wrong.
_SEEN_TO_MOVE = 3.0


@dataclass(frozen=True, slots=True)
class GroupFit:
    """What the counted radii of one group come to without any help, or None where they need help.

    ``spacing`` is the fit to one image, ``motion`` that through several. ``cycle`` counts launches, relative
    or absolute; ``used`` marks the radii of single shells (a blend of two is of none).
    """

    group: RadiusGroup
    index: FloatArray
    cycle: IntArray
    used: NDArray[np.bool_]
    spacing: ShellFit | None = None
    motion: MotionFit | None = None
    helped_by_period: bool = False

    @property
    def fit(self) -> ShellFit | None:
        """The linear fit itself."""
        return self.motion.fit if self.motion is not None else self.spacing


def fit_group(
    group: RadiusGroup, index: FloatArray, cycle: IntArray, period: Measured | None, *, scale_errors: bool
) -> GroupFit:
    """Fit what one group's radii can tell.

    Parameters
    ----------
    group : RadiusGroup
        Radii, arcsec, in one image or several.
    index : ndarray, shape (n,)
        Index of each radius (dimensionless); halves are blends.
    cycle : ndarray of int, shape (n,)
        Which launch each radius is of (dimensionless).
    period : Measured or None
        Julian years: used only where the radii of several images do not fix a motion without it.
    scale_errors : bool
        Whether errors are scaled by the scatter of the fit.

    Returns
    -------
    GroupFit
        Without a fit where a single radius, or a single shell at one instant, is all there is.

    Raises
    ------
    InputRefused
        When errors are to be scaled and nothing says by how much.

    Notes
    -----
    Accuracy and source: see ``campaign.physics.shellspacing`` and ``campaign.physics.shellmotion``.
    """
    used = index == np.round(index)
    bare = GroupFit(group, index, cycle, used)
    if group.images > 1 and group.dated and np.unique(group.time_yr[used]).size > 1:
        return _through_time(bare, period, scale_errors)
    if np.unique(index).size < 2:
        if scale_errors:
            _refuse_scaling()
        return bare
    fit = fit_spacing(index, group.radius_arcsec, group.errors)
    return replace(bare, spacing=with_scaled_errors(fit) if scale_errors else fit)


def _through_time(bare: GroupFit, period: Measured | None, scale_errors: bool) -> GroupFit:
    group, used = bare.group, bare.used
    time, radius, errors = group.time_yr[used], group.radius_arcsec[used], group.errors.only(used)
    cycle = bare.cycle[used]
    helped = False
    if np.unique(cycle).size == 1:
        motion = fit_one_shell(time, radius, errors)
    else:
        usable = None if period is None or not period.error_known else sided(period)
        try:
            motion = fit_motion_and_period(time, cycle, radius, errors)
            unseen = motion.fit.value(MOTION) < _SEEN_TO_MOVE * motion.fit.sigma(MOTION)
        except InputRefused:
            if usable is None:
                raise
            unseen = True
        if unseen and usable is not None:
            # Images too near together for a motion of their own: spacing and period tell it.
            motion = fit_motion_and_period(time, cycle, radius, errors, usable)
            helped = True
    if scale_errors:
        motion = replace(motion, fit=with_scaled_errors(motion.fit))
    return replace(bare, motion=motion, helped_by_period=helped)


def _refuse_scaling() -> None:
    raise InputRefused(
        "The errors cannot be scaled.",
        why="A single radius has no scatter that would say by how much.",
        hint="Leave --scale-errors out, or add radii.",
        code="nothing-to-scale-by",
    )


def sided(value: Measured) -> Sided:
    """A measured value for physics.

    Parameters
    ----------
    value : Measured
        Any unit.

    Returns
    -------
    Sided
        The same, in the same unit.

    Notes
    -----
    Accuracy: exact. Source: project convention.
    """
    return Sided(value.value, value.minus, value.plus)


def fitted_inputs(
    found: GroupFit, label: str = SHELLS
) -> tuple[list[ShellInput], Mapping[tuple[str, str], float]]:
    """Spacing and motion of a fit as inputs of the relations, with the correlation between them.

    Parameters
    ----------
    found : GroupFit
        Of radii in arcsec.
    label : str
        What the inputs are called.

    Returns
    -------
    (list of ShellInput, mapping)
        arcsec and mas/yr; the correlation is dimensionless.

    Notes
    -----
    Accuracy: of first order in the errors. Source: the covariance of the fit.
    """
    fit = found.fit
    if fit is None:
        return [], {}
    inputs = []
    if SPACING in fit.names and not found.helped_by_period:
        inputs.append(_fitted_input("spacing_arcsec", fit, SPACING, 1.0, label))
    if MOTION in fit.names:
        inputs.append(_fitted_input("proper_motion_mas_yr", fit, MOTION, 1000.0, label))
    if len(inputs) < 2 or np.isnan(fit.covariance).any():
        return inputs, {}
    s, m = fit.names.index(SPACING), fit.names.index(MOTION)
    rho = float(fit.covariance[s, m] / (fit.sigma(SPACING) * fit.sigma(MOTION)))
    return inputs, {(inputs[0].key, inputs[1].key): float(np.clip(rho, -1.0, 1.0))}


def _fitted_input(quantity: str, fit: ShellFit, name: str, factor: float, label: str) -> ShellInput:
    if name == MOTION and -_SEEN_TO_MOVE * fit.sigma(name) < fit.value(name) <= 0.0:
        raise InputRefused(
            f"The images do not show the shells move: {factor * fit.value(name):.3g} ± "
            f"{factor * fit.sigma(name):.2g} mas/yr.",
            why="They were taken too near together for the errors of their radii.",
            hint='Give --period "8.6±0.1 yr", or the radii of one image alone, or add an image of another '
            "year.",
            code="motion-undetermined",
        )
    if not fit.value(name) > 0.0:
        raise InputRefused(
            f"By these radii the {'spacing' if name == SPACING else 'motion'} would be "
            f"{factor * fit.value(name):.4g} {'arcsec' if name == SPACING else 'mas/yr'}.",
            why="Shells grow, and older ones are larger: these are not the same shells in all images, or "
            "their indices are wrong.",
            hint='Give --period "8.6±0.1 yr", which counts the shells from image to image, or the radii of '
            "one image at a time.",
            code="shells-shrink",
        )
    sigma = none_if_nan(factor * fit.sigma(name))
    return ShellInput(quantity, factor * fit.value(name), sigma, sigma, label)


@dataclass(frozen=True, slots=True)
class Ages:
    """Ages of the radii of one group, yr before their image, or in periods; NaN where nothing gives them."""

    yr: Spreads | None
    periods: Spreads | None
    fitted_arcsec: FloatArray
    residual_sigma: FloatArray
    basis: str


def ages_of(
    found: GroupFit, solution: RelationSolution, period: Measured | None, agrees: bool, seed: int
) -> Ages:
    """Age of each radius of a group at its image.

    Parameters
    ----------
    found : GroupFit
        Of radii in arcsec.
    solution : RelationSolution
        What follows from all that is stated and fitted (yr, mas/yr).
    period : Measured or None
        Stated period, Julian years.
    agrees : bool
        Whether stated period and motion agree with each other and the shells: then they are used together.
    seed : int
        Of the random draws (dimensionless).

    Returns
    -------
    Ages
        yr and periods; radii in arcsec.

    Notes
    -----
    Accuracy: see ``campaign.physics.shellspacing`` and ``campaign.physics.shellmotion``.

    Source: DEVELOPERS.md (Shells): age = R/mu to zero radius.
    """
    size = found.group.radius_arcsec.size
    nothing = np.full(size, np.nan)
    if found.motion is not None:
        return _ages_through_time(found, period, agrees)
    if found.spacing is None:
        yr = _ages_by_motion(found, solution.uncertain("proper_motion_mas_yr"), seed)
        return Ages(yr, None, nothing, nothing, "radius over motion")
    periods = age_in_periods(found.spacing, found.index)
    own_period = solution.without("period_yr", "spacing_arcsec")
    own_motion = solution.without("proper_motion_mas_yr", "spacing_arcsec")
    if own_period is not None and own_motion is not None and not agrees:
        own_motion = None
    if own_period is None and own_motion is None:
        yr = None
    elif any(u is not None and np.isnan(u.sigma) for u in (own_period, own_motion)):
        yr = _ages_without_error(periods, own_period, own_motion, found)
    else:
        yr = ages_yr(found.spacing, found.index, own_period, own_motion, seed)
    ways = [
        word for word, way in (("count of periods", own_period), ("radius over motion", own_motion)) if way
    ]
    fit = found.spacing
    return Ages(yr, periods, fit.fitted_arcsec, fit.residual_sigma, " and ".join(ways))


def best_motion(found: GroupFit, period: Measured | None, agrees: bool) -> MotionFit:
    """The fit through several images, sharpened by a stated period where that agrees.

    Parameters
    ----------
    found : GroupFit
        With a fit through several images, arcsec.
    period : Measured or None
        Julian years.
    agrees : bool
        Whether the period agrees with the shells.

    Returns
    -------
    MotionFit
        arcsec and arcsec/yr.

    Notes
    -----
    Scaled errors are left as they are: the scatter says nothing of a stated period.
    Accuracy and source: see ``campaign.physics.shellmotion``.
    """
    assert found.motion is not None
    fit = found.motion.fit
    if period is None or not period.error_known or not agrees:
        return found.motion
    if SPACING not in fit.names or fit.error_scale is not None or found.helped_by_period:
        return found.motion
    group, used = found.group, found.used
    return fit_motion_and_period(
        group.time_yr[used], found.cycle[used], group.radius_arcsec[used], group.errors.only(used),
        sided(period),
    )  # fmt: skip


def _ages_through_time(found: GroupFit, period: Measured | None, agrees: bool) -> Ages:
    group, motion = found.group, found.motion
    assert motion is not None
    single = SPACING not in motion.fit.names
    best = best_motion(found, period, agrees)
    alone = best is motion and not found.helped_by_period
    basis = "motion through the images" + ("" if alone else ", together with the stated period")
    launched = launch_times_yr(best, None if single else found.cycle)
    if single:
        launched = Spreads(*(np.repeat(column, group.radius_arcsec.size) for column in launched))
    # An earlier launch is a greater age: the bounds change places.
    ages = Spreads(
        group.time_yr - launched.value, launched.sigma, group.time_yr - launched.hi68,
        group.time_yr - launched.lo68, group.time_yr - launched.hi95, group.time_yr - launched.lo95,
    )  # fmt: skip
    fitted, residual = np.full((2, group.radius_arcsec.size), np.nan)
    fitted[found.used], residual[found.used] = motion.fit.fitted_arcsec, motion.fit.residual_sigma
    return Ages(ages, None, fitted, residual, basis)


def _ages_by_motion(found: GroupFit, motion: Uncertain | None, seed: int) -> Spreads | None:
    """Radius over motion, for radii that no fit was made of."""
    if motion is None:
        return None
    from campaign.physics.draws import stratified_normals

    errors, radius = found.group.errors, found.group.errors.peaks(found.group.radius_arcsec)
    shared = np.diag(errors.common_covariance(radius))
    own = np.sqrt(errors.sigma_arcsec**2 + shared)
    value = 1000.0 * radius / motion.value
    sigma = value * np.hypot(own / radius, motion.sigma / motion.value)
    names = [f"radius {place}" for place in range(radius.size)]
    z = np.array(list(stratified_normals(names, motion.draws.size, seed).values()))
    drawn = 1000.0 * (radius[:, None] + own[:, None] * z) / motion.draws
    return spreads_of_draws(value, sigma, drawn)


def _ages_without_error(
    periods: Spreads, period: Uncertain | None, motion: Uncertain | None, found: GroupFit
) -> Spreads:
    """Ages whose error nobody knows: the way that has one, else the count of periods."""
    assert found.spacing is not None
    if period is not None and (motion is None or not np.isnan(period.sigma) or np.isnan(motion.sigma)):
        value = periods.value * period.value
    else:
        assert motion is not None
        value = 1000.0 * found.spacing.fitted_arcsec / motion.value
    unknown = np.full(value.size, np.nan)
    return Spreads(value, unknown, unknown, unknown, unknown, unknown)


def motions_of(found: GroupFit, shift: int | None) -> list[ShellMotion]:
    """Motion of each shell that was seen in several images, and of all of them together.

    Parameters
    ----------
    found : GroupFit
        Of radii in arcsec.
    shift : int or None
        What to add to its cycles to get the system's own (dimensionless); None where nothing counts them.

    Returns
    -------
    list of ShellMotion
        mas/yr; launches ``bmjd_tdb``.

    Notes
    -----
    Accuracy and source: see ``campaign.physics.shellmotion``.
    """
    group, used = found.group, found.used
    if found.motion is None:
        return []
    time, cycle, radius = group.time_yr[used], found.cycle[used], group.radius_arcsec[used]
    errors = group.errors.only(used)
    each = fit_each_shell(time, cycle, radius, errors)
    rows = []
    for shell, one in sorted(each.items(), reverse=True):
        epochs = int(np.unique(time[cycle == shell]).size)
        name = f"cycle {shell + shift}" if shift is not None else _by_index(found, shell)
        rows.append(_motion(name, one, epochs, launch_times_yr(one)))
    if len(each) > 1:
        together = fit_common_motion(time, cycle, radius, errors)
        rows.append(_motion("all, each with its own launch", together, group.images, None))
    if SPACING in found.motion.fit.names:
        rows.append(_motion("all, launched at equal intervals", found.motion, group.images, None))
    return rows


def _by_index(found: GroupFit, cycle: int) -> str:
    """A shell by its index in the latest image that shows it."""
    last = int(np.flatnonzero(found.cycle == cycle)[-1])
    return f"shell {found.index[last]:g} of the latest image"


def _motion(label: str, motion: MotionFit, epochs: int, launched: Spreads | None) -> ShellMotion:
    fit = motion.fit
    return ShellMotion(
        label=label,
        epochs=epochs,
        proper_motion_mas_yr=1000.0 * fit.value(MOTION),
        sigma_mas_yr=1000.0 * fit.sigma(MOTION),
        launched_bmjd_tdb=None if launched is None else bmjd_of(float(launched.value[0])),
        launched_sigma_d=None if launched is None else none_if_nan(float(launched.sigma[0]) * 365.25),
        chi2=none_if_nan(fit.chi2),
        degrees_of_freedom=fit.degrees_of_freedom,
    )
