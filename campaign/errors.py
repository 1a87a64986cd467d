"""One exception tree. Each error carries its exit status and says what, why and what to do next.

This module imports nothing of ours, so that every layer may raise from it.
"""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any, ClassVar


class CampaignError(Exception):
    """An error that a user can act on.

    Parameters
    ----------
    message
        What happened, one sentence.
    why
        The reason, one sentence.
    hint
        What to do next, preferably a form that would be accepted.
    code
        Stable kebab-case name for programs; the class has a default.
    details
        Anything a program may want: the refused text, candidates, a line number.
    """

    exit_status: ClassVar[int] = 1
    default_code: ClassVar[str] = "unexpected"

    def __init__(
        self,
        message: str,
        *,
        why: str = "",
        hint: str = "",
        code: str | None = None,
        details: Mapping[str, Any] | None = None,
    ) -> None:
        super().__init__(message)
        self.message = message
        self.why = why
        self.hint = hint
        self.code = code or self.default_code
        self.details: dict[str, Any] = dict(details or {})


class UsageRefused(CampaignError):
    """The command line itself cannot be understood."""

    exit_status = 2
    default_code = "usage"


class InputRefused(CampaignError):
    """A value was understood as text but cannot be true or cannot be read."""

    exit_status = 3
    default_code = "input-refused"


class NotFound(CampaignError):
    """A named system, site, solution or file is not there."""

    exit_status = 4
    default_code = "not-found"


class Conflict(CampaignError):
    """The change contradicts what the catalogue already holds."""

    exit_status = 5
    default_code = "conflict"


class DatabaseBusy(CampaignError):
    """Somebody else is writing and did not finish in time."""

    exit_status = 6
    default_code = "database-busy"


class DatabaseUnusable(CampaignError):
    """The database is missing, damaged, foreign, read-only, or newer than this program."""

    exit_status = 7
    default_code = "database-unusable"


class StorageFull(CampaignError):
    """No room left for the database, a file or the output."""

    exit_status = 8
    default_code = "storage-full"


class Declined(CampaignError):
    """The user said no."""

    exit_status = 9
    default_code = "declined"


EXIT_INTERRUPTED = 130
EXIT_BROKEN_PIPE = 141
