"""Draws of event times for many rows at once: (rows, draws) arrays, one call an event."""

from __future__ import annotations

from collections.abc import Sequence
from copy import copy
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from campaign.model.forecasts import EventName
from campaign.physics.draws import stratified_normals, two_piece_normal, two_piece_within
from campaign.physics.dustwindow import production_half_window_d, travel_delay_d
from campaign.physics.eventtimes import conjunction_offset_phase
from campaign.studies.rows import DOMAINS, SCATTERS, ForecastRow

if TYPE_CHECKING:
    from campaign.studies.learned import LearnedDates

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]

DEFAULT_DRAWS = 20_000
DEFAULT_SEED = 1

# nu + omega_B at each conjunction: B is behind A at 90 degrees, in front of it at 270.
CONJUNCTION_DEG: dict[EventName, float] = {"A in front": 90.0, "B in front": 270.0}
RULE_CODES = {"phase": 1, "lag": 2, "separation": 3, "learned": 4}
MARK_CODES = {"periastron": 0, "A in front": 1, "B in front": 2, "onset": 3, "maximum": 4}


class Sampler:
    """Event times drawn from the stated errors of many rows.

    The same standard normal deviates serve every row: a forecast depends on its own elements, the
    number of draws and the seed, and never on which other systems are in the campaign.
    """

    def __init__(
        self,
        rows: Sequence[ForecastRow],
        draws: int,
        seed: int,
        learned: dict[int, LearnedDates] | None = None,
    ) -> None:
        self.rows = rows
        self.draws = draws
        self.learned = learned or {}
        scatter_names = [f"scatter {event}" for event in SCATTERS]
        self._names = [*DOMAINS, *scatter_names, "recurrence"]
        self.normals = stratified_normals(self._names, draws, seed)
        self.columns = {name: self._column(name) for name in DOMAINS}
        self.scatter = {event: self._scatter(event) for event in SCATTERS}
        references = [row.omega_reference_deg for row in rows]
        self.omega_reference = np.array([np.nan if r is None else r for r in references], dtype=float)
        self.epoch_cycle = np.array([row.epoch_cycle for row in rows], dtype=np.int64)
        self.rule = np.array([RULE_CODES[row.rule.kind] if row.rule else 0 for row in rows])
        self.mark = np.array([MARK_CODES[row.mark] for row in rows])
        self.period_is_range = np.array([row.period_is_range for row in rows], dtype=bool)
        self._find_correlations()

    def thinned(self, draws: int, seed: int) -> Sampler:
        """The same rows with other, fewer draws."""
        other = copy(self)
        other.draws = draws
        other.normals = stratified_normals(self._names, draws, seed)
        other._find_correlations()
        return other

    def _find_correlations(self) -> None:
        self.correlated = {i: z for i, row in enumerate(self.rows) if (z := self._correlate(row))}
        self._is_correlated = np.zeros(len(self.rows), dtype=bool)
        self._is_correlated[list(self.correlated)] = True

    def _column(self, name: str) -> FloatArray:
        """(rows, 3) of value, minus, plus; NaN value where absent, 0 where the error is unknown."""
        absent = (np.nan, 0.0, 0.0)
        table = [row.values.get(name, absent) for row in self.rows]
        return np.array([(v, m or 0.0, p or 0.0) for v, m, p in table], dtype=float).reshape(-1, 3)

    def _scatter(self, event: EventName) -> FloatArray:
        field = f"scatter_{event}_d"
        return np.array([(getattr(row.rule, field) or 0.0) if row.rule else 0.0 for row in self.rows])

    def _correlate(self, row: ForecastRow) -> dict[str, FloatArray]:
        """Deviates of one solution's elements with their published correlations."""
        covariance = row.solution.covariance if row.solution is not None else None
        if covariance is None:
            return {}
        names = ["omega_b_deg" if name == "omega_deg" else name for name in covariance.names]
        known = [i for i, name in enumerate(names) if name in row.values and name in DOMAINS]
        if len(known) < 2:
            return {}
        matrix = np.array(covariance.matrix, dtype=float)[np.ix_(known, known)]
        sigma = np.sqrt(np.diag(matrix))
        if not np.all(sigma > 0.0):
            return {}
        factor = np.linalg.cholesky(matrix / np.outer(sigma, sigma) + 1e-12 * np.eye(len(known)))
        independent = np.stack([self.normals[names[i]] for i in known])
        together = factor @ independent
        return {names[i]: together[j] for j, i in enumerate(known)}

    def deviates(self, name: str, index: IntArray) -> FloatArray:
        common = self.normals[name][None, :]
        if not self._is_correlated[index].any():
            return common
        z = np.repeat(common, index.size, axis=0)
        for position, row in enumerate(index):
            own = self.correlated.get(int(row), {}).get(name)
            if own is not None:
                z[position] = own
        return z

    def draw(self, name: str, index: IntArray) -> FloatArray:
        """Draws of one quantity for the rows of ``index``, shape (len(index), draws)."""
        value, minus, plus = (self.columns[name][index, i][:, None] for i in range(3))
        z = self.deviates(name, index)
        low, high = DOMAINS[name]
        if np.isinf(low) and np.isinf(high):
            return two_piece_normal(value, minus, plus, z)
        if name == "period_d" and self.period_is_range[index].any():
            return self._period_with_ranges(value, minus, plus, z, index)
        return two_piece_within(value, minus, plus, z, low, high)

    def _period_with_ranges(
        self, value: FloatArray, minus: FloatArray, plus: FloatArray, z: FloatArray, index: IntArray
    ) -> FloatArray:
        from scipy.special import ndtr

        even = value + minus * (2.0 * ndtr(z) - 1.0)
        normal = two_piece_within(value, minus, plus, z, *DOMAINS["period_d"])
        return np.where(self.period_is_range[index][:, None], even, normal)

    def _periastron(self, index: IntArray, cycles: IntArray) -> tuple[FloatArray, FloatArray]:
        """Times of periastron (or of the marked event) and periods, (rows, draws) each."""
        period = self.draw("period_d", index)
        times = (cycles - self.epoch_cycle[index])[:, None] * period
        times += self.draw("epoch", index)
        for code, event in ((1, "A in front"), (2, "B in front")):
            marked = np.flatnonzero(
                (self.mark[index] == code) & ~np.isnan(self.columns["omega_b_deg"][index, 0])
            )
            if marked.size:
                offset = self._conjunction_phase(index[marked], event)  # type: ignore[arg-type]
                times[marked] -= offset * period[marked]
        return times, period

    def _conjunction_phase(self, index: IntArray, event: EventName) -> FloatArray:
        omega = self.draw("omega_b_deg", index)
        nominal = self.columns["omega_b_deg"][index, 0]
        reference = self.omega_reference[index]
        reference = np.where(np.isnan(reference), nominal, reference)
        # The conjunction nearest to periastron in the solution that all of a system count by, followed
        # continuously from there, as omega varies within its error and from solution to solution.
        target = CONJUNCTION_DEG[event]
        turns = np.round((target - reference) / 360.0) - np.round((nominal - reference) / 360.0)
        return conjunction_offset_phase(
            self.draw("eccentricity", index), np.radians(target - omega - 360.0 * turns[:, None])
        )

    def event_times(self, event: EventName, index: IntArray, cycles: IntArray) -> FloatArray:
        """Draws of one event.

        Parameters
        ----------
        event : str
            Which event.
        index : ndarray of int, shape (n,)
            Rows.
        cycles : ndarray of int, shape (n,)
            Cycle of each.

        Returns
        -------
        ndarray, shape (n, draws)
            ``bmjd_tdb``; NaN where the event does not happen in that draw.
        """
        is_learned = self.rule[index] == RULE_CODES["learned"]
        if event in SCATTERS and is_learned.any():
            return self._mixed_learned(event, index, cycles, is_learned)
        times, period = self._periastron(index, cycles)
        if event in CONJUNCTION_DEG:
            shift = self._conjunction_phase(index, event)
            shift *= period
            # A row marked by a conjunction without e and omega dates that conjunction alone.
            shift[np.isnan(self.columns["omega_b_deg"][index, 0])] = 0.0
            times += shift
        if event in SCATTERS:
            marked_here = self.mark[index] == MARK_CODES.get(event, -1)
            offsets = self._offsets_d(event, index, period)
            offsets[marked_here] = 0.0
            times += offsets
            spread = np.where(marked_here, 0.0, self.scatter[event][index])
            if spread.any():
                times += spread[:, None] * self.normals[f"scatter {event}"][None, :]
        return times

    def _mixed_learned(
        self, event: EventName, index: IntArray, cycles: IntArray, is_learned: NDArray[np.bool_]
    ) -> FloatArray:
        times = np.full((index.size, self.draws), np.nan)
        other = np.flatnonzero(~is_learned)
        if other.size:
            times[other] = self.event_times(event, index[other], cycles[other])
        for position in np.flatnonzero(is_learned):
            dates = self.learned.get(int(index[position]))
            if dates is not None:
                times[position] = dates.draws(event, int(cycles[position]), self.normals)
        return times

    def _offsets_d(self, event: EventName, index: IntArray, period: FloatArray) -> FloatArray:
        """Days from periastron, before scatter; NaN in draws without an episode."""
        kinds = self.rule[index]
        present = np.unique(kinds)
        if present.size == 1:
            return self._offsets_by_d(int(present[0]), event, index, period)
        offsets = np.empty(period.shape)
        for kind in present:
            chosen = np.flatnonzero(kinds == kind)
            offsets[chosen] = self._offsets_by_d(int(kind), event, index[chosen], period[chosen])
        return offsets

    def _offsets_by_d(self, kind: int, event: EventName, index: IntArray, period: FloatArray) -> FloatArray:
        """The same for rows of one kind of rule."""
        if kind == RULE_CODES["phase"]:
            return self.draw(event, index) * period
        if kind == RULE_CODES["lag"]:
            return self.draw(event, index)
        if kind == RULE_CODES["separation"]:
            return self._separation_offsets_d(event, index, period)
        return np.full(period.shape, np.nan)

    def half_window_d(self, index: IntArray, period: FloatArray) -> FloatArray:
        """Half of the production window; NaN without an episode, ``inf`` when production never stops."""
        return production_half_window_d(
            period,
            self.draw("eccentricity", index),
            self.semi_major_axis_au(index, period),
            self.draw("critical_separation_au", index),
        )

    def _separation_offsets_d(self, event: EventName, index: IntArray, period: FloatArray) -> FloatArray:
        half = self.half_window_d(index, period)
        has_delay = ~np.isnan(self.columns["condensation_distance_au"][index, 0])
        delay = np.zeros_like(period)
        if has_delay.any():
            where = np.flatnonzero(has_delay)
            delay[where] = travel_delay_d(
                self.draw("condensation_distance_au", index[where]), self.draw("flow_speed_kms", index[where])
            )
        if event == "maximum":
            lagged = ~np.isnan(self.columns["maximum_lag_d"][index, 0])
            if lagged.any():
                where = np.flatnonzero(lagged)
                delay[where] = self.draw("maximum_lag_d", index[where])
            return np.where(np.isnan(half), np.nan, delay)
        # Production that never stops has no onset and no end.
        bounded = np.where(np.isinf(half), np.nan, half)
        return delay - bounded if event == "onset" else delay + bounded

    def semi_major_axis_au(self, index: IntArray, period: FloatArray) -> FloatArray:
        """Draws of a in au, from whatever each row has it from; ``period`` in days, (rows, draws)."""
        sources = np.array([self.rows[i].a_source for i in index])
        a = np.empty(period.shape)
        for source in np.unique(sources):
            chosen = np.flatnonzero(sources == source)
            a[chosen] = self._a_from(str(source), index[chosen], period[chosen])
        return a

    def _a_from(self, source: str, index: IntArray, period: FloatArray) -> FloatArray:
        """Semi-major axis of rows that all have it from the same source, au."""
        if source == "given":
            return self.draw("a_au", index)
        if source == "angle and distance":
            return self.draw("a_arcsec", index) * self.draw("distance_pc", index)
        from campaign.physics import masses

        if source == "velocities":
            return masses.semi_major_axis_from_velocities(
                period,
                self.draw("eccentricity", index),
                self.draw("k_a_kms", index),
                self.draw("k_b_kms", index),
                np.radians(self.draw("inclination_deg", index)),
            )
        return masses.semi_major_axis_au(
            period, self.draw("mass_a_msun", index) + self.draw("mass_b_msun", index)
        )
