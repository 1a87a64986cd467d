"""Exported, loaded into an empty catalogue by the program itself, exported again: the same bytes.

A statement of the project (issue: observations in bulk); what ``load`` does with tables of others is tested
elsewhere.
"""

from __future__ import annotations

import contextlib
import sqlite3

import exchange_examples as examples
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from studies_examples import stamp

from campaign.__main__ import run
from campaign.catalogue import episodes, store
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


@pytest.mark.parametrize(
    "form", ["csv", *(pytest.param(form, marks=pytest.mark.slow) for form in EXCHANGE_FORMS if form != "csv")]
)
def test_the_whole_sample_comes_back(form, sample, new, tmp_path):
    copy = new("copy.db")
    first = carried(sample, copy, tmp_path, form)
    assert examples.every_export(copy, form) == first
    # The same again adds nothing.
    carried(sample, copy, tmp_path, form)
    assert examples.every_export(copy, form) == first


@forms
@settings(max_examples=3, deadline=None, suppress_health_check=list(HealthCheck))
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


# ------------------------------------------------------------------------------- with what is out of use

CORRECTED = [
    ["system", "add", "Lantern 3", "--ra", "18:02:31.5", "--dec", "-45:12:30"],
    ["log", "photometry", "Lantern 3", "K=7.31±0.03", "--at", "2023-06-12T03:12:10Z"],
    ["log", "photometry", "Lantern 3", "K=7.29±0.03", "--at", "2023-07-30T01:40:00Z"],
    ["log", "photometry", "Lantern 3", "K=7.28±0.03", "--at", "2023-08-30T01:40:00Z"],
    ["log", "remark", "Lantern 3", 'a remark, "quoted"', "--at", "2023-08-31T01:40:00Z"],
    ["amend", "1", "--mag", "7.33±0.03"],
    ["amend", "5", "--mag", "7.34±0.02"],
    ["withdraw", "2", "--why", "=1+1 the wrong star"],
    ["withdraw", "4", "--why", "said twice"],
    ["withdraw", "6", "--why", "it was nothing"],
    ["episodes", "add", "Lantern 3", "--onset", "2024-05-08±6 d", "--band", "K"],
]


@pytest.fixture(scope="module")
def corrected(tmp_path_factory):
    """A catalogue with a row corrected twice and withdrawn then, and two that were withdrawn alone."""
    db = examples.begin(tmp_path_factory.mktemp("corrected") / "campaign.db")
    for words in CORRECTED:
        assert run([*words, "--db", str(db), "--observer", "Ida Vik", "--quiet"]) == 0
    with store.writing(db, at=examples.CLOCK, who="Ida Vik", command="campaign test") as writing:
        episodes.withdraw_episode(writing, 1)
    return db


@forms
def test_what_is_out_of_use_comes_back_as_that(form, corrected, new, tmp_path):
    copy = new("copy.db")
    first = carried(corrected, copy, tmp_path, form, also_out_of_use=True)
    assert first[-1].count(b"superseded") > examples.exported(copy, "observations", form).count(b"superseded")
    assert examples.every_export(copy, form, also_out_of_use=True) == first
    assert examples.every_export(copy, form) == examples.every_export(corrected, form)
    # The same again adds nothing.
    carried(corrected, copy, tmp_path, form, also_out_of_use=True)
    assert examples.every_export(copy, form, also_out_of_use=True) == first


def test_a_load_of_what_is_out_of_use_is_taken_back_and_put_back(corrected, new, tmp_path):
    copy = new("copy.db")
    first = carried(corrected, copy, tmp_path, "csv", also_out_of_use=True)
    for in_use in (0, 1):
        with contextlib.closing(sqlite3.connect(copy)) as connection:
            last = connection.execute("SELECT max(id) FROM operations").fetchone()[0]
        words = ["undo", str(last), "--yes", "--quiet", "--db", str(copy), "--observer", "Ida Vik"]
        assert run(words) == 0
        assert examples.exported(copy, "observations", "csv").count(b"\n") - 1 == in_use
    assert examples.every_export(copy, "csv", also_out_of_use=True) == first


def test_a_past_that_does_not_hold_together_is_refused(corrected, new, tmp_path, capsys):
    copy = new("copy.db")
    table = examples.exported(corrected, "observations", "csv", also_out_of_use=True)
    carried(corrected, copy, tmp_path, "csv")
    lines = table.splitlines(keepends=True)
    (gone,) = [line for line in lines if b"it was nothing" in line]
    path = tmp_path / "past.csv"
    words = ["load", str(path), "--db", str(copy), "--observer", "Ida Vik"]
    # What took the place of two rows is not in the table.
    path.write_bytes(table.replace(gone, b""))
    assert run(words) == 3
    assert "successor-missing" in capsys.readouterr().err
    # What is in use here is withdrawn there.
    (used,) = [line for line in lines[1:] if line.endswith(b",,,\n")]
    path.write_bytes(table.replace(used, used.replace(b",,,\n", b",withdrawn,,elsewhere\n")))
    assert run(words) == 3
    assert "known-otherwise" in capsys.readouterr().err
    assert examples.exported(copy, "observations", "csv") == examples.exported(
        corrected, "observations", "csv"
    )
