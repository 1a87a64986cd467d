"""Measured shells solved: counted, fitted, and held together with what else is known of them."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

from campaign.model.measured import Measured
from campaign.model.records import SystemRecord
from campaign.model.shellquestion import ShellQuestion, ShellRadius
from campaign.physics.shellnetwork import Tension
from campaign.physics.shellrelations import RelationSolution, solve_shell_relations
from campaign.physics.shellvalues import Sided
from campaign.studies.shell_counting import Counted, count_shells
from campaign.studies.shell_ephemeris import ShellEphemeris
from campaign.studies.shell_fitting import (
    SHELLS,
    SHELLS_AND_PERIOD,
    GroupFit,
    best_motion,
    fit_group,
    fitted_inputs,
)
from campaign.studies.shell_images import RadiusGroup, grouped
from campaign.studies.shell_projection import Seen, as_seen, seen_as
from campaign.studies.shell_relations import (
    WIND,
    Stated,
    insufficient,
    none_if_nan,
    solve,
    with_wind_if_needed,
)

# From this tension on, stated values are not used together.
TENSE_SIGMA = 3.0
_FEW_DRAWS = 200
ONE_RADIUS = "The age of a single radius cannot be told from what is given."


@dataclass(frozen=True, slots=True)
class SolvedGroup:
    """One group of radii, counted and fitted, and how it is seen."""

    counted: Counted
    fit: GroupFit
    seen: Seen


@dataclass(frozen=True, slots=True)
class SolvedShells:
    """All groups, the largest first, and the five quantities as they follow from it and from what is stated.

    ``agrees`` says whether what would be used together does agree, ``period`` is the stated one, yr.
    ``solution`` compares; ``best`` also uses the stated period for the motion, where it agrees. Speeds in
    ``stated`` and in both solutions are those seen on the sky, as ``seen`` of the main group says.
    """

    groups: tuple[SolvedGroup, ...]
    stated: Stated
    solution: RelationSolution
    best: RelationSolution
    period: Measured | None
    agrees: bool

    @property
    def main(self) -> SolvedGroup:
        """The group from which spacing and motion are taken."""
        return self.groups[0]


def solve_shells(
    radii: Sequence[ShellRadius],
    stated: Stated,
    ephemeris: ShellEphemeris | None,
    question: ShellQuestion,
    record: SystemRecord | None = None,
) -> SolvedShells:
    """Count and fit measured radii, and solve the relations with what is stated.

    Parameters
    ----------
    radii : sequence of ShellRadius
        At least one, arcsec.
    stated : Stated
        Quantities in the units of their names (arcsec, mas/yr, km/s, yr, pc).
    ephemeris : ShellEphemeris or None
        Launches of the system's cycles.
    question : ShellQuestion
        How radii are to be taken, and the random draws.
    record : SystemRecord or None
        For the orientation of the orbit, deg.

    Returns
    -------
    SolvedShells
        In the same units.

    Raises
    ------
    InputRefused
        For radii or values that cannot be, or too few of them.

    Notes
    -----
    Accuracy and source: see ``campaign.physics.shellspacing``, ``shellmotion`` and ``shellrelations``.
    """
    given = stated.get("period_yr")
    period = None if given is None else Measured(given.value, given.minus, given.plus)
    ordered = grouped(radii, question)
    views = [seen_as(group, question, record) for group in ordered]
    stated = as_seen(stated, views[0])
    groups = tuple(
        _solve_group(group, seen, question, stated, period, ephemeris)
        for group, seen in zip(ordered, views, strict=True)
    )
    inputs, correlations = fitted_inputs(groups[0].fit)
    if not inputs and not stated.inputs:
        raise insufficient(stated, ONE_RADIUS)
    both = with_wind_if_needed(
        Stated((*stated.inputs, *inputs), {**stated.correlations, **correlations}, stated.assumptions)
    )
    solution = solve(both, question.draws, question.seed)
    compared = {each.key for each in both.inputs if each.compare_only}
    agrees = not any(
        tension.sigma is not None
        and abs(tension.sigma) >= TENSE_SIGMA
        and compared.isdisjoint((*tension.determined_from, *tension.against))
        for tension in solution.tensions
    )
    best = _sharpened(groups[0], both, solution, period, agrees, question)
    return SolvedShells(groups, both, solution, best, period, agrees)


def _sharpened(
    main: SolvedGroup,
    stated: Stated,
    solution: RelationSolution,
    period: Measured | None,
    agrees: bool,
    question: ShellQuestion,
) -> RelationSolution:
    """The relations with spacing and motion as they follow from the radii and the stated period together.

    The period is then in the motion, and not used a second time; it stands as it was stated.
    """
    if main.fit.motion is None:
        return solution
    joint = best_motion(main.fit, period, agrees)
    if joint is main.fit.motion:
        return solution
    inputs, correlations = fitted_inputs(replace(main.fit, motion=joint), SHELLS_AND_PERIOD)
    others = tuple(i for i in stated.inputs if i.label != SHELLS and i.quantity != "period_yr")
    pairs = {
        pair: rho
        for pair, rho in stated.correlations.items()
        if not any("period_yr" in name or name.endswith(f":{SHELLS}") for name in pair)
    }
    found = solve(Stated((*inputs, *others), {**pairs, **correlations}), question.draws, question.seed)
    as_stated = solution.get("period_yr")
    return replace(
        found,
        quantities=tuple(
            as_stated if each.quantity == "period_yr" and as_stated is not None else each
            for each in found.quantities
        ),
    )


def expansion_parallax(stated: Stated) -> tuple[Tension, ...]:
    """The distance at which the shells would move with the terminal wind, against the distance stated.

    Parameters
    ----------
    stated : Stated
        With the wind for comparison alone (km/s), a motion (mas/yr) and a distance (pc).

    Returns
    -------
    tuple of Tension
        One or none; pc.

    Notes
    -----
    Accuracy: first order. Source: D = v / (4.740470464 mu).
    """
    wind = next((i for i in stated.inputs if i.compare_only and i.label == WIND), None)
    motion, distance = stated.get("proper_motion_mas_yr"), stated.get("distance_pc")
    if wind is None or motion is None or distance is None or stated.get("speed_kms") is not None:
        return ()
    usable = type(wind)(wind.quantity, wind.value, wind.minus, wind.plus, wind.label)
    solution = solve_shell_relations([motion, usable, distance], draws=_FEW_DRAWS)
    return tuple(t for t in solution.tensions if t.quantity == "distance_pc")


def _solve_group(
    group: RadiusGroup,
    seen: Seen,
    question: ShellQuestion,
    stated: Stated,
    period: Measured | None,
    ephemeris: ShellEphemeris | None,
) -> SolvedGroup:
    spacing = _known("spacing_arcsec", stated)
    usable = None if spacing is None or not spacing.known else spacing
    counting = period
    if counting is None:
        derived = _known("period_yr", stated)
        counting = None if derived is None else Measured(derived.value, derived.minus, derived.plus)
    counted = count_shells(group, question.missing_prior, usable, counting, ephemeris)
    fit = fit_group(group, counted.index, counted.cycle, period, scale_errors=question.scale_errors)
    return SolvedGroup(counted, fit, seen)


def _known(quantity: str, stated: Stated) -> Sided | None:
    """A quantity as it follows from what is stated alone, without the radii."""
    others = tuple(each for each in stated.inputs if not each.compare_only)
    if not others:
        return None
    found = solve(Stated(others, stated.correlations), _FEW_DRAWS, None).get(quantity)
    if found is None:
        return None
    size = none_if_nan(found.spread.sigma)
    return Sided(found.spread.value, size, size)
