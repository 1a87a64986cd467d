"""Invented systems with fixed true elements and estimates scattered about them by their stated errors.

The truth is computed here by formulas of our own choosing (true anomaly by the orbit equation, scalar
``math``), never by the code under test.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from campaign.model.forecasts import EventName
from campaign.model.instants import Moment
from campaign.model.measured import Measured
from campaign.model.records import SystemRecord
from campaign.model.systems import DatedEvent as Dated
from campaign.model.systems import DustRule, Episode, Solution, System
from campaign.studies.forecast import DatedEvent, Forecaster, Window
from campaign.studies.upcoming import Question, prepare

AU_PER_KMS_D = 149_597_870.7 / 86_400.0
NOW = 62_000.0


@dataclass
class Case:
    """One system, the cycle asked for, and the true date of its onset (None: no episode)."""

    record: SystemRecord
    cycle: int
    truth: float | None


def scattered(rng: np.random.Generator, truth: float, minus: float, plus: float) -> Measured:
    """An estimate whose stated two-piece error leads back to the truth: half below, half above."""
    z = rng.standard_normal()
    return Measured(truth - (minus if z < 0 else plus) * z, minus, plus)


def orbit_case(rng: np.random.Generator, number: int, kind: str, skewed: bool, scatter_d: float) -> Case:
    """A system under the rule ``phase`` or ``lag``."""
    period, epoch = rng.uniform(1500, 9000), rng.uniform(50_000, 56_000)
    cycle = math.ceil((NOW - epoch) / period)
    sigma_p, sigma_t = period * rng.uniform(5e-4, 4e-3), rng.uniform(3, 40)
    offset = rng.uniform(-0.08, 0.02) if kind == "phase" else rng.uniform(-200, 60)
    sigma_o = 0.004 if kind == "phase" else 12.0
    lop = 2.5 if skewed else 1.0
    onset = epoch + cycle * period + (offset * period if kind == "phase" else offset)
    truth = onset + scatter_d * rng.standard_normal()
    t0 = scattered(rng, epoch, sigma_t, sigma_t * lop)
    solution = Solution(
        number, number, "given", period_d=scattered(rng, period, sigma_p, sigma_p * lop),
        epoch=Moment(t0.value, t0.minus, t0.plus), adopted=True, epoch_cycle=0,
    )  # fmt: skip
    rule = DustRule(
        number, number, kind, onset=scattered(rng, offset, sigma_o * lop, sigma_o),  # type: ignore[arg-type]
        scatter_onset_d=scatter_d,
    )  # fmt: skip
    return Case(SystemRecord(System(number, f"case {number}", 10.0, -30.0), (solution,), rule), cycle, truth)


def true_window_onset_d(period: float, e: float, a: float, critical: float) -> float | None:
    """Days from periastron to where the orbit equation gives the critical separation, before periastron."""
    cosine = (a * (1.0 - e * e) / critical - 1.0) / e
    if cosine > 1.0:
        return None
    nu = math.acos(max(cosine, -1.0))
    big_e = 2.0 * math.atan(math.sqrt((1.0 - e) / (1.0 + e)) * math.tan(nu / 2.0))
    return -period * (big_e - e * math.sin(big_e)) / (2.0 * math.pi)


def separation_case(rng: np.random.Generator, number: int, ratio_low: float, ratio_high: float) -> Case:
    """A system under the rule ``separation``; the ratio is that of critical to periastron separation."""
    period, epoch = rng.uniform(1500, 9000), rng.uniform(50_000, 56_000)
    cycle = math.ceil((NOW - epoch) / period)
    e, a = rng.uniform(0.4, 0.85), rng.uniform(8, 30)
    critical = rng.uniform(ratio_low, ratio_high) * a * (1.0 - e)
    far, speed = rng.uniform(60, 140), rng.uniform(1500, 2800)
    start = true_window_onset_d(period, e, a, critical)
    truth = None if start is None else epoch + cycle * period + start + far * AU_PER_KMS_D / speed
    t0 = scattered(rng, epoch, 12.0, 12.0)
    solution = Solution(
        number, number, "given", period_d=scattered(rng, period, 4.0, 4.0),
        epoch=Moment(t0.value, 12.0, 12.0), eccentricity=scattered(rng, e, 0.008, 0.008),
        a_au=scattered(rng, a, 0.02 * a, 0.02 * a), adopted=True, epoch_cycle=0,
    )  # fmt: skip
    rule = DustRule(
        number, number, "separation",
        critical_separation_au=scattered(rng, critical, 0.03 * critical, 0.03 * critical),
        condensation_distance_au=scattered(rng, far, 5.0, 5.0),
        flow_speed_kms=scattered(rng, speed, 60.0, 60.0),
    )  # fmt: skip
    return Case(SystemRecord(System(number, f"case {number}", 10.0, -30.0), (solution,), rule), cycle, truth)


def learned_case(
    rng: np.random.Generator, number: int, count: int, scatter_d: float | None, orbit: bool
) -> Case:
    """A system known by ``count`` dated onsets; the scatter is drawn from the stated prior when None."""
    period, first = rng.uniform(1500, 9000), rng.uniform(30_000, 40_000)
    if scatter_d is None:
        scatter_d = 0.01 * period * math.exp(rng.standard_normal())
    dating = 1.0
    dates = [first + k * period + scatter_d * rng.standard_normal() for k in range(count)]
    truth = first + count * period + scatter_d * rng.standard_normal()
    episodes = tuple(
        Episode(k, number, k, onset=Dated(Moment(d + dating * rng.standard_normal(), dating, dating)))
        for k, d in enumerate(dates)
    )
    solutions: tuple[Solution, ...] = ()
    if orbit:
        solutions = (
            Solution(
                number, number, "given", period_d=scattered(rng, period, 6.0, 6.0),
                epoch=Moment(first + 30.0, 20.0, 20.0), adopted=True, epoch_cycle=0,
            ),
        )  # fmt: skip
    rule = DustRule(number, number, "learned")
    record = SystemRecord(System(number, f"case {number}", 10.0, -30.0), solutions, rule, episodes)
    return Case(record, count, truth)


def forecast(cases: list[Case], event: EventName, draws: int) -> list[DatedEvent]:
    """The onset forecast of each case, in their order."""
    question = Question(as_of=NOW, start=NOW, end=NOW + 1.0, draws=draws)
    prepared = prepare([case.record for case in cases], {}, question)
    forecaster = Forecaster(prepared.rows, prepared.units, prepared.learned, draws, 7)
    window = Window(-1e6, 1e6, 0.0)
    pairs: dict[EventName, list[tuple[int, int]]] = {event: [(i, case.cycle) for i, case in enumerate(cases)]}
    dated = forecaster.date_pairs(pairs, window)
    return sorted(dated, key=lambda d: d.unit)
