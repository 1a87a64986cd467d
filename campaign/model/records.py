"""Everything a forecast needs to know of one system, loaded at once."""

from __future__ import annotations

from dataclasses import dataclass

from campaign.model.systems import DustRule, Episode, Solution, System


@dataclass(frozen=True, slots=True)
class SystemRecord:
    """One system with its solutions, its present dust rule and its episodes."""

    system: System
    solutions: tuple[Solution, ...] = ()
    rule: DustRule | None = None
    episodes: tuple[Episode, ...] = ()
