"""What the imaginary network knows: estimates scattered about the truth by their stated errors."""

from __future__ import annotations

import math
from collections.abc import Mapping
from typing import Literal

import numpy as np

from campaign.model.instants import Moment
from campaign.model.measured import Covariance, Limit, Measured
from campaign.model.records import SystemRecord
from campaign.model.systems import DatedEvent, DustRule, Episode, Solution, Star, System

from .instants import AS_OF_BMJD_TDB, DAYS_PER_YEAR, year_to_bmjd
from .spec import Error, RuleSpec, SolutionSpec, StarSpec, SystemSpec
from .truth import SystemTruth

_JD_OF_MJD = 2_400_000.5


def decimals_of(minus: float, plus: float) -> int:
    """Decimals that print an error with two figures."""
    return max(0, 1 - math.floor(math.log10(min(minus, plus))))


def scatter(truth: float, error: Error, z: float, unstated: float = 0.0) -> Measured:
    """An estimate ``z`` sigma from the truth (positive: too high), rounded as people print it."""
    if error is None:
        return Measured(round(truth + z * unstated, 0 if unstated >= 1.0 else 3))
    minus, plus = error if isinstance(error, tuple) else (error, error)
    # An estimate that is too high has the truth below it, at the distance of its lower error.
    value = truth + z * (minus if z > 0.0 else plus)
    return Measured(round(value, decimals_of(minus, plus)), minus, plus)


def moment_of(estimate: Measured) -> Moment:
    """An epoch as it would have been typed: BJD with its errors."""
    minus, plus = estimate.minus, estimate.plus
    decimals = 1 if minus is None or plus is None else max(1, min(decimals_of(minus, plus), 3))
    julian = f"{estimate.value + _JD_OF_MJD:.{decimals}f}"
    if minus is None or plus is None:
        text = f"BJD {julian}"
    elif minus == plus:
        text = f"BJD {julian}±{minus:g}"
    else:
        text = f"BJD {julian} +{plus:g} -{minus:g}"
    return Moment(round(float(julian) - _JD_OF_MJD, 6), minus, plus, text)


def make_record(
    seed: int, spec: SystemSpec, truth: SystemTruth, first_solution_id: int, first_episode_id: int
) -> SystemRecord:
    """Everything known of one system at the sample's date."""
    rng = np.random.default_rng([seed, truth.system_id, 2])
    solutions = tuple(
        _make_solution(rng, first_solution_id + n, one, truth) for n, one in enumerate(spec.solutions)
    )
    rule = _make_rule(rng, spec.rule, spec, truth) if spec.rule is not None else None
    episodes = _make_episodes(rng, spec, truth, first_episode_id)
    return SystemRecord(
        _make_system(rng, spec, truth, _anchor(solutions, episodes)), solutions, rule, episodes
    )


def _anchor(
    solutions: tuple[Solution, ...], episodes: tuple[Episode, ...]
) -> tuple[float | None, float | None]:
    """Where cycle 0 is counted from, and by which period.

    The first adopted epoch, else the onset that is called cycle 0, which has no period.
    """
    for solution in solutions:
        if solution.adopted and solution.epoch is not None and solution.epoch_cycle == 0:
            period = solution.period_d.value if isinstance(solution.period_d, Measured) else None
            return solution.epoch.bmjd_tdb, period
    for episode in episodes:
        if episode.cycle == 0 and episode.onset is not None:
            return episode.onset.moment.bmjd_tdb, None
    return None, None


def _true_quantities(spec: SolutionSpec, truth: SystemTruth) -> dict[str, float]:
    elements = truth.elements
    cycle = truth.cycle(spec.epoch_cycle)
    marked = {"onset": cycle.onset_bmjd_tdb, "maximum": cycle.maximum_bmjd_tdb}.get(spec.epoch_marks)
    turn = 180.0 if spec.omega_of == "A" else 0.0
    return {
        "period_d": elements.period_d,
        "epoch": cycle.periastron_bmjd_tdb if marked is None else marked,
        "eccentricity": elements.eccentricity,
        "omega_deg": (elements.omega_b_deg + turn) % 360.0,
        "inclination_deg": elements.inclination_deg,
        "node_deg": elements.node_deg,
        "k_a_kms": elements.k_a_kms,
        "k_b_kms": elements.k_b_kms,
        "gamma_kms": elements.gamma_kms,
        "a_au": elements.a_au,
        "a_arcsec": elements.a_arcsec,
    }


def _make_solution(rng: np.random.Generator, number: int, spec: SolutionSpec, truth: SystemTruth) -> Solution:
    true = _true_quantities(spec, truth)
    z = dict(zip(true, rng.normal(size=len(true)).tolist(), strict=True))
    covariance = None
    if spec.correlated is not None:
        first, second, rho = spec.correlated
        z[second] = rho * z[first] + math.sqrt(1.0 - rho**2) * z[second]
        covariance = _covariance(spec.errors, first, second, rho)
    z = {name: max(-spec.calm, min(spec.calm, value)) for name, value in z.items()} | dict(spec.pull)
    estimates = {
        name: scatter(true[name], error, z[name], spec.unstated.get(name, 0.0))
        for name, error in spec.errors.items()
    }
    period: Measured | Limit | None = estimates.get("period_d")
    if spec.period_limit_yr is not None:
        period = Limit(spec.period_limit_yr * DAYS_PER_YEAR, "above")
    return Solution(
        id=number,
        system_id=truth.system_id,
        label=spec.label,
        period_d=period,
        epoch=moment_of(estimates["epoch"]),
        epoch_marks=spec.epoch_marks,
        eccentricity=estimates.get("eccentricity"),
        omega_deg=estimates.get("omega_deg"),
        omega_of=spec.omega_of if "omega_deg" in estimates else None,
        inclination_deg=estimates.get("inclination_deg"),
        node_deg=estimates.get("node_deg"),
        k_a_kms=estimates.get("k_a_kms"),
        k_b_kms=estimates.get("k_b_kms"),
        gamma_kms=estimates.get("gamma_kms"),
        a_au=estimates.get("a_au"),
        a_arcsec=estimates.get("a_arcsec"),
        covariance=covariance,
        source=spec.source,
        data_until_bmjd_tdb=round(year_to_bmjd(spec.until_yr), 1),
        adopted=spec.adopted,
        weight=spec.weight,
        epoch_cycle=spec.epoch_cycle,
        published_cycle_offset=spec.published_cycle_offset,
        note=spec.note,
    )


def _covariance(errors: Mapping[str, Error], first: str, second: str, rho: float) -> Covariance:
    one, two = errors[first], errors[second]
    assert isinstance(one, float) and isinstance(two, float)
    return Covariance((first, second), ((one**2, rho * one * two), (rho * one * two, two**2)))


def _make_rule(rng: np.random.Generator, spec: RuleSpec, system: SystemSpec, truth: SystemTruth) -> DustRule:
    dust = system.dust
    true = {
        "onset": dust.onset,
        "maximum": dust.maximum,
        "end": dust.end,
        "critical_separation_au": truth.critical_separation_au or 0.0,
        "condensation_distance_au": dust.condensation_distance_au,
        "flow_speed_kms": dust.flow_speed_kms,
    }
    calm = min((one.calm for one in system.solutions), default=2.5)
    z = np.clip(rng.normal(size=len(true)), -calm, calm).tolist()
    estimates = {
        name: scatter(true[name], spec.errors[name], deviate)
        for name, deviate in zip(true, z, strict=True)
        if name in spec.errors
    }
    return DustRule(
        id=truth.system_id,
        system_id=truth.system_id,
        kind=spec.kind,
        scatter_onset_d=spec.scatter_onset_d,
        scatter_maximum_d=spec.scatter_maximum_d,
        scatter_end_d=spec.scatter_end_d,
        note=spec.note,
        **estimates,
    )


def _make_episodes(
    rng: np.random.Generator, spec: SystemSpec, truth: SystemTruth, first_id: int
) -> tuple[Episode, ...]:
    episodes: list[Episode] = []
    for number in sorted({*spec.confirmed, *spec.proposed, *spec.rejected}):
        cycle = truth.cycle(number)
        z = np.clip(rng.normal(size=3), -2.5, 2.5).tolist()
        spread = 0.8 + 0.5 * float(rng.random())
        if number in spec.rejected:
            # What looked like an onset of this star was a neighbour's brightening.
            dates: tuple[float | None, ...] = (cycle.periastron_bmjd_tdb + 20.0, None, None)
        else:
            dates = (cycle.onset_bmjd_tdb, cycle.maximum_bmjd_tdb, cycle.end_bmjd_tdb)
        if dates[0] is None:
            continue
        old = 1.5 if dates[0] < year_to_bmjd(2001.0) else 1.0
        stages = [
            _date(date, spec.dating_d[n] * spread * old, z[n], method, lopsided=n == 0 and number % 3 == 1)
            for n, (date, method) in enumerate(zip(dates, _METHODS, strict=True))
        ]
        episodes.append(
            Episode(
                id=first_id + len(episodes),
                system_id=truth.system_id,
                cycle=None if spec.state == "candidate" else number,
                state=_state(spec, number),
                onset=stages[0],
                maximum=stages[1],
                end=stages[2],
                source=f"Cold Mesa episode sheet {truth.system_id:02d}",
                note="A neighbour in the beam." if number in spec.rejected else "",
            )
        )
    return tuple(episodes)


def _state(spec: SystemSpec, cycle: int) -> Literal["proposed", "confirmed", "rejected"]:
    if cycle in spec.rejected:
        return "rejected"
    return "confirmed" if cycle in spec.confirmed else "proposed"


_METHODS = ("broken line in flux", "parabola through the top", "broken line in flux")


def _date(date: float | None, sigma_d: float, z: float, method: str, lopsided: bool) -> DatedEvent | None:
    """A dated stage, or None when it had not happened by the sample's date."""
    if date is None or date > AS_OF_BMJD_TDB:
        return None
    sigma_d = float(f"{sigma_d:.2g}")
    # The rise came out of a gap: the onset may have been much earlier than the first bright point says.
    error: Error = (float(f"{1.8 * sigma_d:.2g}"), sigma_d) if lopsided else sigma_d
    estimate = scatter(date, error, z)
    if estimate.value >= AS_OF_BMJD_TDB:
        estimate = scatter(date, error, -abs(z))
    return DatedEvent(moment_of(estimate), "K", method)


def _make_system(
    rng: np.random.Generator,
    spec: SystemSpec,
    truth: SystemTruth,
    anchor: tuple[float | None, float | None],
) -> System:
    elements = truth.elements
    z = np.clip(rng.normal(size=3), -2.0, 2.0).tolist()
    distance, parallax = None, None
    if spec.by_parallax:
        parallax = scatter(1000.0 / elements.distance_pc, spec.distance_error, z[0])
    else:
        distance = scatter(elements.distance_pc, spec.distance_error, 0.8 * z[0], unstated=200.0)
    return System(
        id=truth.system_id,
        name=spec.name,
        ra_deg=spec.ra_deg,
        dec_deg=spec.dec_deg,
        position_epoch_jyr=2000.0,
        pm_ra_cosdec_mas_yr=round(-2.0 + 1.5 * z[1], 2),
        pm_dec_mas_yr=round(-1.0 + 1.5 * z[2], 2),
        distance_pc=distance,
        parallax_mas=parallax,
        state=spec.state,
        priority=spec.priority,
        notes=f"Invented. {spec.story}" + (f" {spec.notes}" if spec.notes else ""),
        aliases=spec.aliases,
        star_a=_make_star(rng, "A", spec.star_a, elements.mass_a_msun, spec.stars_known),
        star_b=_make_star(rng, "B", spec.star_b, elements.mass_b_msun, spec.stars_known),
        cycle_anchor_bmjd_tdb=anchor[0],
        cycle_anchor_period_d=anchor[1],
    )


def _make_star(rng: np.random.Generator, letter: str, spec: StarSpec, mass_msun: float, known: bool) -> Star:
    z = np.clip(rng.normal(size=6), -2.0, 2.0).tolist()
    speed = scatter(spec.wind_speed_kms, 100.0, z[1])
    if not known:
        return Star(letter, spec.spectral_type, wind_speed_kms=speed)  # type: ignore[arg-type]
    rate_error = 0.3 * spec.mass_loss_msun_yr
    return Star(
        letter,  # type: ignore[arg-type]
        spec.spectral_type,
        mass_msun=scatter(mass_msun, 1.5, z[0]),
        luminosity_lsun=scatter(spec.luminosity_lsun, 3.0e4, z[2]),
        temperature_k=scatter(spec.temperature_k, 2500.0, z[3]),
        radius_rsun=scatter(spec.radius_rsun, 0.6, z[4]),
        mass_loss_msun_yr=scatter(spec.mass_loss_msun_yr, rate_error, z[5]),
        wind_speed_kms=speed,
    )
