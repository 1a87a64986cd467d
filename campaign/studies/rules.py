"""Keep dust rules: how onset, maximum and end follow from the orbit."""

from __future__ import annotations

from dataclasses import replace
from itertools import pairwise

from campaign.catalogue import rules, store, systems
from campaign.errors import InputRefused
from campaign.model.kept import Kept, Stamp
from campaign.model.systems import DustRule
from campaign.studies.elements import rule_lines


def set_rule(db: str, stamp: Stamp, system_name: str, rule: DustRule) -> Kept:
    """Give a system its dust rule; the earlier one is kept as past.

    Parameters
    ----------
    db : str
        Path or SQLAlchemy URL.
    stamp : Stamp
        Who, when, which command.
    system_name : str
        Name or alias.
    rule : DustRule
        Offsets in periods or days, distances in au, speed in km/s.

    Returns
    -------
    Kept
        What was written.

    Raises
    ------
    NotFound, InputRefused
        Unknown system; a rule that lacks what it needs.

    Notes
    -----
    Accuracy: not applicable. Source: DEVELOPERS.md (dust rules).
    """
    _check(rule)
    with store.writing(db, at=stamp.at, who=stamp.who, command=stamp.command) as writing:
        system = systems.find_system(writing.connection, system_name)
        rules.set_rule(writing, replace(rule, system_id=system.id))
        writing.summarise(f"set dust rule {rule.kind} for {system.name}")
    data = {"system": system.name, "rule": rule.kind}
    values = [f"{name} {text}" for name, text, _ in rule_lines(rule)[1:]]
    lines = (f"{system.name}: dust rule {rule.kind}", *values)
    return Kept("rule-set", True, lines, data)


def show_rule(db: str, system_name: str) -> tuple[str, DustRule | None]:
    """A system's dust rule.

    Parameters
    ----------
    db : str
        Path or SQLAlchemy URL.
    system_name : str
        Name or alias.

    Returns
    -------
    (str, DustRule or None)
        The system's name and its rule.

    Raises
    ------
    NotFound
        If the system is unknown.

    Notes
    -----
    Accuracy: not applicable. Source: the catalogue.
    """
    with store.reading(db) as connection:
        system = systems.find_system(connection, system_name)
        return system.name, rules.rule_of(connection, system.id)


def _check(rule: DustRule) -> None:
    if rule.kind in ("phase", "lag") and rule.onset is None and rule.maximum is None and rule.end is None:
        example = "-0.02±0.005" if rule.kind == "phase" else '"-40±10 d"'
        raise InputRefused(
            f"The rule '{rule.kind}' says nothing.",
            why="It needs the offset of at least one of onset, maximum and end from periastron.",
            hint=f"For example --{rule.kind}-onset {example}.",
            code="rule-empty",
        )
    if rule.kind == "separation" and rule.critical_separation_au is None:
        raise InputRefused(
            "The rule 'separation' has no critical separation.",
            why="Production runs while the stars are nearer than it.",
            hint='For example --separation "6.4±0.8 au".',
            code="rule-empty",
        )
    if (rule.condensation_distance_au is None) != (rule.flow_speed_kms is None):
        raise InputRefused(
            "The delay to condensation needs both its distance and the flow speed.",
            why="The delay is the one divided by the other.",
            hint='For example --condensation-distance "100±20 au" --flow-speed "2000±200 km/s".',
            code="rule-half",
        )
    if rule.kind in ("phase", "lag"):
        _check_order(rule)


def _check_order(rule: DustRule) -> None:
    stages = [
        (n, v.value) for n, v in (("onset", rule.onset), ("maximum", rule.maximum), ("end", rule.end)) if v
    ]
    for (first, earlier), (second, later) in pairwise(stages):
        if later < earlier:
            raise InputRefused(
                f"The {second} would come before the {first}.",
                why=f"Their offsets from periastron are {later:g} and {earlier:g}; negative means before it.",
                hint="Check the signs, for example an onset of -40 d and an end of 120 d.",
                code="rule-order",
            )
