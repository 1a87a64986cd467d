"""Usage errors of the parser, told as our own: what, why and an accepted form."""

from __future__ import annotations

import re
from collections.abc import Sequence
from difflib import get_close_matches
from typing import Any

import typer

from campaign.errors import UsageRefused

# A word that begins like a negative number; U+2212 is never taken for an option, so it is not here.
_NEGATIVE = re.compile(r"^-\.?\d")


def explain_usage(problem: typer.TyperException, argv: Sequence[str]) -> UsageRefused:
    """``problem`` of the parser as an error of ours with exit status 2."""
    message = " ".join(problem.format_message().split())
    ctx: Any = getattr(problem, "ctx", None)
    command = ctx.command_path if ctx is not None else "campaign"
    see = f"See: {command} --help"
    option = getattr(problem, "option_name", None)
    if option is None:
        return UsageRefused(message, why=_why(message, ctx), hint=see, details={"command": command})
    number = next((word for word in argv if _NEGATIVE.match(word) and word.startswith(option)), None)
    if number is not None:
        return UsageRefused(
            f"'{number}' was read as an option.",
            why="A word that begins with '-' is an option unless it follows the option it belongs to.",
            hint=f"Give it to its option, as in {_option_for_number(ctx)} {number}. {see}",
            code="negative-number",
            details={"command": command, "given": number},
        )
    near = _near_options(ctx, option)
    advice = "Did you mean " + " or ".join(near) + "? " if near else ""
    return UsageRefused(
        message,
        why=_why(message, ctx),
        hint=advice + see,
        details={"command": command, "given": option, "nearest": near},
    )


def _why(message: str, ctx: Any) -> str:
    if ctx is None:
        return "The line cannot be understood."
    usage = " ".join(ctx.get_usage().split())
    if "unexpected extra argument" in message:
        return f"The command takes no more words, and a name with spaces needs quotes. {usage}"
    return f"The command is written as: {usage.removeprefix('Usage: ')}"


def _long_options(ctx: Any) -> list[str]:
    if ctx is None:
        return []
    return [name for param in ctx.command.get_params(ctx) for name in param.opts if name.startswith("--")]


def _near_options(ctx: Any, given: str) -> list[str]:
    return get_close_matches(given, _long_options(ctx), n=3, cutoff=0.6)


def _option_for_number(ctx: Any) -> str:
    return "--dec" if "--dec" in _long_options(ctx) else "--option"
