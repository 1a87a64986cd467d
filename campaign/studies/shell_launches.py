"""Dated shells against the ephemeris: the cycle of each, the phase of its launch, the production window."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from campaign.model.shells import DatedShell, ForeseenShell, ShellTension
from campaign.physics.shellcycles import phase_of_launch
from campaign.physics.shelltension import HIGH_SIGMA
from campaign.physics.timescales import utc_iso
from campaign.studies.shell_ephemeris import ShellEphemeris
from campaign.studies.shell_fitting import Ages
from campaign.studies.shell_images import YEAR_D, RadiusGroup, years_of
from campaign.studies.shell_relations import none_if_nan

# Cycles on either side of the nearest that are weighed against each other.
_NEIGHBOURS = 2
# A count with less than this probability is warned of.
_SURE = 0.95


@dataclass(frozen=True, slots=True)
class Anchored:
    """What to add to relative cycles to get the system's own, and how sure that is; None: nothing says so."""

    shift: int | None
    probability: float | None = None
    warnings: tuple[str, ...] = ()
    not_told: tuple[str, ...] = ()


def rows_of(group: RadiusGroup, index: Sequence[float], ages: Ages) -> list[DatedShell]:
    """One row a radius: what was measured, fitted, and how old it is.

    Parameters
    ----------
    group : RadiusGroup
        Radii, arcsec.
    index : sequence of float
        Index of each (dimensionless).
    ages : Ages
        yr before the image, periods; fitted radii arcsec.

    Returns
    -------
    list of DatedShell
        In the order of the group; launches ``bmjd_tdb`` where the image is dated.

    Notes
    -----
    Accuracy: the error of the image's date adds to that of the launch. Source: launch = image - age.
    """
    rows = []
    for place, radius in enumerate(group.radii):
        yr = None if ages.yr is None else ages.yr.at(place)
        turns = None if ages.periods is None else ages.periods.at(place)
        launched, sigma_d = None, None
        if yr is not None and radius.bmjd_tdb is not None:
            launched = radius.bmjd_tdb - yr.value * YEAR_D
            sigma_d = none_if_nan(float(np.hypot(yr.sigma * YEAR_D, radius.bmjd_sigma_d or 0.0)))
        rows.append(
            DatedShell(
                index=float(index[place]),
                radius_arcsec=float(group.radius_arcsec[place]),
                sigma_arcsec=none_if_nan(float(group.errors.sigma_arcsec[place])),
                image_bmjd_tdb=radius.bmjd_tdb,
                fitted_radius_arcsec=none_if_nan(float(ages.fitted_arcsec[place])),
                residual_sigma=none_if_nan(float(ages.residual_sigma[place])),
                age_yr=None if yr is None else yr.value,
                age_sigma_yr=None if yr is None else none_if_nan(yr.sigma),
                age_lo68_yr=None if yr is None else none_if_nan(yr.lo68),
                age_hi68_yr=None if yr is None else none_if_nan(yr.hi68),
                age_lo95_yr=None if yr is None else none_if_nan(yr.lo95),
                age_hi95_yr=None if yr is None else none_if_nan(yr.hi95),
                launched_bmjd_tdb=launched,
                launched_sigma_d=sigma_d,
                feature=group.label or None,
                observation_id=radius.observation_id,
                age_periods=None if turns is None else turns.value,
                age_periods_sigma=None if turns is None else none_if_nan(turns.sigma),
                stated_index=radius.index,
                position_angle_deg=None
                if radius.position_angle_deg is None
                else radius.position_angle_deg.value,
            )
        )
    instants = utc_iso([np.nan if r.launched_bmjd_tdb is None else r.launched_bmjd_tdb for r in rows])
    return [replace(row, launched_utc=text) for row, text in zip(rows, instants, strict=True)]


def anchor(shells: Sequence[DatedShell], cycles: Sequence[int], ephemeris: ShellEphemeris | None) -> Anchored:
    """Which of the system's cycles the shells belong to, from the best dated of them.

    Parameters
    ----------
    shells : sequence of DatedShell
        With launches ``bmjd_tdb``.
    cycles : sequence of int
        Their relative cycles (dimensionless).
    ephemeris : ShellEphemeris or None
        Launches of the system's cycles.

    Returns
    -------
    Anchored
        Posterior over the neighbouring cycles, each taken as likely beforehand.

    Notes
    -----
    The errors of a fit are common to its shells, so that the best dated speaks for all.
    Accuracy: normal errors. Source: Bayes' rule with a flat prior over cycles.
    """
    dated = [(s, c) for s, c in zip(shells, cycles, strict=True) if s.launched_bmjd_tdb is not None]
    if ephemeris is None or not dated:
        return Anchored(None)
    shell, relative = min(
        dated, key=lambda each: np.inf if each[0].launched_sigma_d is None else each[0].launched_sigma_d
    )
    assert shell.launched_bmjd_tdb is not None
    near = ephemeris.youngest(shell.launched_bmjd_tdb)
    if near is None:
        return Anchored(None, not_told=("nothing dates the system's cycles when the shells were launched",))
    found: dict[int, tuple[float, float]] = {}
    for cycle in range(near[0] - _NEIGHBOURS, near[0] + _NEIGHBOURS + 1):
        launch = ephemeris.launch(cycle)
        if launch is not None and np.isfinite(launch.median_d):
            sigma = np.hypot(launch.sigma_d or 0.0, shell.launched_sigma_d or 0.0)
            found[cycle] = (shell.launched_bmjd_tdb - launch.median_d, max(float(sigma), 1e-6))
    best = min(found, key=lambda cycle: abs(found[cycle][0]))
    # An error that nobody knows is not zero: the nearest cycle is then taken, without a probability.
    known = shell.launched_sigma_d is not None and all(ephemeris.has_error(cycle) for cycle in found)
    logs = {cycle: -0.5 * (d / s) ** 2 - np.log(s) for cycle, (d, s) in found.items()}
    top = max(logs.values())
    weights = {cycle: float(np.exp(log - top)) for cycle, log in logs.items()}
    if known:
        best = max(weights, key=lambda cycle: weights[cycle])
    chance = weights[best] / sum(weights.values()) if known else None
    warnings = []
    if chance is not None and chance < _SURE:
        second = max((c for c in weights if c != best), key=lambda c: weights[c])
        warnings.append(
            f"the count of cycles is not certain: {chance:.0%} as shown, "
            f"{weights[second] / sum(weights.values()):.0%} that each shell is {_away(second - best)}"
        )
    return Anchored(best - relative, chance, tuple(warnings))


def _away(cycles: int) -> str:
    count = "one cycle" if abs(cycles) == 1 else f"{abs(cycles)} cycles"
    return f"{count} {'later' if cycles > 0 else 'earlier'}"


def against_ephemeris(
    shells: Sequence[DatedShell], cycles: Sequence[int], anchored: Anchored, ephemeris: ShellEphemeris | None
) -> list[DatedShell]:
    """Cycle and phase of each launch, and how far it lies from the middle of the production window.

    Parameters
    ----------
    shells : sequence of DatedShell
        With launches ``bmjd_tdb``.
    cycles : sequence of int
        Their relative cycles (dimensionless).
    anchored : Anchored
        From ``anchor``.
    ephemeris : ShellEphemeris or None
        Launches and periastra.

    Returns
    -------
    list of DatedShell
        The same, with what the ephemeris says; unchanged without one.

    Notes
    -----
    Accuracy: first order in the errors.

    Source: DEVELOPERS.md (Shells): half the width of the window is counted as error.
    """
    if anchored.shift is None or ephemeris is None:
        return list(shells)
    found = []
    for shell, relative in zip(shells, cycles, strict=True):
        if not float(shell.index).is_integer():
            found.append(shell)
            continue
        cycle = relative + anchored.shift
        phase, phase_sigma = _phase(shell, cycle, ephemeris)
        found.append(
            replace(
                shell,
                cycle=cycle,
                cycle_probability=anchored.probability,
                phase=phase,
                phase_sigma=phase_sigma,
                window_sigma=_window_sigma(shell, cycle, ephemeris),
            )
        )
    return found


def _phase(shell: DatedShell, cycle: int, ephemeris: ShellEphemeris) -> tuple[float | None, float | None]:
    periastron, period = ephemeris.periastron(cycle), ephemeris.period_yr
    if shell.launched_bmjd_tdb is None or periastron is None or period is None:
        return None, None
    period_d = period.value * YEAR_D
    phase = float(
        phase_of_launch(years_of(shell.launched_bmjd_tdb), years_of(periastron.bmjd_tdb), period.value)
    )
    if shell.launched_sigma_d is None or periastron.sigma_d is None:
        return phase, None
    return phase, float(np.hypot(shell.launched_sigma_d, periastron.sigma_d)) / period_d


def _window_sigma(shell: DatedShell, cycle: int, ephemeris: ShellEphemeris) -> float | None:
    launch = ephemeris.launch(cycle)
    if launch is None or launch.sigma_d is None or not np.isfinite(launch.median_d):
        return None
    if shell.launched_bmjd_tdb is None or shell.launched_sigma_d is None:
        return None
    size = float(np.hypot(launch.sigma_d, shell.launched_sigma_d))
    return (shell.launched_bmjd_tdb - launch.median_d) / size if size > 0.0 else None


def launch_tension(shells: Sequence[DatedShell], ephemeris: ShellEphemeris | None) -> ShellTension | None:
    """The best dated launch against its production window, as one tension for all shells.

    Parameters
    ----------
    shells : sequence of DatedShell
        After ``against_ephemeris``; launches ``bmjd_tdb``.
    ephemeris : ShellEphemeris or None
        Launches of the system's cycles.

    Returns
    -------
    ShellTension or None
        Values are instants, ``bmjd_tdb``; None where nothing can be compared.

    Notes
    -----
    Accuracy: the errors of the fit and the width of the window are common to the shells, so that more of
    them make it no more certain.

    Source: DEVELOPERS.md (Disagreement).
    """
    compared = [s for s in shells if s.cycle is not None and s.launched_bmjd_tdb is not None]
    if ephemeris is None or not compared:
        return None
    shell = min(compared, key=lambda s: np.inf if s.launched_sigma_d is None else s.launched_sigma_d)
    assert shell.cycle is not None and shell.launched_bmjd_tdb is not None
    launch = ephemeris.launch(shell.cycle)
    if launch is None or not np.isfinite(launch.median_d):
        return None
    against = {
        "window": "middle of the production window",
        "periastron": "periastron, for want of a dust rule",
    }.get(launch.basis, f"{launch.basis}, whose window is not known")
    return ShellTension(
        quantity="launch",
        determined_from=f"shell of cycle {shell.cycle}",
        against=against,
        sigma=shell.window_sigma,
        value=shell.launched_bmjd_tdb,
        against_value=launch.median_d,
        reasons=_launch_reasons(shell.window_sigma),
    )


def _launch_reasons(sigma: float | None) -> tuple[str, ...]:
    """What would explain launches that lie far from the window."""
    if sigma is None or abs(sigma) < HIGH_SIGMA:
        return ()
    if sigma > 0.0:
        return (
            "acceleration: dust that started slowly is older than its radius over its motion",
            "the dust rule or the ephemeris puts the window too early",
        )
    return (
        "radii at the outer edge of shells, or a scale that is too large, make them seem older",
        "the dust rule or the ephemeris puts the window too late",
    )


def foreseen_in(
    shells: Sequence[DatedShell],
    motion_mas_yr: float | None,
    ephemeris: ShellEphemeris | None,
) -> tuple[ForeseenShell, ...]:
    """Shells that should stand in each image, down to the oldest that was measured in any.

    Parameters
    ----------
    shells : sequence of DatedShell
        After ``against_ephemeris``.
    motion_mas_yr : float or None
        Motion of the shells, mas/yr.
    ephemeris : ShellEphemeris or None
        Launches of the system's cycles.

    Returns
    -------
    tuple of ForeseenShell
        Radii arcsec, ages yr; empty without an ephemeris or a motion.

    Notes
    -----
    Accuracy: of the medians. Source: r = mu (t - launch).
    """
    counted = [s for s in shells if s.cycle is not None and s.image_bmjd_tdb is not None]
    if ephemeris is None or motion_mas_yr is None or not counted:
        return ()
    oldest = min(s.cycle for s in counted if s.cycle is not None)
    measured = {(s.image_bmjd_tdb, s.cycle) for s in counted}
    found = []
    for image in sorted({s.image_bmjd_tdb for s in counted if s.image_bmjd_tdb is not None}):
        youngest = ephemeris.youngest(image)
        for cycle in range(youngest[0], oldest - 1, -1) if youngest is not None else ():
            launch = ephemeris.launch(cycle)
            if launch is None or not np.isfinite(launch.median_d):
                continue
            age = (image - launch.median_d) / YEAR_D
            radius = motion_mas_yr * age / 1000.0
            found.append(ForeseenShell(image, cycle, age, radius, (image, cycle) in measured))
    return tuple(found)


def unmeasured_in_words(foreseen: Sequence[ForeseenShell]) -> list[str]:
    """Which shells should stand in an image, by the ephemeris, and were not measured there.

    Parameters
    ----------
    foreseen : sequence of ForeseenShell
        Radii arcsec.

    Returns
    -------
    list of str
        One sentence an image; none where all were measured.

    Notes
    -----
    Accuracy: of the medians. Source: project convention.
    """
    by_image: dict[float, list[str]] = {}
    for one in foreseen:
        if not one.measured and one.image_bmjd_tdb is not None:
            by_image.setdefault(one.image_bmjd_tdb, []).append(
                f"cycle {one.cycle} at {one.radius_arcsec:.2f} arcsec"
            )
    days = [(utc_iso([image])[0] or "")[:10] for image in by_image]
    return [
        f"expected in the image of {day} and not measured: {', '.join(shells)}"
        for day, shells in zip(days, by_image.values(), strict=True)
    ]
