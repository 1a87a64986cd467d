"""Every public function of physics says its units, source, accuracy and errors, with an example that runs."""

from __future__ import annotations

import doctest
import importlib
import inspect
import pkgutil
import re

import pytest

import campaign.physics

MODULES = sorted(module.name for module in pkgutil.iter_modules(campaign.physics.__path__))
UNITS = re.compile(
    r"(?<![\w'])(rad|deg|arcsec|mas|au|pc|km|km/s|days?|yr|s|m|solar masses"
    r"|jy|mag|um|kelvin|K|Lsun|Msun|cm\^2|dimensionless|unit|periods)(?![\w'])",
    re.I,
)


def module_of(name):
    return importlib.import_module(f"campaign.physics.{name}")


def public_functions():
    for name in MODULES:
        module = module_of(name)
        for label, function in inspect.getmembers(module, inspect.isfunction):
            if function.__module__ == module.__name__ and not label.startswith("_"):
                yield pytest.param(function, id=f"{name}.{label}")


@pytest.mark.parametrize("function", list(public_functions()))
def test_a_public_function_states_units_source_accuracy_and_shows_an_example(function):
    text = inspect.getdoc(function) or ""
    sections = re.split(r"\n(?=[A-Z][a-z]+\n-{3,}\n)", text)
    titles = {section.split("\n", 1)[0]: section for section in sections[1:]}
    assert {"Parameters", "Returns", "Notes", "Examples"} <= titles.keys()
    assert UNITS.search(titles["Parameters"]), "no unit among the parameters"
    assert UNITS.search(titles["Returns"]), "no unit of the result"
    assert "Source:" in titles["Notes"]
    assert "Accuracy:" in titles["Notes"]
    assert ">>> " in titles["Examples"]
    for parameter in inspect.signature(function).parameters:
        assert re.search(rf"\b{re.escape(parameter)}\b", titles["Parameters"]), (
            f"{parameter} is not described"
        )
    if re.search(r"\braise \w+", inspect.getsource(function)):
        assert "Raises" in titles


@pytest.mark.parametrize("name", MODULES)
def test_the_examples_give_what_they_show(name):
    result = doctest.testmod(module_of(name))
    assert result.failed == 0
