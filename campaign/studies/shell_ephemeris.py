"""The ephemeris that shells are held against: launches and periastra of one system's cycles, found once."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

from campaign.model.measured import Measured
from campaign.physics.shellvalues import Sided
from campaign.studies.forecast import Forecaster
from campaign.studies.launches import Launch, cycles_between, launch_of
from campaign.studies.shell_subject import period_of

YEAR_D = 365.25
# Beyond so many cycles from an image nobody counts shells.
_SEARCHED = 3
# Periods by which the ephemeris may be off when shells are counted.
_SLACK = 0.2


class Dated(NamedTuple):
    """An instant with its standard deviation, None where an error is unknown; ``bmjd_tdb`` and days."""

    bmjd_tdb: float
    sigma_d: float | None


class ShellEphemeris:
    """Launches of one system's cycles from its forecaster; each is worked out when it is first asked for."""

    def __init__(self, forecaster: Forecaster, seed: int) -> None:
        self.forecaster = forecaster
        self._seed = seed
        self._launches: dict[int, Launch | None] = {}
        self._periastra: dict[int, Dated | None] = {}
        found = period_of(forecaster)
        self.period_yr: Measured | None = None if found is None else found[0]
        self.period_from = "" if found is None else found[1]

    def launch(self, cycle: int) -> Launch | None:
        """The launch of a cycle; None where its phase is lost or nothing dates it."""
        if cycle not in self._launches:
            self._launches[cycle] = launch_of(self.forecaster, 0, cycle, self._seed)
        return self._launches[cycle]

    def has_error(self, cycle: int) -> bool:
        """Whether the launch of a cycle is dated with an error."""
        launch = self.launch(cycle)
        return launch is not None and launch.sigma_d is not None

    def periastron(self, cycle: int) -> Dated | None:
        """Periastron of a cycle; None where no orbit dates it."""
        if cycle not in self._periastra:
            self._periastra[cycle] = self._find_periastron(cycle)
        return self._periastra[cycle]

    def _find_periastron(self, cycle: int) -> Dated | None:
        forecaster = self.forecaster
        rows = forecaster.units[0].rows
        if not any("periastron" in forecaster.rows[row].events for row in rows):
            return None
        if forecaster.phase_lost([(0, "periastron", cycle)])[0]:
            return None
        times = forecaster.unit_times(0, "periastron", cycle)
        known = not any(forecaster.rows[row].missing_errors("periastron", cycle) for row in rows)
        return Dated(float(np.nanmedian(times)), float(np.nanstd(times)) if known else None)

    def youngest(self, instant: float) -> tuple[int, Launch] | None:
        """The latest cycle launched before an instant, ``bmjd_tdb``; None where nothing is dated there."""
        if self.period_yr is None:
            return None
        near = cycles_between(self.forecaster, 0, instant, instant)
        if not near:
            return None
        for cycle in range(max(near), min(near) - _SEARCHED, -1):
            launch = self.launch(cycle)
            if launch is not None and launch.median_d <= instant:
                return cycle, launch
        return None

    def phase_of_youngest(self, instant: float) -> Sided | None:
        """Age of the youngest shell in periods at an instant, ``bmjd_tdb``; None where it has no error.

        Its error is at least a fifth of a period: a rule that puts the window too early or too late must not
        decide which shells are there.
        """
        found = self.youngest(instant)
        if found is None or self.period_yr is None or found[1].sigma_d is None:
            return None
        period_d = self.period_yr.value * YEAR_D
        size = float(np.hypot(found[1].sigma_d / period_d, _SLACK))
        return Sided((instant - found[1].median_d) / period_d, size, size)
