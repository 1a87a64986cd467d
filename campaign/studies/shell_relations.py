"""The five quantities that shells tie together: what is stated, what follows, and whether it agrees."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

from campaign.errors import InputRefused
from campaign.model.measured import Measured
from campaign.model.shells import ShellQuantity, ShellQuantityName, ShellTension
from campaign.physics.shellnetwork import ShellInput, SolvedQuantity, Tension
from campaign.physics.shellrelations import RelationSolution, solve_shell_relations, what_would_do
from campaign.studies.rows import distance_of
from campaign.studies.sampling import DEFAULT_DRAWS
from campaign.studies.shell_subject import ShellSubject, seed_of

# How a person calls each quantity.
SPOKEN: dict[str, str] = {
    "spacing_arcsec": "spacing",
    "proper_motion_mas_yr": "motion",
    "speed_kms": "speed",
    "period_yr": "period",
    "distance_pc": "distance",
}
FLAGS: dict[str, str] = {name: f"--{word}" for name, word in SPOKEN.items()}
WIND = "wind"
# Forms of each quantity that would be accepted, for a hint.
_EXAMPLES: dict[str, str] = {
    "spacing_arcsec": '--spacing "1.20±0.05 arcsec"',
    "proper_motion_mas_yr": '--motion "80±5 mas/yr"',
    "speed_kms": '--speed "1800±100 km/s"',
    "period_yr": '--period "8.6±0.1 yr"',
    "distance_pc": '--distance "2.1±0.2 kpc"',
}
# More ways out than this nobody reads.
_MOST_WAYS = 4
Correlations = Mapping[tuple[str, str], float]


@dataclass(frozen=True, slots=True)
class Stated:
    """Inputs of the relations from options and catalogue, their correlations, and what had to be assumed."""

    inputs: tuple[ShellInput, ...]
    correlations: Correlations
    assumptions: tuple[str, ...] = ()

    def get(self, quantity: str) -> ShellInput | None:
        """The first input of a quantity from which others may follow."""
        return next((i for i in self.inputs if i.quantity == quantity and not i.compare_only), None)


def stated_inputs(
    stated: Mapping[ShellQuantityName, Measured],
    correlations: Mapping[tuple[ShellQuantityName, ShellQuantityName], float],
    subject: ShellSubject | None,
    period: tuple[Measured, str] | None,
) -> Stated:
    """What options and catalogue say of the five quantities; an option stands in place of the catalogue.

    Parameters
    ----------
    stated : mapping
        Typed values in the units of their names (arcsec, mas/yr, km/s, yr, pc).
    correlations : mapping
        Of pairs of typed values (dimensionless).
    subject : ShellSubject or None
        For distance and wind.
    period : (Measured, str) or None
        Julian years, and what it is from.

    Returns
    -------
    Stated
        The wind of star A is there for comparison alone.

    Notes
    -----
    Accuracy: nothing is computed, but a distance from a parallax.

    Source: the catalogue; dust need not move with the terminal speed of a wind (common practice).
    """
    inputs = [_input(name, value, "given") for name, value in stated.items()]
    assumptions = []
    if period is not None and "period_yr" not in stated:
        inputs.append(_input("period_yr", period[0], period[1]))
    if subject is not None:
        distance = distance_of(subject.record)
        if distance is not None and "distance_pc" not in stated:
            inputs.append(_input("distance_pc", distance, "catalogue"))
            if subject.record.system.distance_pc is None:
                assumptions.append("distance from the parallax of the catalogue")
        wind = subject.record.system.star_a.wind_speed_kms
        if wind is not None and "speed_kms" not in stated:
            inputs.append(_input("speed_kms", wind, WIND, compare_only=True))
    return Stated(tuple(inputs), {pair: rho for pair, rho in correlations.items()}, tuple(assumptions))


def with_wind_if_needed(stated: Stated) -> Stated:
    """Let the terminal wind speed of star A speak for the shells where nothing else gives their motion.

    Parameters
    ----------
    stated : Stated
        Inputs in the units of their names (arcsec, mas/yr, km/s, yr, pc).

    Returns
    -------
    Stated
        The same, or with the wind as a speed of the shells, and said so.

    Notes
    -----
    Accuracy: dust may be slower than the wind, or faster where light accelerates it.

    Source: DEVELOPERS.md (Shells).
    """
    wind = next((i for i in stated.inputs if i.compare_only and i.label == WIND), None)
    # Without anything but a wind no relation holds, and the solver has nothing to say.
    plain = [i for i in stated.inputs if not i.compare_only]
    if wind is None or (plain and solve_shell_relations(plain, draws=100).get("proper_motion_mas_yr")):
        return stated
    used = ShellInput(wind.quantity, wind.value, wind.minus, wind.plus, WIND)
    if not plain or solve_shell_relations([*plain, used], draws=100).get("proper_motion_mas_yr") is None:
        return stated
    others = tuple(i for i in stated.inputs if i is not wind)
    return Stated(
        (*others, used),
        stated.correlations,
        (
            *stated.assumptions,
            "the shells are taken to move with the terminal wind of star A; dust may be slower, or "
            "faster where light accelerates it",
        ),
    )


def solve(stated: Stated, draws: int | None, seed: int | None) -> RelationSolution:
    """The five quantities as far as they follow, and the tensions among what is stated.

    Parameters
    ----------
    stated : Stated
        Inputs in the units of their names (arcsec, mas/yr, km/s, yr, pc).
    draws, seed : int or None
        Of the random draws (dimensionless).

    Returns
    -------
    RelationSolution
        See ``campaign.physics.shellrelations``.

    Raises
    ------
    InputRefused
        For values that cannot be, or correlations that cannot hold together.

    Notes
    -----
    Accuracy and source: see ``campaign.physics.shellrelations``.
    """
    return solve_shell_relations(stated.inputs, stated.correlations, draws or DEFAULT_DRAWS, seed_of(seed))


def shell_quantities(solution: RelationSolution) -> tuple[ShellQuantity, ...]:
    """Solved quantities for the screen and for programs.

    Parameters
    ----------
    solution : RelationSolution
        In the units of the names (arcsec, mas/yr, km/s, yr, pc).

    Returns
    -------
    tuple of ShellQuantity
        In the same units; unknown errors are None. What was fitted to radii counts as derived.

    Notes
    -----
    Accuracy: no number is changed. Source: project convention.
    """
    return tuple(_quantity(each) for each in solution.quantities)


def _quantity(solved: SolvedQuantity) -> ShellQuantity:
    spread, stated = solved.spread, solved.origin == "given"
    fitted = stated and solved.label.startswith("shells")
    sigma, lo68, hi68, lo95, hi95 = (
        none_if_nan(x) for x in (spread.sigma, spread.lo68, spread.hi68, spread.lo95, spread.hi95)
    )
    return ShellQuantity(
        solved.quantity,  # type: ignore[arg-type]
        spread.value, sigma, lo68, hi68, lo95, hi95,
        "derived" if fitted else solved.origin,
        source=label_in_words(solved.label) if stated else "",
        basis=tuple(key_in_words(key) for key in solved.basis) if not stated else (),
    )  # fmt: skip


def shell_tensions(tensions: Sequence[Tension], reasons: Sequence[tuple[str, ...]]) -> list[ShellTension]:
    """Tensions in words.

    Parameters
    ----------
    tensions : sequence of Tension
        Values in the units of the names.
    reasons : sequence of tuple of str
        Likely reasons of each.

    Returns
    -------
    list of ShellTension
        Signed, in sigma of the difference.

    Notes
    -----
    Accuracy: no number is changed. Source: DEVELOPERS.md (Disagreement).
    """
    return [
        ShellTension(
            quantity=each.quantity,
            determined_from=_together(each.determined_from),
            against=_together(each.against),
            sigma=each.sigma,
            value=each.value,
            against_value=each.against_value,
            reasons=why,
        )
        for each, why in zip(tensions, reasons, strict=True)
    ]


def key_in_words(key: str) -> str:
    """``period_yr:orbit`` as ``period of the orbit``.

    Parameters
    ----------
    key : str
        Quantity and label of an input (no unit).

    Returns
    -------
    str
        One phrase.

    Notes
    -----
    Accuracy: not applicable. Source: project convention.
    """
    quantity, _, label = key.partition(":")
    word = SPOKEN.get(quantity, quantity)
    return {
        "given": f"{word} stated",
        "shells": f"{word} of the shells",
        "shells and period": f"{word} of the shells",
        "orbit": f"{word} of the orbit",
        "episodes": f"{word} of the episodes",
        "catalogue": f"{word} in the catalogue",
        "flow": "flow speed of the dust rule",
        WIND: "terminal wind of star A",
    }.get(label, f"{word} ({label})")


def label_in_words(label: str) -> str:
    """What a stated quantity is from.

    Parameters
    ----------
    label : str
        Label of an input (no unit).

    Returns
    -------
    str
        One phrase.

    Notes
    -----
    Accuracy: not applicable. Source: project convention.
    """
    return {
        "given": "stated",
        "shells": "fitted to the radii",
        "shells and period": "fitted to the radii and the period",
        "flow": "flow speed of the dust rule",
        "orbit": "orbit",
        "episodes": "dated episodes",
        "catalogue": "catalogue",
        WIND: "terminal wind of star A",
    }.get(label, label)


def would_do(sets: Sequence[Sequence[str]]) -> str:
    """Sets of quantities, any one of which would do, as options.

    Parameters
    ----------
    sets : sequence of sequences of str
        Names of quantities (no unit).

    Returns
    -------
    str
        One phrase, such as ``--period, or --speed and --distance``.

    Notes
    -----
    Accuracy: not applicable. Source: project convention.
    """
    shortest = sorted((s for s in sets if s), key=len)[:_MOST_WAYS]
    return ", or ".join(" and ".join(_EXAMPLES[name] for name in names) for names in shortest)


def insufficient(stated: Stated, message: str) -> InputRefused:
    """The refusal of what does not give an age, with what would.

    Parameters
    ----------
    stated : Stated
        What is known (arcsec, mas/yr, km/s, yr, pc).
    message : str
        What cannot be told.

    Returns
    -------
    InputRefused
        To be raised.

    Notes
    -----
    Accuracy: not applicable. Source: rank of the relations.
    """
    known = {each.quantity for each in stated.inputs if not each.compare_only}
    sets = what_would_do(known, ["proper_motion_mas_yr"])
    return InputRefused(
        message,
        why="Age is radius over motion, or a count of periods: it takes a motion, a spacing and a period, or "
        "a speed and a distance.",
        hint=f"Add {would_do(sets)}.",
        code="shells-insufficient",
        details={"would_do": [list(names) for names in sets]},
    )


def none_if_nan(value: float) -> float | None:
    """None in place of NaN.

    Parameters
    ----------
    value : float
        Any unit.

    Returns
    -------
    float or None
        In the same unit.

    Notes
    -----
    Accuracy: exact. Source: project convention.
    """
    return None if math.isnan(value) else float(value)


def _input(name: str, value: Measured, label: str, *, compare_only: bool = False) -> ShellInput:
    return ShellInput(name, value.value, value.minus, value.plus, label, compare_only)


def _together(keys: Sequence[str]) -> str:
    words = [key_in_words(key) for key in keys]
    return words[0] if len(words) == 1 else f"{', '.join(words[:-1])} and {words[-1]}"
