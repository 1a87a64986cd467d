"""Who changes the catalogue, and what a change came to."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from datetime import datetime
from typing import Any


@dataclass(frozen=True, slots=True)
class Stamp:
    """Who makes an entry, when (aware datetime) and with which command."""

    at: datetime
    who: str
    command: str


@dataclass(frozen=True, slots=True)
class Kept:
    """What a keeping command did: ``lines`` for people, ``data`` for programs (units in its keys)."""

    kind: str
    changed: bool
    lines: tuple[str, ...]
    data: Mapping[str, Any] = field(default_factory=dict)
    warnings: tuple[str, ...] = ()
