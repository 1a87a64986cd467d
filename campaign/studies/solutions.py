"""Keep solutions: add one, adopt one or several with weights, and map each to the system's cycle count."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import replace

import numpy as np

from campaign.catalogue import solutions as kept
from campaign.catalogue import store, systems
from campaign.errors import Conflict, InputRefused
from campaign.model.instants import Moment, TypedInstant
from campaign.model.kept import Kept, Stamp
from campaign.model.measured import Covariance, Measured
from campaign.model.systems import Solution, System
from campaign.studies.basis import describe_solution
from campaign.studies.cycles import count_is_safe, cycle_of, nominal_period_d
from campaign.studies.instants import moment_of, spoken_moment
from campaign.studies.periastron import periastron_epoch


def add_solution(
    db: str,
    stamp: Stamp,
    system_name: str,
    draft: Solution,
    epoch: TypedInstant | None,
    data_until: TypedInstant | None,
    published_cycle: int | None,
    adopt: bool,
    correlations: Sequence[tuple[str, str, float]] = (),
) -> Kept:
    """Add one set of orbital elements, and adopt it if asked.

    Parameters
    ----------
    db : str
        Path or SQLAlchemy URL.
    stamp : Stamp
        Who, when, which command.
    system_name : str
        Name or alias.
    draft : Solution
        Elements in their units; ``epoch`` and ``data_until_bmjd_tdb`` are filled in here.
    epoch, data_until : TypedInstant or None
        As typed; put on the barycentric axis with the system's position.
    published_cycle : int or None
        The publication's own cycle number of the epoch.
    adopt : bool
        Adopt it alone; refused when another solution is adopted.
    correlations : sequence of (str, str, float)
        Pairs of fields of ``Solution`` with their correlation (dimensionless).

    Returns
    -------
    Kept
        What was written, with the epoch as understood.

    Raises
    ------
    NotFound, Conflict, InputRefused
        Unknown system; label taken or another solution adopted; nothing to keep.

    Notes
    -----
    Accuracy: the cycle of the epoch is the nearest whole number of periods from the system's anchor; a
    count that could be off by one is said.

    Source: DEVELOPERS.md (cycle).
    """
    with store.writing(db, at=stamp.at, who=stamp.who, command=stamp.command) as writing:
        return enter_solution(
            writing, system_name, draft, epoch, data_until, published_cycle, adopt, correlations
        )


def enter_solution(
    writing: store.Writing,
    system_name: str,
    draft: Solution,
    epoch: TypedInstant | None,
    data_until: TypedInstant | None,
    published_cycle: int | None,
    adopt: bool,
    correlations: Sequence[tuple[str, str, float]] = (),
) -> Kept:
    """Add a set of orbital elements within an operation that is under way.

    Parameters
    ----------
    writing : Writing
        The operation.
    system_name, draft, epoch, data_until, published_cycle, adopt, correlations
        As for :func:`add_solution`.

    Returns
    -------
    Kept
        What was written, with the epoch as understood.

    Raises
    ------
    NotFound, Conflict, InputRefused
        As :func:`add_solution`.

    Notes
    -----
    Accuracy: as :func:`add_solution`. Source: DEVELOPERS.md (cycle).
    """
    if draft.period_d is None and epoch is None:
        raise InputRefused(
            "The solution says neither a period nor an epoch.",
            why="Without at least one of them nothing recurs.",
            hint='Give for example --period "3127.5±0.3 d" --epoch "BJD 2461234.2±0.5".',
            code="solution-empty",
        )
    system = systems.find_system(writing.connection, system_name)
    moment = moment_of(epoch, system) if epoch is not None else None
    if moment is not None and epoch is not None and _is_clock_reading(epoch):
        moment = replace(moment, minus_d=None, plus_d=None)
    until = moment_of(data_until, system).bmjd_tdb if data_until is not None else None
    known = kept.solutions_of(writing.connection, system.id)
    solution = replace(
        draft,
        system_id=system.id,
        label=draft.label or _free_label(known),
        epoch=moment,
        data_until_bmjd_tdb=until,
    )
    solution = replace(solution, covariance=_covariance(solution, correlations))
    cycle, warnings = _cycle_in(system, solution)
    solution = replace(
        solution,
        epoch_cycle=cycle,
        published_cycle_offset=None if published_cycle is None else published_cycle - (cycle or 0),
    )
    others = [s for s in known if s.adopted]
    if adopt and others:
        raise _already_adopted(
            system, others, f"Add it without --adopt, then: {_adopt_line(system, solution)} --instead"
        )
    solution_id = kept.add_solution(writing, solution)
    if adopt:
        kept.adopt_alone(writing, solution_id)
        _anchor(writing, system, replace(solution, id=solution_id))
    text = describe_solution(solution)
    writing.summarise(f"added solution {text} to {system.name}" + (" and adopted it" if adopt else ""))
    period = text.removeprefix(f"{solution.label}: ")
    lines = [
        f"{system.name}: added '{solution.label}', {period}" + (", adopted" if adopt else ", not adopted")
    ]
    if moment is not None:
        lines.append(f"epoch ({solution.epoch_marks}) understood as {spoken_moment(moment)}")
    if not adopt:
        lines.append(f"adopt it with: {_adopt_line(system, solution)}" + (" --instead" if others else ""))
    data = {
        "system": system.name,
        "solution": solution.label,
        "id": solution_id,
        "adopted": adopt,
        "epoch_cycle": cycle,
    }
    return Kept("solution-add", True, tuple(lines), data, tuple(warnings))


def _covariance(solution: Solution, correlations: Sequence[tuple[str, str, float]]) -> Covariance | None:
    """Covariance matrix from pairwise correlations and the stated errors."""
    if not correlations:
        return None
    named = [
        ("a_au" if solution.a_au is not None else "a_arcsec") if name == "a" else name
        for pair in correlations
        for name in pair[:2]
    ]
    names = tuple(dict.fromkeys(named))
    sigmas = [_sigma(solution, name) for name in names]
    matrix = [[s * s if i == j else 0.0 for j in range(len(names))] for i, s in enumerate(sigmas)]
    for (first, second), (_, _, value) in zip(
        zip(named[::2], named[1::2], strict=True), correlations, strict=True
    ):
        i, j = names.index(first), names.index(second)
        matrix[i][j] = matrix[j][i] = value * sigmas[i] * sigmas[j]
    scale = np.array(sigmas)
    if np.linalg.eigvalsh(np.array(matrix) / np.outer(scale, scale)).min() <= 0.0:
        raise InputRefused(
            "These correlations cannot hold together.",
            why="No set of elements could scatter so: their correlation matrix is not positive definite.",
            hint="Check signs and values: a correlation of 0.99 with one element bounds the others.",
            code="correlation-refused",
        )
    return Covariance(names, tuple(tuple(row) for row in matrix))


def _sigma(solution: Solution, name: str) -> float:
    value = getattr(solution, name)
    if isinstance(value, Moment):
        value = Measured(value.bmjd_tdb, value.minus_d, value.plus_d)
    sigma = value.sigma if isinstance(value, Measured) else None
    if not sigma:
        raise InputRefused(
            f"A correlation was given with '{name}', which has no error.",
            why="A covariance is the correlation times both errors.",
            hint='State the element with its error, for example --period "3127.5±0.3 d".',
            code="correlation-refused",
        )
    return float(sigma)


def adopt_solutions(
    db: str, stamp: Stamp, system_name: str, weights: Mapping[str, float | None], instead: bool
) -> Kept:
    """Adopt one solution alone, or several with weights.

    Parameters
    ----------
    db : str
        Path or SQLAlchemy URL.
    stamp : Stamp
        Who, when, which command.
    system_name : str
        Name or alias.
    weights : mapping of str to float or None
        Labels; one without a weight is adopted alone, several need positive weights (dimensionless).
    instead : bool
        Replace what is adopted now.

    Returns
    -------
    Kept
        What was adopted.

    Raises
    ------
    NotFound, Conflict, InputRefused
        Unknown system or label; another adopted without weights; some weights missing or not positive.

    Notes
    -----
    Accuracy: weights are used relative to their sum.

    Source: DEVELOPERS.md (solution).
    """
    _check_weights(weights)
    with store.writing(db, at=stamp.at, who=stamp.who, command=stamp.command) as writing:
        system = systems.find_system(writing.connection, system_name)
        found = {label: kept.find_solution(writing.connection, system.id, label) for label in weights}
        if len(found) == 1 and next(iter(weights.values())) is None:
            solution = next(iter(found.values()))
            others = [
                s
                for s in kept.solutions_of(writing.connection, system.id)
                if s.adopted and s.id != solution.id
            ]
            if others and not instead:
                shares = " ".join(f'"{s.label}=0.5"' for s in (others[0], solution))
                raise _already_adopted(
                    system,
                    others,
                    f"Replace it: {_adopt_line(system, solution)} --instead; or weigh them, as {shares}.",
                )
            (kept.adopt_instead if instead else kept.adopt_alone)(writing, solution.id)
            _anchor(writing, system, solution)
            text = f"adopted '{solution.label}' alone"
        else:
            kept.adopt_weighted(
                writing,
                system.id,
                {found[label].id: float(weight or 0.0) for label, weight in weights.items()},
            )
            for solution in found.values():
                _anchor(writing, systems.get_system(writing.connection, system.id), solution)
            text = "adopted " + ", ".join(
                f"'{label}' with weight {weight:g}" for label, weight in weights.items()
            )
        writing.summarise(f"{system.name}: {text}")
        changed = writing.changed
    data = {"system": system.name, "adopted": dict(weights)}
    return Kept("solution-adopt", changed, (f"{system.name}: {text}",), data)


def _adopt_line(system: System, solution: Solution) -> str:
    return f'campaign solution adopt "{system.name}" "{solution.label}"'


def _already_adopted(system: System, others: Sequence[Solution], hint: str) -> Conflict:
    labels = ", ".join(f"'{s.label}'" for s in others)
    return Conflict(
        f"{system.name} is already forecast from {labels}.",
        why="Two solutions stand side by side only with weights.",
        hint=hint,
        code="already-adopted",
        details={"adopted": [s.label for s in others]},
    )


def _is_clock_reading(epoch: TypedInstant) -> bool:
    """An epoch typed to the second without an error: the clock is exact, the orbit is not."""
    small_d = 1.0 / 86_400.0
    return epoch.precision in ("second", "minute") and (epoch.plus_d or 0.0) < 60.0 * small_d


def _check_weights(weights: Mapping[str, float | None]) -> None:
    stated = [w for w in weights.values() if w is not None]
    if len(weights) > 1 and len(stated) < len(weights):
        raise InputRefused(
            "Several solutions are to be adopted, not all with a weight.",
            why="Side by side they are a mixture, and a mixture needs the weight of each.",
            hint='Give each its weight, for example "first=0.6" "second=0.4", or adopt one alone.',
            code="weights-missing",
        )
    if any(not (math.isfinite(w) and w > 0.0) for w in stated):
        raise InputRefused(
            "A weight is not a positive number.",
            why="Weights are relative shares; a solution without a share is simply not adopted.",
            hint='For example "first=0.6" "second=0.4".',
            code="weight-refused",
        )


def _free_label(known: list[Solution]) -> str:
    taken = {s.label for s in known}
    number = len(known) + 1
    while f"solution {number}" in taken:
        number += 1
    return f"solution {number}"


def _cycle_in(system: System, solution: Solution) -> tuple[int | None, list[str]]:
    """The epoch's cycle on the system's anchored count, and a warning where the count is unsafe."""
    period = nominal_period_d(solution)
    if system.cycle_anchor_bmjd_tdb is None or solution.epoch is None or period is None:
        return None, []
    epoch = periastron_epoch(solution, period) or solution.epoch.bmjd_tdb
    cycle = cycle_of(epoch, system.cycle_anchor_bmjd_tdb, period)
    sigma = solution.period_d.sigma if isinstance(solution.period_d, Measured) else None
    if count_is_safe(cycle, period, solution.epoch.plus_d or 0.0, sigma or 0.0):
        return cycle, []
    return cycle, [
        f"the epoch of '{solution.label}' is counted as cycle {cycle}, but with its errors the count "
        "may be off by one"
    ]


def _anchor(writing: store.Writing, system: System, solution: Solution) -> None:
    """The first adopted epoch becomes cycle 0, and every other solution is counted from it."""
    period = nominal_period_d(solution)
    if solution.epoch is None or period is None:
        return
    if system.cycle_anchor_bmjd_tdb is not None:
        return
    epoch = periastron_epoch(solution, period) or solution.epoch.bmjd_tdb
    systems.set_cycle_anchor(writing, system.id, epoch, period)
    anchored = replace(system, cycle_anchor_bmjd_tdb=epoch)
    for other in kept.solutions_of(writing.connection, system.id):
        cycle = 0 if other.id == solution.id else _cycle_in(anchored, other)[0]
        offset = other.published_cycle_offset
        if offset is not None and other.epoch_cycle is None and cycle is not None:
            offset -= cycle
        kept.set_epoch_cycle(writing, other.id, cycle, offset)
