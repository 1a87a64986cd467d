"""A large invented campaign for the benchmarks: every kind of solution and rule, as a real list mixes them.

Of twenty systems: seven with a critical separation (three with the axis, two with masses, two with
angle and distance), four with phases, three with lags, two learned with an orbit, one learned from
episodes alone, one with a period and an epoch only, one with two weighted solutions, and one whose
period is only a limit. Every tenth system has a light curve.
"""

from __future__ import annotations

from dataclasses import replace
from datetime import UTC, datetime
from pathlib import Path

import numpy as np

from campaign.catalogue import episodes, observations, rules, solutions, store, systems, upgrade
from campaign.model.instants import Moment
from campaign.model.measured import Limit, Measured
from campaign.model.observations import Observation
from campaign.model.systems import DatedEvent, DustRule, Episode, Solution, Star, System

NOW = datetime(2031, 4, 7, tzinfo=UTC)
NOW_BMJD_TDB = 62963.0
SOURCES = ("Vane", "Orrel", "Quill")
LIGHT_CURVE_POINTS = 40
LIGHT_CURVE_EVERY = 10


class LargeCampaign:
    """Draws and writes one invented system after another."""

    def __init__(self, seed: int) -> None:
        self.random = np.random.default_rng(seed)
        self.photometry: list[Observation] = []

    def write(self, database: Path, count: int) -> None:
        """Make ``database`` with ``count`` systems in one transaction."""
        upgrade.begin_database(database, at=NOW)
        with store.writing(database, at=NOW, who="Ida Vik", command="benchmark") as writing:
            for number in range(count):
                self._write_system(writing, number)
            observations.add_observations(writing, self.photometry)

    def _about(self, low: float, high: float, relative_error: float, lopsided: bool = False) -> Measured:
        value = float(self.random.uniform(low, high))
        minus = abs(value) * relative_error
        return Measured(value, minus, 1.8 * minus if lopsided else minus)

    def _write_system(self, writing: store.Writing, number: int) -> None:
        kind = number % 20
        system = System(
            0,
            f"Ember {number}",
            float(self.random.uniform(0.0, 360.0)),
            float(np.degrees(np.arcsin(self.random.uniform(-1.0, 1.0)))),
            distance_pc=self._about(1000.0, 6000.0, 0.1),
            star_a=Star("A", "WC8", mass_msun=self._about(8.0, 20.0, 0.1)),
            star_b=Star("B", "O6", mass_msun=self._about(15.0, 40.0, 0.1)),
        )
        system_id = systems.add_system(writing, system)
        period_d = float(np.exp(self.random.uniform(np.log(1000.0), np.log(15000.0))))
        epoch = float(NOW_BMJD_TDB - self.random.uniform(0.0, 2.0) * period_d)
        draft = self._orbit(system_id, period_d, epoch, lopsided=number % 7 == 0)
        if kind in (3, 4):
            draft = replace(draft, a_au=None)
        elif kind in (5, 6):
            draft = replace(draft, a_au=None, a_arcsec=self._about(0.003, 0.02, 0.04))
        elif kind == 17:
            draft = Solution(0, system_id, "first", Measured(period_d, 30.0, 30.0), Moment(epoch, 20.0, 20.0))
        elif kind == 19:
            draft = Solution(0, system_id, "first", Limit(30.0 * 365.25, "above"), Moment(epoch, 30.0, 30.0))
        if kind == 18:
            first = solutions.add_solution(writing, draft)
            other = replace(
                draft, label="second", period_d=Measured(period_d * 1.01, 0.01 * period_d, 0.01 * period_d)
            )
            solutions.adopt_weighted(
                writing, system_id, {first: 0.6, solutions.add_solution(writing, other): 0.4}
            )
        elif kind != 16:
            solutions.adopt_alone(writing, solutions.add_solution(writing, draft))
        rule = self._rule(system_id, kind)
        if rule is not None:
            rules.set_rule(writing, rule)
        if kind in (14, 15, 16):
            self._write_episodes(writing, system_id, period_d)
        if number % LIGHT_CURVE_EVERY == 0:
            self._add_light_curve(system_id)

    def _orbit(self, system_id: int, period_d: float, epoch: float, lopsided: bool) -> Solution:
        error_d = period_d * float(np.exp(self.random.uniform(np.log(1e-4), np.log(1e-2))))
        return Solution(
            0,
            system_id,
            "first",
            period_d=Measured(period_d, error_d, 1.7 * error_d if lopsided else error_d),
            epoch=Moment(epoch, 8.0, 14.0 if lopsided else 8.0),
            eccentricity=self._about(0.2, 0.9, 0.03),
            omega_deg=self._about(0.0, 360.0, 0.02),
            omega_of="A",
            inclination_deg=self._about(20.0, 90.0, 0.05),
            a_au=Measured(
                3.3 * (period_d / 365.25) ** (2 / 3),
                0.05 * (period_d / 365.25) ** (2 / 3),
                0.05 * (period_d / 365.25) ** (2 / 3),
            ),
            source="Quill",
        )

    def _rule(self, system_id: int, kind: int) -> DustRule | None:
        if kind < 7:
            return DustRule(
                0,
                system_id,
                "separation",
                critical_separation_au=self._about(3.0, 9.0, 0.1),
                condensation_distance_au=self._about(60.0, 140.0, 0.2),
                flow_speed_kms=self._about(1500.0, 2500.0, 0.1),
                scatter_onset_d=10.0,
            )
        if kind < 11 or kind == 18:
            stages = (Measured(-0.03, 0.01, 0.01), Measured(0.02, 0.01, 0.02), Measured(0.1, 0.03, 0.03))
            return DustRule(0, system_id, "phase", *stages, scatter_onset_d=15.0)
        if kind < 14:
            stages = (Measured(-40.0, 10.0, 10.0), Measured(60.0, 20.0, 20.0), Measured(250.0, 40.0, 60.0))
            return DustRule(0, system_id, "lag", *stages)
        return DustRule(0, system_id, "learned") if kind in (14, 15, 16) else None

    def _write_episodes(self, writing: store.Writing, system_id: int, period_d: float) -> None:
        latest = NOW_BMJD_TDB - float(self.random.uniform(0.1, 0.9)) * period_d
        for back in range(int(self.random.integers(3, 6))):
            onset = latest - back * period_d + float(self.random.normal(0.0, 20.0))
            dated = [DatedEvent(Moment(onset + lag, 8.0, 8.0), "K") for lag in (0.0, 100.0, 300.0)]
            episodes.add_episode(writing, Episode(0, system_id, None, "confirmed", *dated))

    def _add_light_curve(self, system_id: int) -> None:
        times = NOW_BMJD_TDB - np.sort(self.random.uniform(0.0, 3650.0, LIGHT_CURVE_POINTS))[::-1]
        mags = 7.3 + self.random.normal(0.0, 0.03, LIGHT_CURVE_POINTS)
        self.photometry += [
            Observation(
                0,
                "",
                system_id,
                "photometry",
                Moment(float(time), 0.0, 0.0),
                Measured(round(float(mag), 3), 0.03, 0.03),
                "mag",
                band="K",
                source=SOURCES[system_id % 3],
            )
            for time, mag in zip(times, mags, strict=True)
        ]


def build_large_campaign(database: Path, count: int, seed: int = 20310407) -> None:
    """Write ``count`` invented systems into a new database."""
    LargeCampaign(seed).write(database, count)
