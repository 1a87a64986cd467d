"""The program as a process: ``python -m campaign``.

Three layers. ``main`` owns the process and its streams, ``run`` turns whatever happens into one
message and an exit status, ``program`` runs a command and handles no error at all.
"""

from __future__ import annotations

import errno
import os
import sys
from collections.abc import Sequence
from typing import Any, NoReturn, TextIO

import typer

from campaign import settings
from campaign.commands.tree import PROGRAM, LazyGroup, build_root
from campaign.errors import (
    EXIT_BROKEN_PIPE,
    EXIT_INTERRUPTED,
    CampaignError,
    Declined,
    StorageFull,
)

_FULL = {errno.ENOSPC, errno.EDQUOT, errno.EFBIG}


def main() -> NoReturn:
    """Run the command line of this process and end it with the right status."""
    for stream in (sys.stdout, sys.stderr):
        if hasattr(stream, "reconfigure"):
            stream.reconfigure(errors="backslashreplace")  # a narrow locale never stops an answer
    sys.argv[1:] = [_as_typed(word) for word in sys.argv[1:]]
    sys.exit(run(sys.argv[1:]))


def _as_typed(word: str) -> str:
    """A word of the command line in UTF-8, which a narrow locale had left undecoded."""
    try:
        return os.fsencode(word).decode("utf-8")
    except UnicodeError:
        return word


def run(argv: Sequence[str], root: LazyGroup | None = None) -> int:
    """Run ``argv`` and return the exit status; every error becomes one message on stderr."""
    words = list(argv)
    as_json = _holds(words, "--json")
    traceback = settings.traceback_wanted(_take(words, "--traceback"), os.environ)
    try:
        status = program(words, root)
        if sys.stdout is not None:
            sys.stdout.flush()
        return status
    except BaseException as problem:
        return _settle(problem, words, as_json=as_json, traceback=traceback)


def program(argv: Sequence[str], root: LazyGroup | None = None) -> int:
    """Run one command; what it raises passes through."""
    result = (root or build_root()).main(list(argv), prog_name=PROGRAM, standalone_mode=False)
    return result if isinstance(result, int) and not isinstance(result, bool) else 0


def _settle(problem: BaseException, argv: Sequence[str], *, as_json: bool, traceback: bool) -> int:
    """The exit status of ``problem``, after saying what has to be said."""
    if _is_broken_pipe(problem):
        _discard(sys.stdout)
        return EXIT_BROKEN_PIPE
    if isinstance(problem, SystemExit):
        return problem.code if isinstance(problem.code, int) else int(problem.code is not None)
    if isinstance(problem, KeyboardInterrupt):
        return EXIT_INTERRUPTED
    known = _known(problem, argv)
    if known is None:
        if traceback:
            raise problem
        known = _unexpected(problem)
    if isinstance(known, StorageFull):
        _discard(sys.stdout)
    try:
        _report(known, sys.stderr, as_json=as_json)
    except OSError:
        _discard(sys.stderr)
    return known.exit_status


def _known(problem: BaseException, argv: Sequence[str]) -> CampaignError | None:
    """``problem`` as an error that a user can act on, or None when it is a fault of ours."""
    if isinstance(problem, CampaignError):
        return problem
    if isinstance(problem, typer.TyperException):
        from campaign.commands.usage import explain_usage

        return explain_usage(problem, argv)
    if isinstance(problem, typer.Abort):
        return Declined(
            "Nothing was done.",
            why="The question was not answered with yes.",
            hint="Run the command again, or add --yes to agree beforehand.",
        )
    if isinstance(problem, OSError) and problem.errno in _FULL:
        return StorageFull(
            "The output could not be written.",
            why=f"The place it goes to has no room left ({problem.strerror}).",
            hint="Free some space or write somewhere else, then run the command again.",
        )
    if isinstance(problem, MemoryError):
        return StorageFull(
            "The memory is not enough for that.",
            why="More was asked for at once than this computer gives to the program.",
            hint="Ask for less at once, for example load a table in parts.",
            code="memory-full",
        )
    return None


def _unexpected(problem: BaseException) -> CampaignError:
    kind = type(problem).__name__
    return CampaignError(
        f"The program failed: {kind}: {problem}" if str(problem) else f"The program failed: {kind}.",
        why="This is a fault in the program, not in what you typed.",
        hint="Run the same line again with --traceback to see where it happened, and report that.",
        details={"exception": kind},
    )


def _is_broken_pipe(problem: BaseException) -> bool:
    # typer answers a broken pipe with SystemExit(1), the error itself being its context.
    cause = problem.__context__ if isinstance(problem, SystemExit) else problem
    return isinstance(cause, OSError) and cause.errno == errno.EPIPE


def _report(error: CampaignError, stream: TextIO | None, *, as_json: bool) -> None:
    if stream is None:
        return
    if as_json:
        from campaign.output.documents import error_document

        stream.write(
            error_document(error.code, error.message, error.hint, {"why": error.why, **error.details})
        )
    else:
        from campaign.output.safe import visible

        lines = [f"{PROGRAM}: {visible(error.message)}"]
        lines += [f"  why:  {visible(error.why)}"] if error.why else []
        lines += [f"  next: {visible(error.hint)}"] if error.hint else []
        stream.write("\n".join(lines) + "\n")
    stream.flush()


def _discard(stream: Any) -> None:
    """Point a stream that cannot be written at nothing, so that closing it stays silent."""
    try:
        nowhere = os.open(os.devnull, os.O_WRONLY)
        os.dup2(nowhere, stream.fileno())
        os.close(nowhere)
    except (AttributeError, OSError, ValueError):
        return


def _options(words: Sequence[str]) -> Sequence[str]:
    return words[: words.index("--")] if "--" in words else words


def _holds(words: Sequence[str], option: str) -> bool:
    return option in _options(words)


def _take(words: list[str], option: str) -> bool:
    """Remove ``option`` wherever it stands among the options; whether it was there."""
    if not _holds(words, option):
        return False
    words.remove(option)
    return True


if __name__ == "__main__":
    main()
