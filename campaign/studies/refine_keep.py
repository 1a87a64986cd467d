"""Keep a refined solution, and adopt it if asked: one operation that can be taken back as a whole."""

from __future__ import annotations

from dataclasses import replace

from campaign.catalogue import rules, store, systems
from campaign.catalogue import solutions as kept
from campaign.errors import Conflict, InputRefused
from campaign.model.instants import Moment
from campaign.model.kept import Kept, Stamp
from campaign.model.systems import DustRule, Solution
from campaign.studies.basis import describe_solution
from campaign.studies.cycles import cycle_of, nominal_period_d
from campaign.studies.instants import spoken_moment
from campaign.studies.periastron import periastron_epoch
from campaign.studies.refine import Refined


def refuse_label(db: str, system_name: str, label: str) -> None:
    """Refuse a label that the system has already, before anything is computed.

    Parameters
    ----------
    db : str
        Path or SQLAlchemy URL.
    system_name, label : str
        Name or alias; label of the new solution.

    Raises
    ------
    NotFound, Conflict
        Unknown system; a label that is taken.

    Notes
    -----
    Accuracy: exact (no numbers). Source: DEVELOPERS.md (solution).
    """
    with store.reading(db) as connection:
        system = systems.find_system(connection, system_name)
        taken = {s.label.casefold(): s.label for s in kept.solutions_of(connection, system.id)}
    known = taken.get(" ".join(label.split()).casefold())
    if known is not None:
        raise Conflict(
            f"{system.name} already has a solution labelled '{known}'.",
            why="What was kept stays as it was; labels are compared without regard to case and spaces.",
            hint=f'Give the new one a label of its own, for example --keep "{known}, refined".',
            code="label-taken",
            details={"label": known},
        )


def keep_refined(db: str, stamp: Stamp, refined: Refined, *, adopt: bool) -> Kept:
    """Enter the proposed solution, and let the forecast rest on it alone if asked.

    Parameters
    ----------
    db : str
        Path or SQLAlchemy URL.
    stamp : Stamp
        Who, when, which command.
    refined : Refined
        See ``campaign.studies.refine``.
    adopt : bool
        Whether to adopt it in place of what is adopted; the rule 'learned' is set with it where dates can
        follow from the episodes only.

    Returns
    -------
    Kept
        What was written.

    Raises
    ------
    NotFound, Conflict, InputRefused
        Unknown system; a label that is taken; nothing to keep.

    Notes
    -----
    Accuracy: days as fitted, with covariance. Source: DEVELOPERS.md (refined solutions).
    """
    proposal, name = refined.proposal, refined.result.system
    if proposal is None:
        raise InputRefused(
            f"There is no solution of {name} to keep.",
            why="One episode has no period.",
            hint=f'Confirm another one: campaign episodes find "{name}"',
            code="recurrence-undetermined",
        )
    with store.writing(db, at=stamp.at, who=stamp.who, command=stamp.command) as writing:
        system = systems.find_system(writing.connection, name)
        others = kept.solutions_of(writing.connection, system.id)
        solution_id = kept.add_solution(writing, replace(proposal, system_id=system.id))
        text = describe_solution(proposal)
        lines = [f"{name}: kept {text}; {proposal.source}"]
        if proposal.epoch is not None:
            lines.append(f"epoch ({proposal.epoch_marks}) {spoken_moment(proposal.epoch)}")
        if adopt:
            kept.adopt_instead(writing, solution_id)
            _anchor(writing, system.id, proposal, others)
            before = [s.label for s in others if s.adopted]
            lines.append(
                "adopted" + (f" in place of {', '.join(repr(label) for label in before)}" if before else "")
            )
            if refined.learns:
                rules.set_rule(writing, DustRule(0, system.id, "learned"))
                lines.append("dust rule learned: onset, maximum and end follow from the episodes")
        else:
            lines.append(f'adopt it with: campaign solution adopt "{name}" "{proposal.label}" --instead')
        writing.summarise(f"kept refined solution {text} of {name}" + (" and adopted it" if adopt else ""))
    return Kept(
        "refine-keep",
        True,
        tuple(lines),
        {
            "system": name,
            "solution": proposal.label,
            "id": solution_id,
            "adopted": adopt,
            "rule": "learned" if adopt and refined.learns else None,
            "epoch_cycle": proposal.epoch_cycle,
        },
    )


def _anchor(writing: store.Writing, system_id: int, solution: Solution, others: list[Solution]) -> None:
    """Cycle 0 stays where the episodes have it; other solutions are counted from there."""
    system = systems.get_system(writing.connection, system_id)
    period, epoch = nominal_period_d(solution), solution.epoch
    if system.cycle_anchor_bmjd_tdb is not None or period is None or not isinstance(epoch, Moment):
        return
    marked = periastron_epoch(solution, period) or epoch.bmjd_tdb
    zero = marked - (solution.epoch_cycle or 0) * period
    systems.set_cycle_anchor(writing, system_id, zero, period)
    for other in others:
        own = nominal_period_d(other)
        if other.epoch is None or own is None:
            continue
        place = periastron_epoch(other, own) or other.epoch.bmjd_tdb
        cycle = cycle_of(place, zero, own)
        offset = other.published_cycle_offset
        kept.set_epoch_cycle(
            writing, other.id, cycle,
            offset - cycle if offset is not None and other.epoch_cycle is None else offset,
        )  # fmt: skip
