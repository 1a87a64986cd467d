"""Where things are and who is at work: option over environment over default, read only when asked."""

from __future__ import annotations

from collections.abc import Mapping

DATABASE_VARIABLE = "CAMPAIGN_DB"
OBSERVER_VARIABLE = "CAMPAIGN_OBSERVER"
TRACEBACK_VARIABLE = "CAMPAIGN_TRACEBACK"


def database_location(option: str | None, environ: Mapping[str, str]) -> str:
    """The path or SQLAlchemy URL of the database, as text."""
    if option:
        return option
    if environ.get(DATABASE_VARIABLE):
        return environ[DATABASE_VARIABLE]
    import platformdirs

    return str(platformdirs.user_data_path("campaign", appauthor=False) / "campaign.db")


def observer_name(option: str | None, environ: Mapping[str, str]) -> str:
    """Who makes a change: as told, or the login name; ``unknown`` where the machine knows no name."""
    if option:
        return option
    if environ.get(OBSERVER_VARIABLE):
        return environ[OBSERVER_VARIABLE]
    for variable in ("LOGNAME", "USER", "LNAME", "USERNAME"):
        if environ.get(variable):
            return environ[variable]
    return _account_name()


def _account_name() -> str:
    import os
    import pwd

    try:
        return pwd.getpwuid(os.getuid()).pw_name
    except KeyError:
        return "unknown"


def traceback_wanted(option: bool, environ: Mapping[str, str]) -> bool:
    """Whether an unexpected error shows where it happened."""
    return option or environ.get(TRACEBACK_VARIABLE, "") not in {"", "0"}
