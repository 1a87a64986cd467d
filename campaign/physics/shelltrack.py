"""The way of accelerated shells fitted to radii: parameters, residuals, least chi2, what follows."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from campaign.errors import InputRefused
from campaign.physics.shellradii import RadiusErrors, check_radii
from campaign.physics.shelltrajectory import radius_after, radius_slopes, travel_time
from campaign.physics.shellvalues import Sided

FloatArray = NDArray[np.float64]

# Launch over terminal speed of the acceleration that a verdict of constant speed must exclude: with one half,
# weaker ones that spoil the age would still pass as constant.
REFERENCE_SHARE = 0.75
# Launch speeds between rest and the terminal speed, all alike: standard deviation of that prior in shares.
_SHARE_MEAN, _SHARE_SIGMA = 0.5, 12.0**-0.5
_LEAST_SHARE, _LARGEST_SHARE = 0.02, 3.0
_ITERATIONS = 60

# Places of the parameters: launch time of cycle 0, period, terminal motion, launch speed as a share of it,
# launch radius.
TIME, PERIOD, MOTION, SHARE, RADIUS = range(5)


@dataclass(frozen=True, slots=True, eq=False)
class SpeedModel:
    """One fitted way of the shells: constant speed, or acceleration from launch to terminal speed.

    Each quantity is a pair of value and standard deviation. Launch times are those of cycle 0, and
    ``ages_yr`` those of each radius given, since launch at the launch radius (without one, see the fit).
    """

    launch_radius_arcsec: tuple[float, float]
    launch_motion_arcsec_yr: tuple[float, float]
    terminal_motion_arcsec_yr: tuple[float, float]
    launch_time_yr: tuple[float, float]
    period_yr: tuple[float, float] | None
    ages_yr: FloatArray
    age_sigmas_yr: FloatArray
    fitted_arcsec: FloatArray
    chi2: float
    parameters: int


@dataclass(frozen=True, slots=True, eq=False)
class Minimum:
    values: FloatArray
    covariance: FloatArray
    chi2: float
    free: tuple[int, ...]
    converged: bool


class ShellTrack:
    """Radii, errors and stated knowledge, with residuals and their derivatives."""

    @staticmethod
    def with_share(values: FloatArray, share: float) -> FloatArray:
        """The parameters with another launch speed, as a share of the terminal."""
        changed = values.copy()
        changed[SHARE] = share
        return changed

    def __init__(
        self,
        time: FloatArray,
        cycle: FloatArray,
        radius: FloatArray,
        errors: RadiusErrors,
        period: Sided | None,
        launch_radius: Sided | None,
        launch_time: Sided | None,
    ) -> None:
        check_radii(radius)
        self.time, self.cycle = time, cycle
        self.radius = errors.peaks(radius)
        _refuse_unknown(errors, period, launch_radius, launch_time, float(self.radius.min()))
        self.anchored = launch_radius is None and launch_time is None
        several = bool(np.ptp(cycle) > 0)
        free = [TIME, MOTION]
        self.stated: list[tuple[int, float, float]] = []
        innermost = float(self.radius.min())
        values = np.array([0.0, 1.0, 1.0, 1.0, innermost if launch_radius is None else launch_radius.value])
        for place, sided in ((PERIOD, period), (RADIUS, launch_radius), (TIME, launch_time)):
            if sided is not None:
                values[place] = sided.value
                if sided.sigma > 0.0:
                    self.stated.append((place, sided.value, sided.sigma))
        if (period is None and several) or (period is not None and period.sigma > 0.0):
            free.append(PERIOD)
        if not self.anchored and (launch_radius is None or launch_radius.sigma > 0.0):
            free.append(RADIUS)
        if launch_time is not None and launch_time.sigma == 0.0:
            free.remove(TIME)
        self.free = tuple(sorted(free))
        self.innermost = innermost
        self.start = self._straight(values, period)
        if radius.size + len(self.stated) <= len(self.free):
            raise InputRefused(
                "There are too few radii to look for acceleration.",
                why=f"{len(self.free) + 1} quantities are to be found from {radius.size} radii.",
                hint="Add epochs or shells, or state the period and the launch radius.",
                code="shells-too-few",
            )
        straight = np.maximum(self._model(self.start)[0], 0.0)
        covariance = np.diag(errors.sigma_arcsec**2) + errors.common_covariance(straight)
        self.whitening = np.linalg.inv(np.linalg.cholesky(covariance))

    def _straight(self, values: FloatArray, period: Sided | None) -> FloatArray:
        """Constant speed by plain least squares, to start from."""
        several = bool(np.ptp(self.cycle) > 0)
        if period is not None:
            age = self.time - self.cycle * period.value
            design = np.column_stack([np.ones_like(age), age])
        elif several:
            design = np.column_stack([np.ones_like(self.time), self.time, -self.cycle])
        else:
            design = np.column_stack([np.ones_like(self.time), self.time])
        found, _, rank, _ = np.linalg.lstsq(design, self.radius, rcond=None)
        if rank < design.shape[1] or found[1] <= 0.0:
            raise InputRefused(
                "The radii show no expansion to judge.",
                why="Acceleration needs radii at different ages that grow with age.",
                hint="Give radii of several epochs, or of several shells with a period.",
                code="shells-too-few",
            )
        start = values.copy()
        start[MOTION] = found[1]
        if several and period is None:
            start[PERIOD] = found[2] / found[1]
        if TIME in self.free:
            start[TIME] = (start[RADIUS] - found[0]) / found[1]
        return start

    def _model(self, values: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Radii and their derivatives by all five parameters."""
        age = self.time - values[TIME] - self.cycle * values[PERIOD]
        share, motion, launch = float(values[SHARE]), float(values[MOTION]), float(values[RADIUS])
        radius = radius_after(age, launch, share * motion, motion)
        speed, by_radius, by_share, by_motion = radius_slopes(radius, age, launch, share, motion)
        slopes = np.column_stack([-speed, -speed * self.cycle, by_motion, by_share, by_radius])
        return radius, slopes

    def _equations(
        self, values: FloatArray, share_prior: bool, measured: FloatArray
    ) -> tuple[FloatArray, FloatArray]:
        radius, slopes = self._model(values)
        residuals = [self.whitening @ (measured - radius)]
        rows = [self.whitening @ slopes]
        stated = list(self.stated)
        if share_prior:
            stated.append((SHARE, _SHARE_MEAN, _SHARE_SIGMA))
        for place, value, sigma in stated:
            row = np.zeros((1, 5))
            row[0, place] = 1.0 / sigma
            rows.append(row)
            residuals.append(np.array([(value - values[place]) / sigma]))
        return np.concatenate(residuals), np.vstack(rows)

    def minimum(
        self,
        start: FloatArray,
        accelerated: bool,
        share_prior: bool = False,
        measured: FloatArray | None = None,
    ) -> Minimum:
        """Least chi2 from a start, by damped Gauss-Newton steps."""
        data = self.radius if measured is None else measured
        free = tuple(sorted((*self.free, SHARE))) if accelerated else self.free
        values, damping, converged = self._bounded(start), 1e-3, False
        residual, rows = self._equations(values, share_prior, data)
        chi2 = float(residual @ residual)
        for _ in range(_ITERATIONS):
            trial = self._bounded(values + self._step(values, residual, rows, free, damping))
            there, rows_there = self._equations(trial, share_prior, data)
            chi2_there = float(there @ there)
            if chi2_there <= chi2:
                gained = chi2 - chi2_there
                values, residual, rows, chi2 = trial, there, rows_there, chi2_there
                damping = max(damping / 10.0, 1e-14)
                if gained <= 1e-9 * (1.0 + chi2):
                    converged = True
                    break
            else:
                damping *= 5.0
                if damping > 1e9:
                    converged = True
                    break
        jacobian = rows[:, free]
        inverse = np.linalg.pinv(jacobian.T @ jacobian, hermitian=True, rcond=1e-14)
        covariance: FloatArray = np.asarray(inverse, dtype=np.float64)
        return Minimum(values, covariance, chi2, free, converged)

    def _step(
        self,
        values: FloatArray,
        residual: FloatArray,
        rows: FloatArray,
        free: tuple[int, ...],
        damping: float,
    ) -> FloatArray:
        """A damped step in all five parameters; one that stands at its bound does not push against it."""
        pull = rows.T @ residual
        bounded = self._bounded(values + 1e-6 * np.sign(pull) * np.maximum(np.abs(values), 1e-3))
        moving = [place for place in free if place in (TIME, PERIOD) or bounded[place] != values[place]]
        step = np.zeros(5)
        jacobian = rows[:, moving]
        scale = np.sqrt(np.maximum((jacobian**2).sum(axis=0), 1e-300))
        normal = (jacobian / scale).T @ (jacobian / scale) + damping * np.eye(len(moving))
        step[moving] = np.linalg.solve(normal, pull[moving] / scale) / scale
        return step

    def _bounded(self, values: FloatArray) -> FloatArray:
        bounded = values.copy()
        bounded[SHARE] = np.clip(bounded[SHARE], _LEAST_SHARE, _LARGEST_SHARE)
        bounded[MOTION] = max(bounded[MOTION], 1e-3 * self.start[MOTION])
        if not self.anchored:
            bounded[RADIUS] = np.clip(bounded[RADIUS], 1e-4 * self.innermost, self.innermost)
        return bounded

    def would_show(self, constant: FloatArray) -> float:
        """The chi2 that constant speed would have, had the dust been launched at the reference share."""
        reference = self.with_share(constant, REFERENCE_SHARE)
        radius, _ = self._model(reference)
        return self.minimum(constant, accelerated=False, measured=radius).chi2

    # --- what a minimum tells -------------------------------------------------------------------------

    def told(self, minimum: Minimum) -> SpeedModel:
        values, covariance = minimum.values, minimum.covariance
        fitted, _ = self._model(values)

        def spread(function: Callable[[FloatArray], FloatArray]) -> tuple[FloatArray, FloatArray]:
            found = function(values)
            slopes = np.empty((found.size, len(minimum.free)))
            for column, place in enumerate(minimum.free):
                step = 1e-3 * np.sqrt(max(covariance[column, column], 0.0)) + 1e-9 * abs(values[place])
                step = min(step, 1e-3 * max(abs(values[place]), 1e-9)) if place != TIME else step
                up, down = values.copy(), values.copy()
                up[place] += step
                down[place] -= step
                slopes[:, column] = (function(up) - function(down)) / (2.0 * step)
            return found, np.sqrt(np.maximum(np.einsum("ij,jk,ik->i", slopes, covariance, slopes), 0.0))

        def one(function: Callable[[FloatArray], FloatArray]) -> tuple[float, float]:
            value, sigma = spread(function)
            return float(value[0]), float(sigma[0])

        ages, age_sigmas = spread(lambda x: self.time - self._launch(x) - self.cycle * x[PERIOD])
        return SpeedModel(
            launch_radius_arcsec=one(lambda x: np.array([self._launch_radius(x)])),
            launch_motion_arcsec_yr=one(lambda x: np.array([self._launch_motion(x)])),
            terminal_motion_arcsec_yr=one(lambda x: x[[MOTION]]),
            launch_time_yr=one(lambda x: np.array([self._launch(x)])),
            period_yr=one(lambda x: x[[PERIOD]]) if PERIOD in minimum.free else None,
            ages_yr=ages,
            age_sigmas_yr=age_sigmas,
            fitted_arcsec=fitted,
            chi2=minimum.chi2,
            parameters=len(minimum.free),
        )

    def _launch_radius(self, values: FloatArray) -> float:
        if not self.anchored:
            return float(values[RADIUS])
        return max(float(values[RADIUS] * (1.0 - values[SHARE] ** 2)), 0.0)

    def _launch_motion(self, values: FloatArray) -> float:
        if not self.anchored:
            return float(values[MOTION] * values[SHARE])
        # From rest where it was accelerated, else with the speed it has.
        return 0.0 if values[SHARE] < 1.0 else float(values[MOTION] * values[SHARE])

    def _launch(self, values: FloatArray) -> float:
        """Launch of cycle 0: at the launch radius, or without one from rest, or at zero radius."""
        if not self.anchored:
            return float(values[TIME])
        radius, share, motion = (float(values[place]) for place in (RADIUS, SHARE, MOTION))
        if share >= 1.0:
            return float(values[TIME]) - radius / (share * motion)
        rest = radius * (1.0 - share**2)
        return float(values[TIME]) - float(travel_time(radius, rest, 0.0, motion))


def _refuse_unknown(
    errors: RadiusErrors,
    period: Sided | None,
    launch_radius: Sided | None,
    launch_time: Sided | None,
    innermost_arcsec: float,
) -> None:
    named = (("period", period), ("launch radius", launch_radius), ("launch time", launch_time))
    unknown = [name for name, sided in named if sided is not None and not sided.known]
    if not errors.known:
        unknown.insert(0, "radii")
    if unknown:
        raise InputRefused(
            f"Acceleration cannot be judged: no error is known of {', '.join(unknown)}.",
            why="Whether a curve fits better than a line depends on the errors.",
            hint='Give each radius with its error, such as "1.20±0.05 arcsec".',
            code="error-unknown",
        )
    if launch_radius is not None and not 0.0 < launch_radius.value <= innermost_arcsec:
        raise InputRefused(
            f"A launch radius of {launch_radius.value:g} arcsec is not inside the innermost shell, "
            f"{innermost_arcsec:g} arcsec.",
            why="Dust is launched at or inside the smallest radius at which it is seen.",
            hint="Check the launch radius and the distance that turns it into an angle.",
            code="launch-radius-refused",
            details={"launch_radius_arcsec": launch_radius.value, "innermost_arcsec": innermost_arcsec},
        )
