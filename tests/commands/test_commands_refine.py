"""``campaign refine``: what it shows, what it keeps, and what it refuses without a change."""

from __future__ import annotations

import shutil
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

RunCampaign = Callable[..., Any]


@pytest.fixture(scope="module")
def _bursts_file(tmp_path_factory: pytest.TempPathFactory) -> Path:
    return tmp_path_factory.mktemp("bursts") / "campaign.db"


@pytest.fixture
def bursts(run_campaign: RunCampaign, own_database: Path, _bursts_file: Path) -> RunCampaign:
    """A system without an orbit and four dated bursts, one cycle of them missed."""
    if not _bursts_file.exists():
        run_campaign("begin")
        run_campaign("system", "add", "Lantern 3", "--ra", "18:02:31.5", "--dec", "-45:12:30")
        for onset in ("1993-02-03±10 d", "2007-10-10±8 d", "2015-01-20±10 d", "2022-05-14±12 d"):
            assert run_campaign("episodes", "add", "Lantern 3", "--onset", onset).status == 0
        shutil.copy(own_database, _bursts_file)
    shutil.copy(_bursts_file, own_database)
    return run_campaign


AS_OF = ("--as-of", "2026-01-01")


def test_the_document_holds_ephemeris_dates_counts_and_what_would_change(bursts: RunCampaign) -> None:
    document = bursts("refine", "Lantern 3", *AS_OF, "--json").document
    assert document["schema"] == "campaign/refine/1"
    # A day stands for the whole of it, and is taken at its middle.
    assert document["as_of"] == "2026-01-01T12:00:00Z"
    data = document["data"]
    # 29.28 years between the first and the last burst are four cycles of 7.32 years.
    assert data["ephemeris"]["period_d"]["value"] == pytest.approx(29.28 * 365.25 / 4.0, abs=20.0)
    assert [row["cycle"] for row in data["dates"]] == [0, 2, 3, 4]
    assert data["counts"][0]["cycles"] == [0, 2, 3, 4]
    assert {one["divisor"] for one in data["counts"]} >= {1, 2}
    assert data["line"]["degrees_of_freedom"] == 2
    assert data["next_utc"]["median"].startswith("2029")
    assert data["forecast_change"]["event"] == "onset"
    assert "kept" not in data


def test_the_screen_shows_observed_less_computed_and_the_ways_to_count(bursts: RunCampaign) -> None:
    ran = bursts("refine", "Lantern 3", *AS_OF)
    assert ran.status == 0
    for text in ("O−C d", "period", "next      onset 5: 2029", "ways to count the cycles", "◇", "open"):
        assert text in ran.out
    assert "other ways to count remain" in ran.err
    quiet = bursts("refine", "Lantern 3", *AS_OF, "--quiet")
    assert quiet.err == ""


def test_a_kept_solution_is_adopted_in_one_step_that_can_be_undone(bursts: RunCampaign) -> None:
    ran = bursts("refine", "Lantern 3", *AS_OF, "--keep", "dust 2026", "--adopt", "--json")
    kept = ran.document["data"]["kept"]
    assert kept["adopted"] is True and kept["rule"] == "learned"
    shown = bursts("solution", "show", "Lantern 3", "dust 2026").out
    assert "fitted from episodes" in shown
    (solution,) = bursts("solution", "list", "Lantern 3", "--json").document["data"]["solutions"]
    assert solution["source"] == "fitted from episodes"
    assert solution["covariance"] is not None
    # Its data reach as far as the last dated burst and its error.
    assert 59_700.0 < solution["data_until_bmjd_tdb"] < 59_730.0
    listed = bursts("episodes", "list", "--json").document["data"]["episodes"]
    assert [one["cycle"] for one in listed] == [0, 2, 3, 4]
    (event,) = [
        one
        for one in bursts("upcoming", *AS_OF, "--within", "5yr", "--event", "onset", "--json").document[
            "data"
        ]["events"]
        if one["cycle"] == 5
    ]
    assert event["basis"] == "episodes" and event["utc"]["median"].startswith("2029")
    assert bursts("undo", "--yes").status == 0
    assert bursts("solution", "list", "Lantern 3", "--json").document["data"]["solutions"] == []


def test_keeping_alone_changes_no_forecast(bursts: RunCampaign) -> None:
    question = ("upcoming", *AS_OF, "--within", "20yr", "--json")
    before = bursts(*question).document["data"]
    ran = bursts("refine", "Lantern 3", *AS_OF, "--keep", "dust 2026")
    assert "adopt it with: campaign solution adopt" in ran.out
    assert bursts(*question).document["data"] == before


def test_a_label_that_exists_is_refused_before_anything_is_kept(
    bursts: RunCampaign, fingerprint: Callable[[], str]
) -> None:
    assert bursts("refine", "Lantern 3", *AS_OF, "--keep", "dust 2026").status == 0
    before = fingerprint()
    ran = bursts("refine", "Lantern 3", *AS_OF, "--keep", " Dust  2026", "--adopt")
    assert (ran.status, len(ran.err.splitlines())) == (5, 3)
    assert "already has a solution labelled 'dust 2026'" in ran.err
    assert fingerprint() == before


@pytest.mark.parametrize(
    ("words", "status", "text"),
    [
        (("Nowhere 1",), 4, "no system"),
        (("Lantern 3", "--adopt"), 2, "--keep"),
        (("Lantern 3", "--alone", "--orbit", "x"), 2, "--alone does not go with --orbit"),
        (("Lantern 3", "--orbit", "x"), 4, "no solution"),
        (("Lantern 3", "--count", "99"), 3, "no way 99"),
        (("Lantern 3", "--count", "1.5"), 3, "--count"),
        (("Lantern 3", "--event", "end"), 3, "onset, maximum, both"),
        (("Lantern 3", "--event", "maximum"), 3, "no confirmed episode"),
        (("Lantern 3", "--as-of", "1990-01-01"), 3, "no confirmed episode"),
        (("Lantern 3", "--sample", "--keep", "x"), 2, "--sample"),
        (("Kettle 7", "--sample", "--db", "x.db"), 2, "--sample"),
    ],
)
def test_what_cannot_be_done_is_refused_in_three_lines(
    bursts: RunCampaign, fingerprint: Callable[[], str], words: tuple[str, ...], status: int, text: str
) -> None:
    before = fingerprint()
    ran = bursts("refine", *words)
    assert (ran.status, len(ran.err.splitlines())) == (status, 3), ran.err
    assert text in ran.err
    assert fingerprint() == before


def test_one_burst_gives_no_solution_to_keep(run_campaign: RunCampaign) -> None:
    run_campaign("begin")
    run_campaign("system", "add", "Lantern 3", "--ra", "18:02:31.5", "--dec", "-45:12:30")
    run_campaign("episodes", "add", "Lantern 3", "--onset", "2001-05-20±10 d")
    shown = run_campaign("refine", "Lantern 3", *AS_OF)
    assert shown.status == 0 and "no limit of the period" in shown.out
    ran = run_campaign("refine", "Lantern 3", *AS_OF, "--keep", "x")
    assert (ran.status, len(ran.err.splitlines())) == (3, 3)
    assert "no solution of Lantern 3 to keep" in ran.err


def test_the_sample_is_refined_without_a_database(run_campaign: RunCampaign) -> None:
    ran = run_campaign("refine", "Candlewood 5", "--sample")
    assert ran.status == 0
    assert "Candlewood 5: clock of 2 dated episodes" in ran.out
    assert "excluded by quiet observations" in ran.out
    assert "if adopted: onset" in ran.out
