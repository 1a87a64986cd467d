"""What ``system show``, ``solution show``, ``episodes list`` and their echoes tell an observer."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import pytest

RunCampaign = Callable[..., Any]
POSITION = ("--ra", "18:02:31.5", "--dec", "-45:12:30")


@pytest.fixture
def with_parallax(run_campaign: RunCampaign) -> RunCampaign:
    run_campaign("begin")
    words = (*POSITION, "--parallax", "2.00±0.03 mas", "--pm-ra", "-3.2", "--pm-dec", "1.1")
    assert run_campaign("system", "add", "Near 1", *words).status == 0
    return run_campaign


def test_a_system_without_a_solution_shows_its_distance_and_says_that_nothing_is_forecast(
    with_parallax: RunCampaign,
) -> None:
    shown = with_parallax("system", "show", "near 1").out
    # 1 / 2.00 mas = 500 pc, and 1.5 % of it: by the definition of the parsec.
    assert "500.0 ± 7.5 pc" in shown and "parallax" in shown
    assert "nothing is forecast yet" in shown
    assert "−3.2 mas/yr" in shown and "+1.1 mas/yr" in shown
    derived = with_parallax("system", "show", "near 1", "--json").document["data"]["derived"]
    assert derived[0]["quantity"] == "distance"
    assert derived[0]["value"]["value"] == pytest.approx(500.0, abs=0.5)


def test_a_solution_shows_the_cycle_of_its_source_and_until_when_its_data_reached(
    with_parallax: RunCampaign,
) -> None:
    with_parallax(
        "solution", "add", "Near 1", "--label", "visual", "--period", "3140±4 d", "--epoch",
        "BJD 2461300±3", "--published-cycle", "11", "--data-until", "2025-06-16", "--a", "7.9±0.3 mas",
        "--note", "from two nights",
    )  # fmt: skip
    shown = with_parallax("solution", "show", "Near 1", "visual").out
    assert "cycle 11 of the source" in shown
    assert "2025-06-16" in shown
    assert "7.90 ± 0.30 mas" in shown
    assert "from two nights" in shown
    with_parallax("solution", "adopt", "Near 1", "visual")
    adopted = with_parallax("solution", "show", "Near 1").out
    assert "cycle 0 of the system, cycle 11 of the source" in adopted


def test_an_orbit_seen_face_on_has_no_masses_and_no_warnings(with_parallax: RunCampaign) -> None:
    with_parallax(
        "solution", "add", "Near 1", "--label", "face on", "--period", "3000±1", "--epoch", "BJD 2461300",
        "--eccentricity", "0.5±0.1", "--k-a", "10±1", "--k-b", "20±1", "--inclination", "0",
    )  # fmt: skip
    ran = with_parallax("solution", "show", "Near 1", "face on")
    assert (ran.status, ran.err) == (0, "")
    assert "nan" not in ran.out.split()
    quantities = {d["quantity"] for d in _derived(with_parallax)}
    assert "mass of star A times sin^3 i" in quantities
    assert "mass of star A" not in quantities


def _derived(run: RunCampaign) -> list[dict[str, Any]]:
    found: list[dict[str, Any]] = run("solution", "show", "Near 1", "face on", "--json").document["data"][
        "derived"
    ]
    return found


def test_an_episode_is_listed_by_day_with_its_error_and_its_cycle(kept: RunCampaign) -> None:
    added = kept("episodes", "add", "LN3", "--onset", "2018-01-14±5 d", "--maximum", "2018-03", "--band", "K")
    assert "± 5 d" in added.out
    listed = kept("episodes", "list", "LN3").out
    assert "2018-01-14 ± 5 d in K" in listed
    # A calendar month is known to its width over the root of 12: 31 d / 3.46.
    assert "2018-03-16 ± 8.9 d in K" in listed
    # One period of 3127.5 d before the epoch in July 2026.
    assert listed.splitlines()[1].split()[3] == "-1"
    assert " -1 " in kept("system", "show", "LN3").out


def test_what_was_logged_is_counted_in_words(kept: RunCampaign) -> None:
    for words in (
        ("photometry", "LN3", "J=8.9", "K=7.3", "--at", "2025-04-07T03:12:10Z"),
        ("velocity", "LN3", "--star", "A", "--velocity", "-45±3", "--at", "2025-04-07T03:12:10Z"),
        ("remark", "LN3", "bright"),
    ):
        assert kept("log", *words).status == 0
    assert "Logged: 2 magnitudes, 1 remark, 1 velocity." in kept("system", "show", "LN3").out


def test_a_second_solution_is_added_with_the_line_that_adopts_it(kept: RunCampaign) -> None:
    added = kept("solution", "add", "LN3", "--label", "other", "--period", "3140±4 d")
    assert "added 'other', P 3140 ± 4 d, not adopted" in added.out
    line = 'campaign solution adopt "Lantern 3" "other" --instead'
    assert line in added.out
    assert kept("solution", "adopt", "Lantern 3", "other", "--instead").status == 0
