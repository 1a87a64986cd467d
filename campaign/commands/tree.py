"""The commands by name. A command's module is imported only when that command is run or asked for help.

The table states each command's one-line help, so that listing commands imports none of them.
"""

from __future__ import annotations

import importlib
from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from difflib import get_close_matches
from typing import Annotated, Any

import typer
from typer.core import TyperCommand, TyperGroup
from typer.main import get_command

import campaign
from campaign.commands.coercion import read_text_directly
from campaign.errors import UsageRefused

PROGRAM = "campaign"


@dataclass(frozen=True, slots=True)
class Leaf:
    """One command: a plain function in a module, with ``help`` equal to its first docstring line."""

    name: str
    help: str
    module: str
    function: str
    section: str = ""

    def load(self) -> Callable[..., Any]:
        """Import the module and hand over the function."""
        function: Callable[..., Any] = getattr(importlib.import_module(self.module), self.function)
        return function


@dataclass(frozen=True, slots=True)
class Branch:
    """A group of commands."""

    name: str
    help: str
    leaves: tuple[Leaf, ...]
    section: str = ""


Table = Sequence[Leaf | Branch]


def _command(name: str, text: str, section: str) -> Leaf:
    """A command that is the one function of the module named after it."""
    return Leaf(name, text, f"campaign.commands.{name}", name, section)


def _group(name: str, text: str, section: str, *leaves: tuple[str, str]) -> Branch:
    """A branch whose commands are functions of one module, named after it."""
    module = f"campaign.commands.{name}"
    functions = {"list": "list_", "set": "set_"}
    return Branch(name, text, tuple(Leaf(n, h, module, functions.get(n, n)) for n, h in leaves), section)


COMMANDS: tuple[Leaf | Branch, ...] = (
    _command("upcoming", "The episodes to come: when, how sure, and why.", "Look ahead"),
    _command("ephemeris", "Phase, true anomaly, separation, position and velocities, dated.", "Look ahead"),
    _command("winds", "Where two winds collide, how hot, and what you look through.", "Look ahead"),
    _command("dust", "Where dust condenses, how hot it is, and what its light weighs.", "Look ahead"),
    _group(
        "shells", "When dust shells were launched, and where they will be.", "Look ahead",
        ("date", "Ages and launch dates of shells from their radii or spacing."),
        ("expect", "Where shells will be, which are seen, and how warm they are."),
    ),
    _group(
        "forecast", "Keep what is forecast, and see how well it did.", "Look ahead",
        ("keep", "Keep today's forecasts as they are, to be scored later."),
        ("list", "What forecasts are kept, or the forecasts of one keeping."),
        ("score", "How well kept forecasts did, by what was confirmed since."),
        ("rehearse", "Forecast past episodes from what was known before them."),
    ),
    _group(
        "log", "Log one observation from the terminal.", "Observe",
        ("photometry", "Log magnitudes, in one band or in several."),
        ("flux", "Log a flux: infrared, radio or X-ray."),
        ("velocity", "Log a radial velocity of one star."),
        ("line", "Log the equivalent width of a line."),
        ("position", "Log the position of star B relative to star A."),
        ("shell", "Log the radius of a dust shell in an image."),
        ("attempt", "Log that it was tried and nothing was obtained."),
        ("remark", "Log a remark on a system."),
    ),
    _command("load", "Load a table: all of it in one step, or nothing.", "Observe"),
    _command("observations", "List observations with their numbers, or draw them.", "Observe"),
    _command("amend", "Correct an observation; the old one is kept beside it.", "Observe"),
    _command("withdraw", "Take observations out of use; they stay, with the reason.", "Observe"),
    _group(
        "episodes", "Dated bursts of dust production.", "Observe",
        ("add", "Add a confirmed episode with the dates known of it."),
        ("find", "Find episodes in the light curve: onset, maximum, end."),
        ("confirm", "Confirm proposed episodes: from now on they are knowledge."),
        ("reject", "Reject episodes: they stay, and count for nothing."),
        ("list", "The dated episodes, oldest first."),
    ),
    _command("refine", "Period and epoch from dated episodes, and what would change.", "Observe"),
    _command("begin", "Make the database, empty or with the sample campaign.", "Keep the catalogue"),
    _command("upgrade", "Bring an older database up to date, after a snapshot.", "Keep the catalogue"),
    _command("export", "Write a table for others, or for another catalogue.", "Keep the catalogue"),
    _command("history", "Who changed what and when, newest first.", "Keep the catalogue"),
    _command("undo", "Take back one whole command; nothing is erased.", "Keep the catalogue"),
    _group(
        "system", "The binaries under watch.", "Keep the catalogue",
        ("add", "Put a system under watch."),
        ("show", "Everything known of one system, and what follows from it."),
        ("list", "The systems under watch."),
        ("change", "Change what is given of a system; aliases are added."),
        ("retire", "Take a system out of the watch; nothing is erased."),
    ),
    _group(
        "solution", "Orbital elements, published or fitted.", "Keep the catalogue",
        ("add", "Add a set of orbital elements to a system."),
        ("adopt", "Forecast from one solution, or from several with weights."),
        ("list", "The solutions of a system side by side."),
        ("show", "One solution, element by element, and what follows from it."),
    ),
    _group(
        "rule", "How dust production follows from the orbit.", "Keep the catalogue",
        ("set", "Say how onset, maximum and end follow from the orbit."),
        ("show", "A system's dust rule."),
    ),
    _group(
        "site", "Places to observe from.", "Keep the catalogue",
        ("add", "Add a site on the ground, or a space platform."),
        ("list", "The sites of the campaign."),
    ),
)  # fmt: skip

SUMMARY = "When the next dust episode starts, how sure that is, and what to observe."


class PlainCommand(TyperCommand):
    """One command."""

    def get_params(self, ctx: typer.Context) -> list[Any]:  # type: ignore[override]
        """Its options and arguments, --help included."""
        return read_text_directly(super().get_params(ctx))


class LazyGroup(TyperGroup):
    """A group that knows its commands from a table and makes them one at a time."""

    table: Table = ()
    path: str = PROGRAM
    only_listing = False

    def get_params(self, ctx: typer.Context) -> list[Any]:  # type: ignore[override]
        """Its options, --help included."""
        return read_text_directly(super().get_params(ctx))

    def list_commands(self, ctx: typer.Context) -> list[str]:  # type: ignore[override]
        """The names, in the order of the table."""
        return [entry.name for entry in self.table]

    def get_command(self, ctx: typer.Context, cmd_name: str) -> Any:  # type: ignore[override]
        """Make the named command; only now is its module imported."""
        entry = next((entry for entry in self.table if entry.name == cmd_name), None)
        if entry is None:
            return None
        if self.only_listing:
            return TyperCommand(entry.name, help=entry.help)
        if isinstance(entry, Branch):
            return _make_branch(entry, f"{self.path} {entry.name}")
        return _make_leaf(entry)

    def resolve_command(self, ctx: typer.Context, args: list[str]) -> Any:  # type: ignore[override]
        """Find the command, or say which names come near."""
        name = args[0]
        if ctx.resilient_parsing or name.startswith("-") or name in self.list_commands(ctx):
            return super().resolve_command(ctx, args)
        raise _unknown_command(self, name)

    def shell_complete(self, ctx: typer.Context, incomplete: str) -> list[Any]:  # type: ignore[override]
        """Complete names from the table, without importing a command."""
        self.only_listing = True
        try:
            return super().shell_complete(ctx, incomplete)
        finally:
            self.only_listing = False

    def format_help(self, ctx: typer.Context, formatter: Any) -> None:  # type: ignore[override]
        """Sections of commands, then the options, in plain text."""
        formatter.write(f"{self.help}\n\n  {self.path} COMMAND ...\n")
        formatter.write(f"  {self.path} COMMAND --help\n")
        width = max((len(entry.name) for entry in self.table), default=0)
        for section, entries in _by_section(self.table):
            formatter.write(f"\n{section or 'Commands'}\n")
            for entry in entries:
                formatter.write(f"  {entry.name:<{width}}  {entry.help}\n")
        records = [record for param in self.get_params(ctx) if (record := param.get_help_record(ctx))]
        formatter.write("\nOptions\n")
        formatter.indent()
        formatter.write_dl(records)


def build_root(table: Table = COMMANDS) -> LazyGroup:
    """The whole program as one command group over ``table``."""
    app = typer.Typer(
        name=PROGRAM,
        cls=type("RootGroup", (LazyGroup,), {"table": tuple(table)}),
        help=SUMMARY,
        invoke_without_command=True,
        rich_markup_mode=None,
        pretty_exceptions_enable=False,
        add_completion=True,
    )
    app.callback()(_root)
    root = get_command(app)
    assert isinstance(root, LazyGroup)
    return root


def _root(
    ctx: typer.Context,
    version: Annotated[bool, typer.Option("--version", help="Print the version and stop.")] = False,
    # Taken out by the runner, before the options are read; declared so that the help lists it.
    traceback: Annotated[
        bool,
        typer.Option("--traceback", help="Show where an unexpected error happened (anywhere on the line)."),
    ] = False,
) -> None:
    if version:
        typer.echo(f"{PROGRAM} {campaign.__version__}")
        raise typer.Exit
    _help_when_bare(ctx)


def _help_when_bare(ctx: typer.Context) -> None:
    if ctx.invoked_subcommand is None:
        typer.echo(ctx.get_help())


def _make_branch(branch: Branch, path: str) -> LazyGroup:
    app = typer.Typer(
        name=branch.name,
        cls=type("BranchGroup", (LazyGroup,), {"table": branch.leaves, "path": path}),
        help=branch.help,
        invoke_without_command=True,
        rich_markup_mode=None,
        pretty_exceptions_enable=False,
        add_completion=False,
    )
    app.callback()(_help_when_bare)
    group = get_command(app)
    assert isinstance(group, LazyGroup)
    return group


def _make_leaf(leaf: Leaf) -> TyperCommand:
    app = typer.Typer(rich_markup_mode=None, pretty_exceptions_enable=False, add_completion=False)
    app.command(name=leaf.name, cls=PlainCommand)(leaf.load())
    command = get_command(app)
    assert isinstance(command, TyperCommand)
    return command


def _by_section(table: Table) -> Iterator[tuple[str, list[Leaf | Branch]]]:
    sections: dict[str, list[Leaf | Branch]] = {}
    for entry in table:
        sections.setdefault(entry.section, []).append(entry)
    yield from sections.items()


def _paths(table: Table, path: str) -> dict[str, str]:
    """Every command path below ``path``, by the words that somebody may type for it."""
    found: dict[str, str] = {}
    for entry in table:
        found[entry.name] = f"{path} {entry.name}"
        if isinstance(entry, Branch):
            for leaf in entry.leaves:
                found.setdefault(leaf.name, f"{path} {entry.name} {leaf.name}")
                found[f"{entry.name} {leaf.name}"] = f"{path} {entry.name} {leaf.name}"
    return found


def _unknown_command(group: LazyGroup, name: str) -> UsageRefused:
    paths = _paths(group.table, group.path)
    near = get_close_matches(name.lower(), paths, n=3, cutoff=0.6)
    nearest = list(dict.fromkeys(paths[word] for word in near))
    advice = "Did you mean " + " or ".join(f"'{each}'" for each in nearest) + "? " if nearest else ""
    return UsageRefused(
        f"There is no command '{group.path} {name}'.",
        why=f"'{group.path}' has the commands {', '.join(entry.name for entry in group.table)}."
        if group.table
        else f"'{group.path}' has no commands.",
        hint=f"{advice}All commands: {group.path} --help",
        code="unknown-command",
        details={"given": name, "nearest": nearest},
    )
