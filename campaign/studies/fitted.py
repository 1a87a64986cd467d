"""Solutions that were fitted from the system's own episodes: they must not be counted beside those again."""

from __future__ import annotations

from collections.abc import Sequence

from campaign.model.systems import Solution

FITTED_SOURCE = "fitted from episodes"
_AND = " and "


def fitted_source(parent: Solution | None) -> str:
    """What stands as the source of a fitted solution.

    Parameters
    ----------
    parent : Solution or None
        The orbit that it was combined with.

    Returns
    -------
    str
        A phrase.

    Notes
    -----
    Accuracy: exact (no numbers). Source: project convention.
    """
    return FITTED_SOURCE if parent is None else f"{FITTED_SOURCE}{_AND}{parent.label}"


def is_fitted(solution: Solution) -> bool:
    """Whether a solution rests on the system's own episodes.

    Parameters
    ----------
    solution : Solution
        Any.

    Returns
    -------
    bool
        By its source (dimensionless).

    Notes
    -----
    Accuracy: exact for solutions that ``refine`` kept. Source: project convention.
    """
    return solution.source.startswith(FITTED_SOURCE)


def independent_of(solution: Solution | None, others: Sequence[Solution]) -> Solution | None:
    """The orbit that knows nothing of the episodes: the solution itself, or what it was combined with.

    Parameters
    ----------
    solution : Solution or None
        The one that speaks for the system.
    others : sequence of Solution
        All solutions of the system.

    Returns
    -------
    Solution or None
        None where the solution rests on episodes alone.

    Notes
    -----
    Accuracy: exact (no numbers). Source: information must not be counted twice (DEVELOPERS.md, refined
    solutions).
    """
    seen: set[int] = set()
    while solution is not None and is_fitted(solution):
        seen.add(solution.id)
        label = solution.source.removeprefix(FITTED_SOURCE).removeprefix(_AND)
        solution = next((s for s in others if s.label == label and s.id not in seen), None)
    return solution
