"""Whether shells are still being pushed: constant speed against acceleration by starlight, and both ages."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import ArrayLike, NDArray

from campaign.physics.shellradii import RadiusErrors
from campaign.physics.shelltrack import SHARE, ShellTrack, SpeedModel
from campaign.physics.shellvalues import Sided

FloatArray = NDArray[np.float64]
Verdict = Literal["accelerated", "constant", "decelerated", "undecided"]

CRITERION = "AIC with the errors as stated; a claim needs a difference of 2 or more"
# One model is preferred when its AIC is lower by this (Burnham & Anderson 2002, section 2.6): with the one
# parameter more, chi2 must fall by 4. Without acceleration that happens by chance in 2.3 % of cases.
CLAIM = 2.0
# The chi2 that a launch at three quarters of the terminal speed must have cost before constant speed is
# claimed: it would then have been missed in 5 % only.
_WOULD_SHOW = (2.0 + 1.645) ** 2
_STARTS = (0.8, 0.3)


@dataclass(frozen=True, slots=True, eq=False)
class AccelerationFit:
    """Both models, which of them the radii prefer, and whether they could have told.

    ``criterion_difference`` is the AIC of constant speed minus that of acceleration. ``would_show`` is
    the chi2 that a launch at three quarters of the terminal speed would have cost it, None where no
    launch radius is known. ``prior_used``: the launch speed is not told by the radii, and the accelerated
    model takes it anywhere between rest and the terminal speed.
    """

    verdict: Verdict
    criterion_difference: float
    statement: str
    constant: SpeedModel
    accelerated: SpeedModel
    would_show: float | None
    prior_used: bool
    converged: bool


def fit_acceleration(
    time_yr: ArrayLike,
    cycle: ArrayLike,
    radius_arcsec: ArrayLike,
    errors: RadiusErrors,
    period_yr: Sided | None = None,
    launch_radius_arcsec: Sided | None = None,
    launch_time_yr: Sided | None = None,
) -> AccelerationFit:
    """Fit shells with constant speed and with acceleration by starlight, and say which the radii prefer.

    A radius alone does not tell where on its way a shell was launched: that takes a launch radius (where
    dust condenses) or a launch time (the ephemeris). Without either, the way is fitted from the innermost
    radius on, and the accelerated age is that of dust that started from rest.

    Parameters
    ----------
    time_yr, radius_arcsec : array_like, shape (n,)
        Instants, yr, and radii, arcsec, > 0.
    cycle : array_like of int, shape (n,)
        Launch of each radius (dimensionless), growing with time; 0 throughout for one shell.
    errors : RadiusErrors
        Errors of the radii, arcsec, all known.
    period_yr : Sided, optional
        Interval between launches, yr; fitted when not given and several cycles are there. For one image and
        no period give ``Sided(1.0, 0.0, 0.0)`` and times 0: everything is then per period.
    launch_radius_arcsec : Sided, optional
        Where the dust is launched, arcsec.
    launch_time_yr : Sided, optional
        When cycle 0 was launched, yr.

    Returns
    -------
    AccelerationFit
        Radii in arcsec, motions in arcsec/yr, times in yr.

    Raises
    ------
    InputRefused
        If a radius cannot be, errors are unknown, a launch radius lies outside a shell, or there are not more
        radii than quantities to find.

    Notes
    -----
    Maximum likelihood by damped Gauss-Newton steps from several launch speeds, with analytic derivatives;
    plate scales enter by their covariance at constant speed. "Constant" needs a launch radius and radii that
    would have shown a launch at three quarters of the terminal speed; all between is "undecided".
    Accuracy: minima to 1e-8 in chi2; errors are of first order.

    Source: v^2 = v_inf^2 (1 - r_m/r) under an inverse-square push; Akaike 1974, IEEE Trans. Autom. Control
    19, 716; Burnham & Anderson 2002, Model Selection and Multimodel Inference, section 2.6.

    Examples
    --------
    >>> from campaign.physics.shellradii import radius_errors
    >>> from campaign.physics.shelltrajectory import radius_after
    >>> age = np.array([0.5, 1.0, 2.0, 4.0, 8.0, 16.0])
    >>> radius = radius_after(age, 0.1, 0.02, 0.1)
    >>> fit = fit_acceleration(2000 + age, 0 * age, radius, radius_errors(0.002 + 0 * age),
    ...     launch_radius_arcsec=Sided(0.1, 0.0, 0.0))
    >>> fit.verdict, round(fit.accelerated.launch_time_yr[0], 3)
    ('accelerated', 2000.0)
    """
    problem = ShellTrack(
        np.atleast_1d(np.asarray(time_yr, dtype=np.float64)),
        np.atleast_1d(np.asarray(cycle)).astype(np.float64),
        np.atleast_1d(np.asarray(radius_arcsec, dtype=np.float64)),
        errors,
        period_yr,
        launch_radius_arcsec,
        launch_time_yr,
    )
    constant = problem.minimum(problem.start, accelerated=False)
    found = [
        problem.minimum(ShellTrack.with_share(constant.values, share), accelerated=True)
        for share in (1.0, *_STARTS)
    ]
    free = min(found, key=lambda minimum: minimum.chi2)
    difference = constant.chi2 - free.chi2 - 2.0
    would_show = problem.would_show(constant.values) if launch_radius_arcsec is not None else None
    verdict = _verdict(difference, free.values[SHARE], would_show)
    told = verdict in ("accelerated", "decelerated")
    accelerated = free if told else problem.minimum(free.values, accelerated=True, share_prior=True)
    return AccelerationFit(
        verdict=verdict,
        criterion_difference=float(difference),
        statement=_statement(verdict, difference, would_show, launch_radius_arcsec is not None),
        constant=problem.told(constant),
        accelerated=problem.told(accelerated),
        would_show=would_show,
        prior_used=not told,
        converged=constant.converged and free.converged,
    )


def _verdict(difference: float, share: float, would_show: float | None) -> Verdict:
    if difference >= CLAIM:
        return "accelerated" if share < 1.0 else "decelerated"
    if difference <= 0.0 and would_show is not None and would_show >= _WOULD_SHOW:
        return "constant"
    return "undecided"


def _statement(verdict: Verdict, difference: float, would_show: float | None, has_radius: bool) -> str:
    told = f"AIC of constant speed minus that of acceleration {difference:+.1f}"
    if verdict == "accelerated":
        return f"The shells were accelerated on their way ({told})."
    if verdict == "decelerated":
        return f"The shells are slowed down, which starlight cannot do ({told})."
    if verdict == "constant":
        return (
            "Constant speed: a launch at three quarters of the terminal speed would have shown "
            f"({np.sqrt(would_show or 0.0):.1f} sigma), and did not ({told})."
        )
    if not has_radius:
        return (
            f"The radii do not tell acceleration from constant speed ({told}): what happened inside the "
            "innermost radius is open without a launch radius."
        )
    return (
        f"The radii do not tell acceleration from constant speed ({told}): a launch at three quarters of the "
        f"terminal speed would show by {np.sqrt(would_show or 0.0):.1f} sigma in all, the rest being taken "
        "up by speed and launch date."
    )
