"""Exported, loaded into an empty catalogue by the program itself, exported again: the same bytes.

A statement of the project (issue: observations in bulk); what ``load`` does with tables of others is tested
elsewhere.
"""

from __future__ import annotations

import exchange_examples as examples
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from studies_examples import stamp

from campaign.__main__ import run
from campaign.model.exported import EXCHANGE_FORMS
from campaign.studies.begin import begin_sample_campaign
from campaign.studies.exchange_rows import episode_cells, solution_cells, system_cells

pytest.importorskip("campaign.commands.load")
pytest.importorskip("campaign.studies.load_exchanged")

KINDS = ("systems", "solutions", "episodes", "observations")
forms = pytest.mark.parametrize("form", EXCHANGE_FORMS)
ENDINGS = {"csv": "csv", "ecsv": "ecsv", "votable": "vot", "json": "json"}


def carried(source, target, folder, form, **asked):
    """Export all tables of one catalogue and load them into the other; what was exported."""
    tables = examples.every_export(source, form, **asked)
    for kind, data in zip(KINDS, tables, strict=True):
        path = folder / f"{kind}.{ENDINGS[form]}"
        path.write_bytes(data)
        assert run(["load", str(path), "--quiet", "--db", str(target), "--observer", "Ida Vik"]) == 0
    return tables


@pytest.fixture(scope="module")
def empty(tmp_path_factory):
    return examples.begin(tmp_path_factory.mktemp("empty") / "campaign.db")


@pytest.fixture
def new(empty, tmp_path):
    """Makes empty catalogues."""

    def make(name):
        (tmp_path / name).write_bytes(empty.read_bytes())
        return tmp_path / name

    return make


@pytest.fixture(scope="module")
def sample(tmp_path_factory):
    path = tmp_path_factory.mktemp("sample") / "campaign.db"
    begin_sample_campaign(str(path), stamp())
    return path


@forms
def test_the_whole_sample_comes_back(form, sample, new, tmp_path):
    copy = new("copy.db")
    first = carried(sample, copy, tmp_path, form)
    assert examples.every_export(copy, form) == first
    # The same again adds nothing.
    carried(sample, copy, tmp_path, form)
    assert examples.every_export(copy, form) == first


@forms
@settings(max_examples=6, deadline=None, suppress_health_check=list(HealthCheck))
@given(data=st.data())
def test_anything_that_a_catalogue_holds_comes_back(form, new, tmp_path, data):
    system = data.draw(examples.systems_at_random)
    rule = data.draw(st.none() | examples.rules_at_random)
    believed = data.draw(st.lists(examples.solution(), max_size=2, unique_by=lambda s: s.label.casefold()))
    bursts = data.draw(st.lists(examples.episodes_at_random, max_size=2))
    observed = data.draw(st.lists(examples.observation(), max_size=3))
    db, copy = new("one.db"), new("two.db")
    examples.bring(
        db,
        [
            examples.text_of("systems", "csv", [system_cells(system, rule)]),
            examples.text_of("solutions", "csv", [solution_cells(system.name, each) for each in believed]),
            examples.text_of("episodes", "csv", [episode_cells(system.name, each) for each in bursts]),
        ],
    )
    examples.observe(db, observed)
    first = carried(db, copy, tmp_path, form)
    assert examples.every_export(copy, form) == first
