"""The layers hold: read from the source of every module, imports inside functions included."""

from __future__ import annotations

import ast
import re
import subprocess
import sys
import tomllib
from collections.abc import Iterator
from pathlib import Path

import pytest

import campaign

ROOT = Path(__file__).resolve().parents[2]

# DEVELOPERS.md: what each layer may import of ours. A layer may always import itself.
OURS = {
    "__init__": {"face"},
    "__main__": {"commands", "output", "settings", "errors"},
    # What Python users see stands beside what the terminal shows.
    "face": {"studies", "reading", "output", "settings", "errors", "model"},
    "commands": {"studies", "reading", "output", "settings", "errors", "model"},
    "studies": {"physics", "catalogue", "reading", "errors", "model"},
    "output": {"model", "errors"},
    "reading": {"model", "errors"},
    "catalogue": {"model", "errors"},
    "physics": {"errors"},
    "settings": set(),
    "model": set(),
    "errors": set(),
    "migrations": set(),
    "sample_catalog": {"model"},
}
# The libraries of each layer. astropy and pandas have no place on the way of an everyday command: astropy is
# imported where an ECSV or VOTable of others is read, pandas where a DataFrame is made, and nowhere else.
LIBRARIES = {
    "__init__": set(),
    "__main__": {"typer"},
    "face": {"pandas"},
    "commands": {"typer"},
    # sqlalchemy in studies names the type of a connection that the catalogue hands over.
    "studies": {"numpy", "scipy", "sqlalchemy"},
    "output": {"rich", "pandas"},
    "reading": {"erfa", "numpy", "astropy"},
    "catalogue": {"sqlalchemy", "alembic", "numpy"},
    "physics": {"numpy", "scipy", "erfa"},
    "settings": {"platformdirs"},
    "model": {"numpy"},
    "errors": set(),
    "migrations": {"sqlalchemy", "alembic"},
    "sample_catalog": {"numpy"},
}
# The runner, the commands and the face for Python alone may ask for the time, read the environment and print.
MAY_TOUCH_THE_WORLD = {"__main__", "commands", "face"}
WORLD = re.compile(
    r"""print|input|breakpoint
      | os\.(environ|environb|getenv|getenvb|getlogin|putenv)
      | sys\.(stdin|stdout|stderr|argv|exit|__stdout__|__stderr__)
      | time\.(time|time_ns|localtime|gmtime|ctime|strftime|asctime)
      | (datetime\.)?datetime\.(now|utcnow|today) | (datetime\.)?date\.today
      | (numpy|np)\.datetime64 | getpass\.getuser""",
    re.VERBOSE,
)
# Two modules load others by name or path: the table of commands, and the sample wherever it stands.
MAY_IMPORT_BY_NAME = {"campaign/commands/tree.py", "campaign/studies/sample.py"}
BY_NAME = {"import_module", "__import__", "spec_from_file_location", "run_path", "run_module", "exec", "eval"}
LONGEST_MODULE = 500

TOP_LEVEL = {
    "pyproject.toml", "README.md", "DEVELOPERS.md", "LICENSE",
    "campaign", "migrations", "tests", "sample_catalog",
}  # fmt: skip
# Generated things that .gitignore names and that a developer's checkout may hold.
GENERATED = {"build", "dist", "__pycache__"}


def sources(*folders: str) -> list[str]:
    return sorted(
        path.relative_to(ROOT).as_posix() for folder in folders for path in (ROOT / folder).rglob("*.py")
    )


PACKAGE = sources("campaign")
ALL_LAYERS = [*PACKAGE, *sources("migrations", "sample_catalog")]


def layer_of(source: str) -> str:
    parts = source.removesuffix(".py").split("/")
    return parts[1] if parts[0] == "campaign" else parts[0]


def tree_of(source: str) -> ast.Module:
    return ast.parse((ROOT / source).read_text(encoding="utf-8"), source)


def imports_in(tree: ast.Module, package: list[str]) -> Iterator[str]:
    """Full names of the modules that ``tree`` imports anywhere; ``package`` is where it stands."""
    for node in ast.walk(tree):
        if isinstance(node, ast.Import):
            yield from (alias.name for alias in node.names)
        elif isinstance(node, ast.ImportFrom):
            above = package[: len(package) - node.level + 1] if node.level else []
            module = ".".join([*above, *([node.module] if node.module else [])])
            # ``from campaign import settings`` imports the layer, not the package's front page.
            yield from (f"{module}.{alias.name}" for alias in node.names)


def layer_imported(module: str) -> str | None:
    """The layer of ours that a full name lies in; None for libraries and for ``import campaign`` alone."""
    first, *rest = module.split(".")
    if first == "campaign":
        return rest[0] if rest and rest[0] in OURS else None
    return first if first in OURS else None


def forbidden_imports(source: str, tree: ast.Module) -> list[str]:
    layer = layer_of(source)
    package = source.split("/")[:-1]
    found = []
    for module in imports_in(tree, package):
        first = module.split(".")[0]
        ours = layer_imported(module)
        if ours is not None:
            wrong = ours != layer and ours not in OURS[layer]
        else:
            wrong = first not in {"campaign", *sys.stdlib_module_names, *LIBRARIES[layer]}
        if wrong:
            found.append(module)
    return found


def touches_of_the_world(tree: ast.Module) -> list[str]:
    named = [ast.unparse(node) for node in ast.walk(tree) if isinstance(node, ast.Attribute)]
    named += [
        node.func.id
        for node in ast.walk(tree)
        if isinstance(node, ast.Call) and isinstance(node.func, ast.Name)
    ]
    named += [module for module in imports_in(tree, []) if not module.startswith("campaign")]
    return [name for name in named if WORLD.fullmatch(name)]


# ---------------------------------------------------------------------------------------------- layers


def test_every_module_belongs_to_a_layer_of_the_design():
    assert {layer_of(source) for source in ALL_LAYERS} == set(OURS) == set(LIBRARIES)


@pytest.mark.parametrize("source", ALL_LAYERS)
def test_imports_go_one_way(source):
    assert forbidden_imports(source, tree_of(source)) == []


@pytest.mark.parametrize("source", [s for s in PACKAGE if layer_of(s) not in MAY_TOUCH_THE_WORLD])
def test_nothing_below_the_commands_asks_for_the_time_reads_the_environment_or_prints(source):
    assert touches_of_the_world(tree_of(source)) == []


@pytest.mark.parametrize("source", [s for s in PACKAGE if s not in MAY_IMPORT_BY_NAME])
def test_no_module_imports_another_where_this_test_cannot_see_it(source):
    called = [
        node.func.attr if isinstance(node.func, ast.Attribute) else getattr(node.func, "id", "")
        for node in ast.walk(tree_of(source))
        if isinstance(node, ast.Call)
    ]
    assert BY_NAME.isdisjoint(called)


@pytest.mark.parametrize(
    ("source", "text", "found"),
    [
        ("campaign/physics/x.py", "def f():\n from campaign.model import arrays", ["campaign.model.arrays"]),
        ("campaign/physics/x.py", "import astropy.time", ["astropy.time"]),
        ("campaign/output/x.py", "from campaign import catalogue", ["campaign.catalogue"]),
        ("campaign/model/x.py", "from ..errors import NotFound", ["campaign.errors.NotFound"]),
        ("campaign/model/x.py", "if TYPE_CHECKING:\n import campaign.studies.log", ["campaign.studies.log"]),
        ("migrations/versions/x.py", "from campaign.catalogue import tables", ["campaign.catalogue.tables"]),
        ("campaign/studies/x.py", "from campaign.physics import kepler\nimport campaign, math", []),
    ],
)  # fmt: skip
def test_the_check_of_imports_sees_every_way_to_write_one(source, text, found):
    assert forbidden_imports(source, ast.parse(text)) == found


@pytest.mark.parametrize(
    "text",
    [
        "print('x')",
        "input()",
        "import os\nos.environ['A']",
        "from os import environ",
        "import os\nos.getenv('A')",
        "from datetime import datetime\nx = datetime.now(None)",
        "import datetime\nx = datetime.datetime.utcnow",
        "from datetime import date\ndate.today()",
        "import time\ntime.time()",
        "from time import time",
        "import sys\nsys.stdout.write('x')",
    ],
)
def test_the_check_of_the_world_sees_every_way_to_touch_it(text):
    assert touches_of_the_world(ast.parse(text)) != []


# ------------------------------------------------------------------------------------------- the project


@pytest.mark.parametrize("source", PACKAGE)
def test_no_module_is_too_long_to_read(source):
    assert len((ROOT / source).read_text(encoding="utf-8").splitlines()) <= LONGEST_MODULE


def test_the_top_level_is_what_the_design_lists():
    found = {path.name for path in ROOT.iterdir() if not path.name.startswith(".")}
    found = {name for name in found if name not in GENERATED and not name.endswith(".egg-info")}
    assert found == TOP_LEVEL


def test_every_module_of_tests_has_a_name_of_its_own():
    # Tests are found without packages: two files of one name would hide one another.
    names = [Path(source).name for source in sources("tests") if Path(source).name != "conftest.py"]
    assert len(names) == len(set(names))


def test_the_version_is_told_once():
    project = tomllib.loads((ROOT / "pyproject.toml").read_text(encoding="utf-8"))["project"]
    assert campaign.__version__ == project["version"]


def texts() -> Iterator[tuple[str, str]]:
    """Every text of the project: what git knows, or what lies in the folders of the project."""
    listed = subprocess.run(
        ["git", "ls-files", "-z", "--cached", "--others", "--exclude-standard"],
        cwd=ROOT, capture_output=True, text=True, check=False,
    )  # fmt: skip
    if listed.returncode == 0:
        names = [name for name in listed.stdout.split("\0") if name]
    else:
        names = [p.relative_to(ROOT).as_posix() for p in ROOT.rglob("*") if p.is_file()]
        names = [n for n in names if n.split("/")[0] in TOP_LEVEL and "__pycache__" not in n]
    for name in names:
        if (ROOT / name).is_file():
            yield name, (ROOT / name).read_text(encoding="utf-8", errors="replace")


# Put together from pieces, so that this file does not hold what it looks for.
FORBIDDEN = {
    "the system that the project must not be about": r"\bw[-_ ]?r[-_ ]*0*" + str(7 * 20) + r"\b",
    "its other names": r"\bhd[-_ ]*" + str(193) + str(793) + r"\b|\bv1687[-_ ]*c" + r"yg",
    "a path of one machine": "/" + "work/(main|shared|\\.library)|/" + "root/",
}


@pytest.mark.parametrize("what", FORBIDDEN)
def test_no_file_holds(what):
    pattern = re.compile(FORBIDDEN[what], re.IGNORECASE)
    assert [name for name, text in texts() if pattern.search(name) or pattern.search(text)] == []


def test_forbidden_words_are_found_however_they_are_set():
    pattern = re.compile(FORBIDDEN["the system that the project must not be about"], re.IGNORECASE)
    number = str(7 * 20)
    for text in (
        "WR " + number,
        "wr" + number,
        "WR-" + number,
        "the WR_" + number + " dust",
        "W" + "R0" + number,
    ):
        assert pattern.search(text)
    for text in ("WR 137", "WR " + number + "3", "x wr 1", "row" + "r" + number):
        assert not pattern.search(text)
