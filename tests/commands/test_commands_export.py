"""``campaign export`` as somebody types it: files, standard output, refusals."""

from __future__ import annotations

import csv
import io
import json
import os
import subprocess
import sys
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parents[2]


@pytest.fixture
def filled(run_campaign, tmp_path, monkeypatch):
    """Two systems with names that spreadsheets would run, two magnitudes; the folder to write into."""
    folder = tmp_path / "out"
    folder.mkdir()
    monkeypatch.chdir(folder)
    for words in (
        ("begin",),
        ("site", "add", "Cold Mesa", "--latitude", "-31.2", "--longitude", "-70", "--height", "2400"),
        ("system", "add", "Lantern, the 3rd", "--ra", "18:02:31.5", "--dec", "-45:12:30"),
        ("system", "add", "=1+1 é", "--ra", "10:00:00", "--dec", "-45:12:30"),
        ("solution", "add", "=1+1 é", "--period", "3127.5±0.3 d", "--epoch", "BJD 2461234.2±0.5", "--adopt"),
        ("log", "photometry", "Lantern, the 3rd", "K=7.31±0.03", "L=>5.0", "--at", "2031-04-07T03:12:10Z",
         "--site", "Cold Mesa"),
        ("log", "velocity", "=1+1 é", "--star", "A", "--velocity", "-45.2±3.1 km/s", "--at", "2031-04-08"),
    ):  # fmt: skip
        done = run_campaign(*words)
        assert done.status == 0, done.err
    return folder


def rows(path):
    return list(csv.DictReader(io.StringIO(path.read_text(encoding="utf-8"), newline="")))


@pytest.mark.parametrize("name", ["a.csv", "a.ecsv", "a.vot", "a.xml", "a.JSON"])
@pytest.mark.parametrize("kind", ["observations", "systems", "solutions", "episodes"])
def test_the_ending_says_the_form_and_what_was_written_is_told_on_stderr(kind, name, run_campaign, filled):
    done = run_campaign("export", kind, "--to", name)
    assert (done.status, done.out) == (0, "")
    assert done.err.startswith(f"wrote {name}: ")
    assert f"{(filled / name).stat().st_size} bytes" in done.err
    assert [path.name for path in filled.iterdir()] == [name]


def test_names_with_commas_and_formulas_are_quoted_and_guarded(run_campaign, filled):
    assert run_campaign("export", "observations", "--to", "a.csv", "--quiet").err == ""
    assert [row["system"] for row in rows(filled / "a.csv")] == ["'=1+1 é"] + ["Lantern, the 3rd"] * 2
    assert rows(filled / "a.csv")[0]["value"] == "-45.2"


def test_the_same_catalogue_is_the_same_bytes_whatever_the_clock_locale_and_zone(
    run_campaign_process, filled
):
    first = run_campaign_process("export", "observations", "--to", "-", "--as", "csv").out
    other = {"TZ": "Pacific/Kiritimati", "LC_ALL": "C", "PYTHONUTF8": "0", "TERM": "dumb", "COLUMNS": "40"}
    assert (
        run_campaign_process("export", "observations", "--to", "-", "--as", "csv", environment=other).out
        == first
    )
    assert "é" in first


@pytest.mark.parametrize("form", ["csv", "ecsv", "votable", "json"])
def test_standard_output_gets_what_the_file_gets(form, run_campaign_process, filled):
    shown = run_campaign_process("export", "systems", "--to", "-", "--as", form)
    run_campaign_process("export", "systems", "--to", str(filled / "a"), "--as", form)
    assert shown.err == ""
    assert shown.out.encode() == (filled / "a").read_bytes()


def test_json_on_standard_output_is_one_document(run_campaign, filled):
    document = run_campaign("export", "systems", "--to", "-", "--json").document
    assert document["schema"] == "campaign/export-systems/1"
    assert [row["name"] for row in document["data"]["rows"]] == ["=1+1 é", "Lantern, the 3rd"]


def test_json_tells_what_was_written(run_campaign, filled):
    done = run_campaign("export", "systems", "--to", "a.csv", "--json")
    assert done.err == ""
    assert done.document["schema"] == "campaign/export/1"
    assert done.document["data"] == {
        "kind": "systems", "form": "csv", "path": "a.csv", "rows": 2,
        "size_bytes": (filled / "a.csv").stat().st_size,
    }  # fmt: skip


def test_a_system_and_observations_are_chosen(run_campaign, filled):
    def exported(*words):
        assert run_campaign("export", "observations", *words, "--to", "a.csv", "--yes").status == 0
        return [(row["kind"], row["band"]) for row in rows(filled / "a.csv")]

    assert exported("lantern, THE 3rd") == [("photometry", "K"), ("photometry", "L")]
    assert exported("--band", "L") == [("photometry", "L")]
    assert exported("--kind", "velocity") == [("velocity", "")]
    assert exported("--from", "2031-04-08") == [("velocity", "")]
    assert exported("--until", "2031-04-07", "--site", "cold mesa") == [
        ("photometry", "K"),
        ("photometry", "L"),
    ]
    assert exported("--quality", "bad") == []


def test_an_existing_file_is_replaced_only_when_agreed(run_campaign, filled):
    (filled / "a.csv").write_text("precious")
    refused = run_campaign("export", "systems", "--to", "a.csv")
    assert refused.status == 9
    assert "--yes" in refused.err
    assert (filled / "a.csv").read_text() == "precious"
    assert run_campaign("export", "systems", "--to", "a.csv", "--yes").status == 0
    assert len(rows(filled / "a.csv")) == 2


@pytest.mark.parametrize(
    ("words", "status", "told"),
    [
        ((), 2, "What is to be exported?"),
        (("stars", "--to", "a.csv"), 3, "observations, systems, solutions, episodes"),
        (("systems",), 2, "--to FILE"),
        (("systems", "--to", "a.txt"), 2, "--as with one of csv, ecsv, votable, json"),
        (("systems", "--to", "a"), 2, "has no ending"),
        (("systems", "--to", "a.csv", "--as", "fits"), 3, "csv, ecsv, votable, json"),
        (("systems", "--to", "-"), 2, "--as with one of"),
        (("systems", "--to", "-", "--as", "csv", "--json"), 2, "one document"),
        (("systems", "--to", "none/a.csv"), 4, "There is no folder"),
        (("systems", "--to", ".", "--as", "csv"), 3, "is a folder"),
        (("systems", "--to", "a.csv", "--band", "K"), 2, "--band chooses among observations"),
        (("systems", "--to", "a.csv", "--also-withdrawn"), 2, "has no meaning"),
        (("systems", "Lantern", "--to", "a.csv"), 4, "Lantern, the 3rd"),
        (("observations", "--site", "Cold", "--to", "a.csv"), 4, "Cold Mesa"),
        (("observations", "--kind", "mag", "--to", "a.csv"), 3, "photometry"),
        (("observations", "--from", "soon", "--to", "a.csv"), 3, "--from"),
    ],
    ids=str,
)
def test_what_cannot_be_is_refused_and_nothing_is_written(words, status, told, run_campaign, filled):
    done = run_campaign("export", *words)
    assert done.status == status
    assert told in done.err
    if "--json" not in words:
        assert done.err.count("\n") == 3
    assert list(filled.iterdir()) == []


def test_the_catalogue_itself_is_never_written_over(run_campaign, filled, own_database):
    before = own_database.read_bytes()
    done = run_campaign("export", "systems", "--to", str(own_database), "--as", "csv", "--yes")
    assert done.status == 3
    assert own_database.read_bytes() == before


def test_a_missing_catalogue_is_told_and_nothing_is_written(run_campaign, tmp_path):
    done = run_campaign("export", "systems", "--to", str(tmp_path / "a.csv"))
    assert done.status == 7
    assert not (tmp_path / "a.csv").exists()


@pytest.mark.skipif(not Path("/dev/full").exists(), reason="no such device here")
def test_a_full_disk_is_told(run_campaign_process, filled, own_database):
    assert run_campaign_process("export", "systems", "--to", "/dev/full", "--as", "csv").status == 8
    with open("/dev/full", "wb") as full:
        done = subprocess.run(
            [sys.executable, "-m", "campaign", "export", "systems", "--to", "-", "--as", "csv"],
            env={"PYTHONPATH": str(ROOT), "CAMPAIGN_DB": str(own_database), "PATH": os.environ["PATH"]},
            stdout=full, stderr=subprocess.PIPE, check=False,
        )  # fmt: skip
    assert done.returncode == 8
    assert b"Traceback" not in done.stderr


def test_a_reader_that_stops_is_no_error(filled, own_database):
    line = (
        f"{sys.executable} -m campaign export systems --to - --as json | head -c 10; echo ${{PIPESTATUS[0]}}"
    )
    done = subprocess.run(
        ["bash", "-c", line], capture_output=True, text=True, check=False,
        env={"PYTHONPATH": str(ROOT), "CAMPAIGN_DB": str(own_database), "PATH": os.environ["PATH"]},
    )  # fmt: skip
    assert done.stderr == ""
    assert done.stdout.endswith(("141\n", "0\n"))


def test_an_interrupt_leaves_nothing_behind_and_says_so(run_campaign, filled, monkeypatch):
    def interrupted(*_):
        yield "half"
        raise KeyboardInterrupt

    (filled / "a.csv").write_text("precious")
    monkeypatch.setattr("campaign.output.exchange.table_text", interrupted)
    done = run_campaign("export", "systems", "--to", "a.csv", "--yes")
    assert (done.status, done.out) == (130, "")
    assert done.err == "Interrupted: a.csv was not written, and nothing was left behind.\n"
    assert [path.name for path in filled.iterdir()] == ["a.csv"]
    assert (filled / "a.csv").read_text() == "precious"


def test_a_long_export_says_how_far_it_is_on_stderr_and_a_quiet_one_does_not(
    run_campaign, filled, monkeypatch
):
    ticks = iter(range(0, 10_000, 6))
    monkeypatch.setattr("campaign.commands.export.time.monotonic", lambda: float(next(ticks)))
    monkeypatch.setattr("campaign.commands.export._TOLD_EVERY", 1)
    done = run_campaign("export", "observations", "--to", "a.csv")
    assert "writing: " in done.err
    assert " % " in done.err.replace("%,", "% ,")
    assert "wrote a.csv: 3 rows" in done.err
    assert run_campaign("export", "observations", "--to", "b.csv", "--quiet").err == ""
    assert (filled / "a.csv").read_bytes() == (filled / "b.csv").read_bytes()


def test_everyday_exports_load_neither_pandas_nor_astropy(filled, own_database):
    code = (
        "import sys; from campaign.__main__ import run\n"
        "for form in ('csv', 'ecsv', 'votable', 'json'):\n"
        "    assert run(['export', 'observations', '--to', 'x', '--as', form, '--yes', '--quiet']) == 0\n"
        "assert not {'pandas', 'astropy', 'scipy'} & set(sys.modules)\n"
    )
    subprocess.run(
        [sys.executable, "-c", code], check=True, cwd=filled,
        env={"PYTHONPATH": str(ROOT), "CAMPAIGN_DB": str(own_database), "PATH": os.environ["PATH"]},
    )  # fmt: skip


def test_the_document_of_an_error(run_campaign, filled):
    error = run_campaign("export", "systems", "Lanterne", "--to", "a.csv", "--json").error
    assert error["code"] == "system-not-found"
    assert json.dumps(error)
