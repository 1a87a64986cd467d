"""Spacing, proper motion, speed, period and distance of nested shells: each follows from the others."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from itertools import combinations

import numpy as np
from numpy.typing import NDArray

from campaign.errors import InputRefused
from campaign.physics.shellnetwork import RELATIONS, ShellInput, ShellNetwork, SolvedQuantity, Tension
from campaign.physics.shellunits import QUANTITIES, WORDS, check_shell_value
from campaign.physics.shellvalues import Uncertain

FloatArray = NDArray[np.float64]


@dataclass(frozen=True, slots=True, eq=False)
class RelationSolution:
    """What follows from the stated values: quantities, tensions, and what else would be needed."""

    quantities: tuple[SolvedQuantity, ...]
    tensions: tuple[Tension, ...]
    unknown: tuple[str, ...]
    would_do: tuple[tuple[str, ...], ...]
    _system: ShellNetwork = field(repr=False)

    def get(self, quantity: str) -> SolvedQuantity | None:
        """The solved quantity of this name, or None."""
        return next((solved for solved in self.quantities if solved.quantity == quantity), None)

    def uncertain(self, quantity: str) -> Uncertain | None:
        """The quantity with draws that keep its correlations to the others, or None where it is unknown."""
        return self._system.best(quantity, frozenset())

    def without(self, quantity: str, left_out: str) -> Uncertain | None:
        """The quantity from everything but ``left_out``: no error of that is then counted twice."""
        return self._system.best(quantity, frozenset({left_out}))


def solve_shell_relations(
    inputs: Sequence[ShellInput],
    correlations: Mapping[tuple[str, str], float] | None = None,
    draws: int = 20_000,
    seed: int = 1,
) -> RelationSolution:
    """Derive what is missing of the five quantities, and compare what is stated more than once.

    Parameters
    ----------
    inputs : sequence of ShellInput
        Stated values, all > 0, in the unit of the quantity's name: arcsec, mas/yr, km/s, yr or pc. A
        quantity may come several times with different labels; the first is the one that is used.
    correlations : mapping, optional
        Correlation coefficients (dimensionless, -1 to 1) between pairs of inputs, each named by its
        quantity, or by ``quantity:label``. A speed and a distance taken from one expansion study are
        nearly one error.
    draws, seed : int
        Of the Monte Carlo for the bounds (dimensionless).

    Returns
    -------
    RelationSolution
        Quantities in the same units (arcsec, mas/yr, km/s, yr, pc). A derived one is the best linear
        combination, in logarithms, of all
        ways to it. Its ``sigma`` is of first order; its bounds come from draws. With an unknown error on
        every way the shortest way gives the value, without error.

    Raises
    ------
    InputRefused
        For a value that is not positive and finite, a speed above that of light, an unknown name, or
        correlations that cannot hold together.

    Notes
    -----
    Accuracy: values exact; ``sigma`` leaves out squares of relative errors, the bounds do not. Tensions
    are of first order, with the errors on the facing sides, and every shared input counted once.

    Source: kinematics of unaccelerated shells, 1 au/yr = 4.740470464 km/s; best linear combination:
    Lyons, Gibaut & Clifford 1988, Nucl. Instrum. Methods A 270, 110.

    Examples
    --------
    >>> solution = solve_shell_relations([
    ...     ShellInput("spacing_arcsec", 1.45, 0.03, 0.03),
    ...     ShellInput("proper_motion_mas_yr", 53.0, 1.5, 1.5),
    ... ])
    >>> period = solution.get("period_yr").spread
    >>> round(period.value, 3), round(period.sigma, 3)
    (27.358, 0.959)
    >>> solution.would_do
    (('speed_kms',), ('distance_pc',))
    """
    for given in inputs:
        check_shell_value(given.quantity, given.value)
    system = ShellNetwork(tuple(inputs), _correlation_matrix(inputs, correlations or {}), draws, seed)
    known = {given.quantity for given in inputs if not given.compare_only}
    quantities = tuple(solved for name in QUANTITIES if (solved := system.solve(name)) is not None)
    unknown = tuple(name for name in QUANTITIES if name not in _closure(known))
    return RelationSolution(
        quantities=quantities,
        tensions=tuple(system.tensions()),
        unknown=unknown,
        would_do=what_would_do(known, QUANTITIES) if unknown else (),
        _system=system,
    )


def what_would_do(known: set[str] | Sequence[str], wanted: Sequence[str]) -> tuple[tuple[str, ...], ...]:
    """Smallest sets of further quantities from which all that is wanted would follow.

    Parameters
    ----------
    known, wanted : names of QUANTITIES
        What is stated and what is asked for (dimensionless names).

    Returns
    -------
    tuple of tuples
        Names (no unit of their own); none of the sets contains another; shorter ones first. Empty
        inner tuple when nothing is missing.

    Notes
    -----
    Accuracy: exact.

    Source: rank of the two relations among five quantities.

    Examples
    --------
    >>> what_would_do({"spacing_arcsec"}, ["period_yr"])[:2]
    (('proper_motion_mas_yr',), ('period_yr',))
    """
    found: list[tuple[str, ...]] = []
    others = [name for name in QUANTITIES if name not in known]
    for size in range(len(others) + 1):
        for extra in combinations(others, size):
            if any(set(smaller) <= set(extra) for smaller in found):
                continue
            if set(wanted) <= _closure({*known, *extra}):
                found.append(extra)
    return tuple(found)


def _closure(known: set[str]) -> set[str]:
    reached = set(known)
    grown = True
    while grown:
        grown = False
        for exponents, _ in RELATIONS:
            open_ones = [name for name in exponents if name not in reached]
            if len(open_ones) == 1:
                reached.add(open_ones[0])
                grown = True
    return reached


def _correlation_matrix(
    inputs: Sequence[ShellInput], correlations: Mapping[tuple[str, str], float]
) -> FloatArray:
    matrix = np.eye(len(inputs))
    if not correlations:
        return matrix
    for pair, coefficient in correlations.items():
        places = []
        for name in pair:
            found = [i for i, given in enumerate(inputs) if name in (given.key, given.quantity)]
            if not found:
                raise InputRefused(
                    f"A correlation names a {WORDS.get(name, name)}, which is not among the stated values.",
                    why="Only errors of stated values can be correlated.",
                    hint="Name two stated values, such as speed and distance.",
                    code="correlation-refused",
                )
            places.append(found[0])
        if places[0] == places[1]:
            raise InputRefused(
                f"A correlation of {pair[0]} with itself says nothing.",
                why="An error is always one with itself.",
                hint="Name two different values, such as speed and distance.",
                code="correlation-refused",
            )
        matrix[places[0], places[1]] = matrix[places[1], places[0]] = coefficient
    if not np.isfinite(matrix).all() or np.abs(matrix).max() > 1.0 or np.linalg.eigvalsh(matrix)[0] < -1e-9:
        raise InputRefused(
            "These correlations cannot hold together.",
            why="Each lies between -1 and 1, and so must every combination of them.",
            hint="Give a correlation such as 0.95 between speed and distance.",
            code="correlation-refused",
        )
    return matrix
