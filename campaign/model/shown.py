"""What a look at the catalogue returns: systems with derived values, logged observations."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

from campaign.model.instants import Moment
from campaign.model.measured import Measured
from campaign.model.observations import Observation
from campaign.model.records import SystemRecord
from campaign.model.suspicion import Suspicion


@dataclass(frozen=True, slots=True)
class DerivedValue:
    """A value computed from catalogued ones, with how it came about; never stored."""

    quantity: str
    value: Measured
    unit: str
    how: str


@dataclass(frozen=True, slots=True)
class ShownSystem:
    """Everything that the catalogue holds of one system, and what follows from it."""

    record: SystemRecord
    derived: tuple[DerivedValue, ...]
    observation_counts: Mapping[str, int] = field(default_factory=dict)


@dataclass(frozen=True, slots=True)
class LoggedEntry:
    """One observation: its number, whether it had been logged before, what it was."""

    id: int
    already_logged: bool
    observation: Observation


@dataclass(frozen=True, slots=True)
class Logged:
    """What ``log`` did: the instant as understood, the entries, and what the catalogue now knows."""

    system: str
    understood: str
    moment: Moment
    moment_text: str
    site: str | None
    entries: tuple[LoggedEntry, ...]
    knowledge: tuple[str, ...]
    suspected: bool
    warnings: tuple[str, ...] = ()
    suspicion: Suspicion | None = None
