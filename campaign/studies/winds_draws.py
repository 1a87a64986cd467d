"""Draws of everything that the wind collision follows from, and what they make of the errors of a result."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from copy import copy
from dataclasses import replace
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from campaign.model.propagated import Propagated
from campaign.model.systems import StarName
from campaign.physics import contactsurface, windmomentum
from campaign.physics.constants import AU_KM, SOLAR_RADIUS_KM
from campaign.physics.draws import stratified_normals, two_piece_within
from campaign.physics.openingforms import SHOCK_FLARE_DEG
from campaign.physics.postshock import mean_molecular_weight
from campaign.studies.propagation import squared_widths, summarised, with_dominant
from campaign.studies.rows import ForecastRow
from campaign.studies.sampling import Sampler
from campaign.studies.variance import only
from campaign.studies.winds_inputs import BETA, FLARE, OTHER_DOMAINS, RATIO, STAR_FIELDS, WindInputs, spoken

FloatArray = NDArray[np.float64]
Quantities = Callable[["WindDraws"], Mapping[str, FloatArray]]

STARS: tuple[StarName, StarName] = ("A", "B")
# Draws with one error alone, from which the dominant one is told.
_ALONE_DRAWS = 600
DEFAULT_BETA = 1.0


class WindDraws:
    """Inputs within their errors, one array of draws each; with ``kept``, only the named errors are left."""

    def __init__(self, inputs: WindInputs, draws: int, seed: int, kept: frozenset[str] | None = None) -> None:
        self.inputs = inputs
        self.draws = draws
        self._kept = kept
        self._normals = stratified_normals(list(inputs.values), draws, seed)
        self._sampler: Sampler | None = None
        if inputs.row is not None:
            row = inputs.row if kept is None else only(_uncorrelated(inputs.row), kept)
            self._sampler = Sampler([row], draws, seed)
        self._index = np.zeros(1, dtype=np.int64)

    def input(self, name: str) -> FloatArray:
        """Draws of one input, shape (draws,)."""
        if name not in self.inputs.values:
            assert self._sampler is not None
            drawn = self._sampler.draw(name, self._index)
            return _one_row(drawn, self.draws)
        value = self.inputs.values[name]
        free = self._kept is None or name in self._kept
        sizes = (value.minus or 0.0, value.plus or 0.0) if free else (0.0, 0.0)
        middle, minus, plus = (np.array([[x]]) for x in (value.value, *sizes))
        low, high = _domain(name)
        return _one_row(
            two_piece_within(middle, minus, plus, self._normals[name][None, :], low, high), self.draws
        )

    def given(self, name: str, star: StarName) -> FloatArray:
        """Draws of a quantity of one star."""
        return self.input(f"{name}_{star.lower()}")

    @cached_property
    def eta(self) -> FloatArray:
        """Momentum ratio of the weaker over the stronger wind; draws may pass 1."""
        if RATIO in self.inputs.values:
            ratio = self.input(RATIO)
        else:
            a, b = (
                windmomentum.wind_momentum(
                    self.given("mass_loss_msun_yr", star), self.given("wind_speed_kms", star)
                )
                for star in ("A", "B")
            )
            ratio = windmomentum.momentum_ratio(b, a)
        return ratio if self.inputs.weaker == "B" else 1.0 / ratio

    @cached_property
    def opening_rad(self) -> FloatArray:
        """Half-opening angle of the contact surface, by the thin shell."""
        return contactsurface.half_opening_rad(self.eta)

    @cached_property
    def shock_opening_rad(self) -> FloatArray:
        """Half-opening angle of the outer shock, at most half a turn."""
        return np.minimum(self.opening_rad + np.radians(self.flare_deg), np.pi)

    def contact_share(self, star: StarName) -> FloatArray:
        """Distance of the contact surface from a star in separations, on the line of the stars."""
        from_weaker, from_stronger = windmomentum.stagnation_fractions(self.eta)
        return from_weaker if star == self.inputs.weaker else from_stronger

    def mean_weight(self, star: StarName) -> FloatArray:
        """Mean molecular weight of a wind."""
        fractions: dict[str, FloatArray] = {}
        for symbol, fraction in self.inputs.compositions[star][0].mass_fractions:
            name = f"fraction_{star.lower()}_{symbol}"
            known = name in self.inputs.values
            fractions[symbol] = self.input(name) if known else np.full(self.draws, fraction.value)
        return mean_molecular_weight(fractions)

    def radius_au(self, star: StarName) -> FloatArray:
        """Radius of a star."""
        return self.given("radius_rsun", star) * (SOLAR_RADIUS_KM / AU_KM)

    @property
    def beta(self) -> FloatArray:
        """Exponent of the velocity law."""
        return self.input(BETA) if BETA in self.inputs.values else np.full(self.draws, DEFAULT_BETA)

    @property
    def flare_deg(self) -> FloatArray:
        """By how much the shocks flare beyond the contact surface."""
        return self.input(FLARE) if FLARE in self.inputs.values else np.full(self.draws, SHOCK_FLARE_DEG)

    @cached_property
    def a_au(self) -> FloatArray:
        """Semi-major axis."""
        assert self._sampler is not None
        needs_period = {"period_d"} & set(self.inputs.size)
        period = self.input("period_d")[None, :] if needs_period else np.ones((1, self.draws))
        size = self._sampler.semi_major_axis_au(self._index, period)
        return _one_row(size, self.draws)

    @cached_property
    def omega_weaker_deg(self) -> FloatArray:
        """Argument of periastron of the star with the weaker wind."""
        return self.input("omega_b_deg") + (0.0 if self.inputs.weaker == "B" else 180.0)

    @cached_property
    def periastron(self) -> FloatArray:
        """Periastron of the cycle of the epoch, ``bmjd_tdb``."""
        assert self._sampler is not None
        assert self.inputs.row is not None
        cycle = np.array([self.inputs.row.epoch_cycle])
        times = self._sampler.event_times("periastron", self._index, cycle)
        return _one_row(times, self.draws)


def _one_row(drawn: FloatArray, draws: int) -> FloatArray:
    """The one row of an array that may hold a single draw for all."""
    row: FloatArray = np.broadcast_to(drawn, (1, draws))[0]
    return row


def _uncorrelated(row: ForecastRow) -> ForecastRow:
    """The row without the correlations by which one quantity would move another."""
    if row.solution is None or row.solution.covariance is None:
        return row
    alone = copy(row)
    alone.solution = replace(row.solution, covariance=None)
    return alone


def _domain(name: str) -> tuple[float, float]:
    if name[:-2] in STAR_FIELDS:
        return STAR_FIELDS[name[:-2]][3]
    return OTHER_DOMAINS.get(name, (0.0, float("inf")))


class Propagation:
    """Results with their errors: all draws together, and each error alone to tell which one matters."""

    def __init__(self, inputs: WindInputs, draws: int, seed: int) -> None:
        self.inputs = inputs
        self.draws = draws
        self.seed = seed
        self.all = WindDraws(inputs, draws, seed)
        self.nominal = WindDraws(inputs, 1, seed, frozenset())
        self._alone: dict[str, WindDraws] = {}
        self.used: set[str] = set()

    def thinned(self, draws: int) -> Propagation:
        """The same with fewer draws of everything together."""
        if draws >= self.draws:
            return self
        fewer = Propagation(self.inputs, draws, self.seed)
        fewer._alone = self._alone
        fewer.used = self.used
        return fewer

    def alone(self, name: str) -> WindDraws:
        """Draws with one error alone."""
        if name not in self._alone:
            self._alone[name] = WindDraws(self.inputs, _ALONE_DRAWS, self.seed, frozenset({name}))
        return self._alone[name]

    def one(self, quantity: Callable[[WindDraws], FloatArray], needs: Sequence[str]) -> Propagated:
        """One number with its errors; ``quantity`` gives one array of draws."""
        return self.many(lambda drawn: {"": quantity(drawn)}, {"": needs})[""][0]

    def many(self, quantities: Quantities, needs: Mapping[str, Sequence[str]]) -> dict[str, list[Propagated]]:
        """Several quantities at once, each a row or rows of draws, with what each rests on."""
        drawn = quantities(self.all)
        stated = quantities(self.nominal)
        wanted = [name for name in self.inputs.names() if any(name in each for each in needs.values())]
        self.used.update(wanted)
        uncertain = [name for name in wanted if (self.inputs.measured(name).sigma or 0.0) > 0.0]
        spreads = {
            name: {key: squared_widths(rows) for key, rows in quantities(self.alone(name)).items()}
            for name in uncertain
        }
        found: dict[str, list[Propagated]] = {}
        for key, rows in drawn.items():
            unknown = tuple(spoken(name) for name in needs[key] if not self.inputs.measured(name).error_known)
            values = np.atleast_2d(stated[key])[:, 0]
            ours = {name: spreads[name][key] for name in uncertain if name in needs[key]}
            found[key] = _summarised(np.atleast_2d(rows), values, ours, unknown)
        return found


def _summarised(
    rows: FloatArray, values: FloatArray, spreads: Mapping[str, FloatArray], unknown: tuple[str, ...]
) -> list[Propagated]:
    if unknown:
        return [Propagated(_number(value), unknown_errors=unknown) for value in values]
    found = []
    for i, value in enumerate(values):
        parts = {spoken(name): float(each[i]) for name, each in spreads.items()}
        found.append(with_dominant(summarised(rows[i], _number(value)), parts))
    return found


def _number(value: float) -> float | None:
    return float(value) if np.isfinite(value) else None
