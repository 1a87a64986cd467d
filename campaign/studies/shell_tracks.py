"""The way of every shell of a system: from where it was measured, or from the launch of its episode."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from campaign.errors import Conflict
from campaign.model.measured import Measured
from campaign.model.shellquestion import ExpectQuestion, ShellQuestion
from campaign.model.shells import ShellQuantity
from campaign.physics.draws import stratified_normals
from campaign.physics.shellmotion import MOTION, RADIUS, SPACING, MotionFit
from campaign.physics.shellnetwork import ShellInput
from campaign.physics.shellvalues import Uncertain
from campaign.studies.sampling import DEFAULT_DRAWS
from campaign.studies.shell_ephemeris import ShellEphemeris
from campaign.studies.shell_fitting import ages_of, best_motion
from campaign.studies.shell_images import YEAR_D, bmjd_of, years_of
from campaign.studies.shell_launches import anchor, rows_of
from campaign.studies.shell_projection import true_quantities
from campaign.studies.shell_relations import (
    Stated,
    shell_quantities,
    solve,
    stated_inputs,
    with_wind_if_needed,
)
from campaign.studies.shell_solving import SolvedShells, solve_shells
from campaign.studies.shell_subject import ShellSubject, forecaster_of, radii_of, seed_of

FloatArray = NDArray[np.float64]

FLOW = "flow"
# How far from the measured cycles the clock of the shells is carried where no ephemeris counts on.
_FARTHEST = 200


@dataclass(frozen=True, slots=True)
class ShellTrack:
    """One shell growing at one speed: radius ``base_arcsec`` (draws) at ``base_d`` (draws, ``bmjd_tdb``).

    A radius below zero is that of a shell not launched yet; NaN stands in draws without an episode.
    ``missing`` names the errors that nobody knows.
    """

    cycle: int | None
    base_d: FloatArray
    base_arcsec: FloatArray
    motion_mas_yr: float
    motion_sigma_mas_yr: float
    motion_draws: FloatArray
    launch_d: float
    launch_sigma_d: float | None
    missing: tuple[str, ...] = ()

    def radius_draws(self, at: float) -> FloatArray:
        """Radii at an instant, arcsec; NaN where the shell is not launched."""
        grown = self.base_arcsec + self.motion_draws * (at - self.base_d) / YEAR_D / 1000.0
        with np.errstate(invalid="ignore"):
            launched: FloatArray = np.where(grown > 0.0, grown, np.nan)
        return launched

    def median_radius(self, at: float) -> float:
        """Median radius of the draws in which it is launched, arcsec."""
        if self.missing:
            # The draws lack what nobody knows: only their middle is told.
            return max(0.0, self.motion_mas_yr * (at - self.launch_d) / YEAR_D / 1000.0)
        drawn = self.radius_draws(at)
        return float(np.nanmedian(drawn)) if np.isfinite(drawn).any() else 0.0

    def launched_share(self, at: float) -> float:
        """Probability that it is launched by an instant (dimensionless); 0 or 1 where an error is unknown."""
        if self.missing:
            return float(self.launch_d <= at)
        return float(np.mean(np.isfinite(self.radius_draws(at))))

    def reaches(self, limit_arcsec: float) -> FloatArray:
        """Draws of the instant at which the radius is ``limit_arcsec``, ``bmjd_tdb``."""
        way = limit_arcsec - self.base_arcsec
        dates: FloatArray = self.base_d + 1000.0 * way / self.motion_draws * YEAR_D
        return dates


@dataclass(slots=True)
class ShellTracks:
    """Tracks by cycle, made when asked for, and what they rest on."""

    track: Callable[[int], ShellTrack | None]
    newest: Callable[[float], int | None]
    quantities: tuple[ShellQuantity, ...]
    assumptions: tuple[str, ...] = ()
    warnings: tuple[str, ...] = ()


def tracks_of(subject: ShellSubject, question: ExpectQuestion) -> ShellTracks:
    """Tracks of a system's shells from logged radii, ephemeris and whatever says how fast they move.

    Parameters
    ----------
    subject : ShellSubject
        The system.
    question : ExpectQuestion
        ``as_of`` in ``bmjd_tdb``; stated quantities in the units of their names (mas/yr, km/s, yr, pc).

    Returns
    -------
    ShellTracks
        arcsec, mas/yr, ``bmjd_tdb``.

    Raises
    ------
    Conflict
        When nothing says how fast the shells move, or nothing dates the system's episodes.

    Notes
    -----
    A shell that was measured, and every older one, goes on from the fit to the radii; a younger one starts at
    the middle of its production window. A stated motion or speed stands in place of the radii.
    Accuracy: draws.

    Source: r = mu (t - launch).
    """
    seed, draws = seed_of(question.seed), question.draws or DEFAULT_DRAWS
    forecaster = forecaster_of(subject.record, question.as_of_bmjd_tdb, draws, question.seed)
    ephemeris = ShellEphemeris(forecaster, seed)
    period = None if ephemeris.period_yr is None else (ephemeris.period_yr, ephemeris.period_from)
    stated = stated_inputs(question.stated, {}, subject, period)
    radii = radii_of(o for o in subject.observations if o.moment.bmjd_tdb <= question.as_of_bmjd_tdb)
    moves = {"proper_motion_mas_yr", "speed_kms"} & question.stated.keys()
    asked = ShellQuestion(stated=question.stated, draws=draws, seed=question.seed)
    solved = solve_shells(radii, stated, ephemeris, asked, subject.record) if radii and not moves else None
    base = None if solved is None else _measured_base(solved, ephemeris, seed, draws)
    if solved is not None and base is not None:
        return _measured_tracks(solved, base, ephemeris, question.on_bmjd_tdb)
    return _launched_tracks(_with_flow(stated, subject), subject, ephemeris, question)


# ------------------------------------------------------------------------------------------- not measured


def _with_flow(stated: Stated, subject: ShellSubject) -> Stated:
    """The flow speed of the dust rule, else the wind of star A, where nothing stated gives a motion."""
    rule = subject.record.rule
    if stated.get("proper_motion_mas_yr") is not None or stated.get("speed_kms") is not None:
        return stated
    if rule is None or rule.flow_speed_kms is None:
        return with_wind_if_needed(stated)
    flow = rule.flow_speed_kms
    given = ShellInput("speed_kms", flow.value, flow.minus, flow.plus, FLOW)
    said = "no shell tells its motion: they are taken to move with the flow speed of the dust rule"
    return Stated((*stated.inputs, given), stated.correlations, (*stated.assumptions, said))


def _launched_tracks(
    stated: Stated, subject: ShellSubject, ephemeris: ShellEphemeris, question: ExpectQuestion
) -> ShellTracks:
    name = subject.record.system.name
    solution = solve(stated, question.draws, question.seed)
    motion = solution.uncertain("proper_motion_mas_yr")
    if motion is None:
        raise Conflict(
            f"Nothing says how fast the shells of {name} move.",
            why="It takes logged radii of several images, or a speed and a distance.",
            hint='For example --motion "80±5 mas/yr", or --speed "1800±100 km/s" --distance "2.1±0.2 kpc".',
            code="motion-unknown",
        )
    if ephemeris.period_yr is None or ephemeris.youngest(question.on_bmjd_tdb) is None:
        raise Conflict(
            f"No episode of {name} can be dated near that date.",
            why="It has no period, or its phase is lost by then.",
            hint="Add an orbit or dated episodes: campaign solution add, campaign episodes add.",
            code="no-ephemeris",
        )
    found = _Launched(ephemeris, motion)
    said = (_launched_at(ephemeris, question.on_bmjd_tdb), *_said(ephemeris))
    return ShellTracks(found.track, found.newest, shell_quantities(solution), (*stated.assumptions, *said))


@dataclass(frozen=True, slots=True)
class _Launched:
    """Tracks that start at the production windows of an ephemeris."""

    ephemeris: ShellEphemeris
    motion: Uncertain

    def track(self, cycle: int) -> ShellTrack | None:
        launch = self.ephemeris.launch(cycle)
        if launch is None or not np.isfinite(launch.median_d):
            return None
        unknown = np.isnan(self.motion.draws).any()
        drawn = np.full(launch.spread_d.size, self.motion.value) if unknown else self.motion.draws
        return ShellTrack(
            cycle=cycle,
            base_d=launch.spread_d,
            base_arcsec=np.zeros(launch.spread_d.size),
            motion_mas_yr=self.motion.value,
            motion_sigma_mas_yr=self.motion.sigma,
            motion_draws=drawn,
            launch_d=launch.median_d,
            launch_sigma_d=launch.sigma_d,
            missing=(*launch.missing, *(("motion of the shells",) if unknown else ())),
        )

    def newest(self, at: float) -> int | None:
        found = self.ephemeris.youngest(at)
        return None if found is None else found[0]


def _launched_at(ephemeris: ShellEphemeris, at: float, whose: str = "launches") -> str:
    """What the launches are taken from about a date, and which errors nobody knows."""
    found = ephemeris.youngest(at)
    launch = None if found is None else found[1]
    basis = "the middle of the production window" if launch is None else launch.in_words
    said = f"{whose} at {basis}"
    if launch is not None and launch.missing:
        return f"{said}, without error: not known are {', '.join(launch.missing)}"
    return f"{said}, half its width counted as error"


def _said(ephemeris: ShellEphemeris) -> tuple[str, ...]:
    several = len(ephemeris.forecaster.units[0].rows) > 1
    period = f"the period is that of the {'orbit' if ephemeris.period_from == 'orbit' else 'dated episodes'}"
    return (
        f"{period}, of several adopted solutions the one of the largest weight" if several else period,
        "the shells keep their speed",
        "radii are those of the limb",
    )


# ------------------------------------------------------------------------------------------- measured


@dataclass(frozen=True, slots=True)
class _Base:
    """Radii of the fit at one instant: that of relative cycle ``youngest``, and the spacing to older ones."""

    instant_d: float
    youngest: int
    radius_draws: FloatArray
    spacing_draws: FloatArray
    motion_draws: FloatArray
    motion_mas_yr: float
    shift: int | None
    newest_measured: int
    warnings: tuple[str, ...]


def _measured_base(solved: SolvedShells, ephemeris: ShellEphemeris, seed: int, draws: int) -> _Base | None:
    """Joint draws of the fit; None where the radii, with what is stated, give no motion."""
    main, motion = solved.main, solved.solution.uncertain("proper_motion_mas_yr")
    group = main.fit.group
    if motion is None or not group.dated or main.fit.fit is None or np.isnan(main.fit.fit.covariance).any():
        return None
    ages = ages_of(main.fit, solved.solution, solved.period, solved.agrees, seed)
    cycles = main.counted.cycle.tolist()
    anchored = anchor(rows_of(group, main.counted.index.tolist(), ages), cycles, ephemeris)
    if main.fit.motion is not None:
        best = best_motion(main.fit, solved.period, solved.agrees)
        if SPACING not in best.fit.names:
            return None
        radius, spacing, moving = _fit_draws(best, draws, seed)
        instant, youngest = best.pivot_yr, best.youngest or 0
        value = 1000.0 * best.fit.value(MOTION)
    else:
        fit = main.fit.spacing
        if fit is None or np.isnan(motion.draws).any():
            return None
        z = _normals(fit.covariance, draws, seed)
        spacing, radius = fit.values[0] + z[0], fit.values[1] + z[1]
        first = int(np.argmin(np.abs(main.counted.index - 1.0)))
        youngest = int(main.counted.cycle[first] + round(float(main.counted.index[first])) - 1)
        instant, moving, value = float(group.time_yr[0]), motion.draws, motion.value
    return _Base(
        bmjd_of(instant), youngest, radius, spacing, moving, value, anchored.shift, max(cycles),
        (*main.counted.warnings, *anchored.warnings),
    )  # fmt: skip


def _fit_draws(motion: MotionFit, draws: int, seed: int) -> tuple[FloatArray, FloatArray, FloatArray]:
    fit = motion.fit
    places = [fit.names.index(name) for name in (RADIUS, SPACING, MOTION)]
    z = _normals(fit.covariance[np.ix_(places, places)], draws, seed)
    values = fit.values[places]
    return values[0] + z[0], values[1] + z[1], 1000.0 * (values[2] + z[2])


def _normals(covariance: FloatArray, draws: int, seed: int) -> FloatArray:
    names = [f"shell fit {place}" for place in range(covariance.shape[0])]
    normals = np.array(list(stratified_normals(names, draws, seed).values()))
    drawn: FloatArray = np.linalg.cholesky(covariance) @ normals
    return drawn


def _measured_tracks(solved: SolvedShells, base: _Base, ephemeris: ShellEphemeris, at: float) -> ShellTracks:
    said = ["shells that were measured, and older ones, go on from the fit to their radii"]
    counted = base.shift is not None
    if counted:
        said += [_launched_at(ephemeris, at, "younger ones are launched"), *_said(ephemeris)[:2]]
    else:
        said += [
            "younger ones follow the clock of the shells themselves: nothing else dates them",
            "the shells keep their speed",
        ]
    motion = Uncertain(base.motion_mas_yr, float(np.std(base.motion_draws)), base.motion_draws)
    launched = _Launched(ephemeris, motion)

    def track(cycle: int) -> ShellTrack | None:
        relative = cycle - (base.shift or 0)
        if counted and relative > base.newest_measured:
            return launched.track(cycle)
        return _grown(base, relative, cycle if counted else None)

    def newest(at: float) -> int | None:
        if counted:
            return launched.newest(at)
        age_turns = np.median(base.radius_draws / base.spacing_draws)
        gone = base.motion_mas_yr * (at - base.instant_d) / YEAR_D / 1000.0 / np.median(base.spacing_draws)
        turns = int(np.floor(age_turns + gone))
        return base.youngest + turns if abs(turns) <= _FARTHEST else None

    return ShellTracks(
        track,
        newest,
        true_quantities(shell_quantities(solved.best), solved.main.seen, None),
        (*solved.stated.assumptions, *said, solved.main.seen.statement),
        base.warnings,
    )


def _grown(base: _Base, relative: int, cycle: int | None) -> ShellTrack:
    radius = base.radius_draws + (base.youngest - relative) * base.spacing_draws
    launches = base.instant_d - 1000.0 * radius / base.motion_draws * YEAR_D
    return ShellTrack(
        cycle=cycle,
        base_d=np.full(radius.size, base.instant_d),
        base_arcsec=radius,
        motion_mas_yr=base.motion_mas_yr,
        motion_sigma_mas_yr=float(np.std(base.motion_draws)),
        motion_draws=base.motion_draws,
        launch_d=float(np.median(launches)),
        launch_sigma_d=float(np.std(launches)),
    )


def motion_of_shells(subject: ShellSubject, as_of: float) -> tuple[Measured, str] | None:
    """The motion that logged radii tell, for a forecast.

    Parameters
    ----------
    subject : ShellSubject
        The system with its logged shells.
    as_of : float
        ``bmjd_tdb``; later radii are not looked at.

    Returns
    -------
    (Measured, str) or None
        mas/yr and what it is from; None where the radii do not tell, or tell no error.

    Notes
    -----
    Accuracy and source: see ``campaign.physics.shellmotion``.
    """
    radii = radii_of(o for o in subject.observations if o.moment.bmjd_tdb <= as_of)
    if not radii:
        return None
    ephemeris = ShellEphemeris(forecaster_of(subject.record, as_of, 1000), 1)
    period = None if ephemeris.period_yr is None else (ephemeris.period_yr, ephemeris.period_from)
    stated = stated_inputs({}, {}, subject, period)
    solved = solve_shells(radii, stated, ephemeris, ShellQuestion(draws=1000), subject.record)
    found = solved.solution.get("proper_motion_mas_yr")
    if found is None or np.isnan(found.spread.sigma) or any("wind" in key for key in found.basis):
        return None
    sigma = found.spread.sigma
    years = sorted({years_of(r.bmjd_tdb) for r in radii if r.bmjd_tdb is not None})
    span = f"{years[0]:.1f}" + (f" to {years[-1]:.1f}" if len(years) > 1 else "")
    return Measured(found.spread.value, sigma, sigma), f"motion of {len(radii)} logged radii, {span}"
