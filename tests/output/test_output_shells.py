"""Shells on any screen: nothing is wider than the window, and the picture shows what was measured."""

from __future__ import annotations

import io
import re
from dataclasses import replace

import pytest

from campaign.model.shells import (
    ComingShell,
    DatedShell,
    ExpectedShell,
    ExpectedView,
    ForeseenShell,
    ResolvableDate,
    ShellAcceleration,
    ShellAssignment,
    ShellDatingResult,
    ShellExpectation,
    ShellMotion,
    ShellQuantity,
    ShellTension,
)
from campaign.output.console import Screen
from campaign.output.shells import render_dating
from campaign.output.shells_diagram import render_diagram
from campaign.output.shells_document import dating_data
from campaign.output.shells_expected import render_expectation
from campaign.output.wording import minus_signs

IMAGES = (58_637.5, 59_802.5)


def shell(index: int, image: int, radius: float, **fields: object) -> DatedShell:
    age = radius / 0.1
    return DatedShell(
        **{
            "index": float(index), "radius_arcsec": radius, "sigma_arcsec": 0.02,
            "image_bmjd_tdb": IMAGES[image], "fitted_radius_arcsec": radius,
            "residual_sigma": -3.4 if index == 2 else 0.2, "age_yr": age,
            "age_sigma_yr": 0.3, "launched_bmjd_tdb": IMAGES[image] - 365.25 * age, "launched_sigma_d": 110.0,
            "cycle": 5 - index, "phase": -0.0123, "phase_sigma": 0.004, "window_sigma": 0.7,
            "feature": "limb", **fields,
        }
    )  # fmt: skip


RESULT = ShellDatingResult(
    system="Lantern 3",
    as_of_utc="2031-04-07T00:00:00Z",
    quantities=(
        ShellQuantity("spacing_arcsec", 1.0, 0.01, 0.99, 1.01, 0.98, 1.02, "derived", "fitted to the radii"),
        ShellQuantity(
            "proper_motion_mas_yr", 100.0, 2.0, 98.0, 102.0, 96.0, 104.0, "derived", "", ("a", "b")
        ),
        ShellQuantity("distance_pc", 2100.0, None, None, None, None, None, "given", "catalogue"),
    ),
    shells=(shell(1, 0, 0.5), shell(2, 0, 1.5), shell(3, 0, 2.5), shell(1, 1, 0.82), shell(3, 1, 2.81)),
    tensions=(
        ShellTension(
            "period_yr", "spacing of the shells", "period of the orbit", 4.4, 20.0, 10.0, ("count",)
        ),
        ShellTension("speed_kms", "motion of the shells", "terminal wind of star A", None, 900.0, 2000.0),
        ShellTension("launch", "shell of cycle 4", "middle of the production window", 0.4, 58e3, 58.1e3),
    ),
    assignments=(
        ShellAssignment((1.0, 2.0, 3.0), 0.97, (), (), "no shell missing", 1.0, 0.5, IMAGES[0]),
        ShellAssignment((1.0, 3.0, 5.0), 0.02, (2, 4), (), "shells 2 and 4 missing", 0.5, 1.0, IMAGES[0]),
        ShellAssignment((1.0, 3.0), 0.9, (2,), (), "shell 2 missing", 1.0, 0.82, IMAGES[1]),
    ),
    motions=(ShellMotion("cycle 4", 2, 100.0, 4.0, 56_000.0, 200.0, 0.4, 1),),
    acceleration=ShellAcceleration("undecided", "AIC", -1.0, "The radii do not tell.", 25.0, 0.3, 25.1, 0.5),
    chi2=3.2,
    degrees_of_freedom=2,
    span_yr=20.0,
    span_sigma_yr=0.2,
    foreseen=(
        ForeseenShell(IMAGES[0], 4, 5.0, 0.5, True),
        ForeseenShell(IMAGES[1], 3, 18.2, 1.82, False),
    ),
    not_told=("Whether older shells are missing cannot be told.",),
    assumptions=("radii are those of the limb",),
    warnings=("the count is not certain",),
)


def drawn(result: object, width: int | None, render=render_dating, unicode: bool = True) -> str:
    stream = io.StringIO()
    render(Screen(stream, is_terminal=width is not None, width=width, unicode=unicode), result)
    return stream.getvalue()


@pytest.mark.parametrize("width", [20, 40, 60, 80, 100, 160])
def test_nothing_is_wider_than_the_window(width):
    lines = drawn(RESULT, width).splitlines()
    assert max(len(line) for line in lines) <= width


def test_in_a_pipe_every_column_is_there_and_each_image_named():
    text = drawn(RESULT, None)
    heading = next(line for line in text.splitlines() if line.startswith("image"))
    for word in (
        "image",
        "index",
        "radius, arcsec",
        "age, yr",
        "launched",
        "cycle",
        "phase",
        "residual, sigma",
    ):
        assert word in heading
    assert text.count("2019-06-03") >= 3 and text.count("2022-08-11") >= 2


def test_in_a_small_window_the_images_stand_under_one_another():
    text = drawn(RESULT, 80)
    assert "Image of 2019-06-03" in text and "Image of 2022-08-11" in text


def test_what_is_unknown_is_no_number():
    text = drawn(RESULT, None)
    assert "2100 pc (error unknown)" in text
    assert re.search(r"speed +error unknown", text)


def test_the_picture_shows_measured_and_expected_shells_and_the_line_between():
    text = drawn(RESULT, None, render_diagram)
    assert "●" in text and "◇" in text and "◆" in text and "·" in text
    # Shell 4 - 1 of the second image stood nowhere: one open mark, and one where both fall together.
    picture = text.split("└")[0]
    assert (picture.count("◇"), picture.count("◆"), picture.count("●")) == (1, 1, 4)
    assert "expected, not measured" in text and "100 mas/yr" in text


def test_a_screen_of_plain_characters_has_a_picture_too():
    text = drawn(RESULT, 80, render_diagram, unicode=False)
    assert text.isascii() and "measured" in text


def test_radii_without_a_period_are_drawn_by_their_age_in_periods():
    shells = tuple(
        replace(each, age_yr=None, age_sigma_yr=None, age_periods=each.radius_arcsec, cycle=None)
        for each in RESULT.shells
    )
    result = replace(RESULT, shells=shells, foreseen=())
    assert "age in periods" in drawn(result, None, render_diagram)
    assert "periods" in drawn(result, None)


def test_text_from_data_steers_no_terminal():
    evil = replace(RESULT, system="Lan\x1b[2Jtern", shells=(shell(1, 0, 0.5, feature="\x1b]0;x\x07"),) * 2)
    assert "\x1b" not in drawn(evil, None) and "\x1b" not in drawn(evil, 80)


def test_the_document_has_the_contract_s_keys():
    data = dating_data(RESULT)
    for name in ("spacing_arcsec", "proper_motion_mas_yr", "distance_pc"):
        assert {"value", "sigma", "lo68", "hi68", "origin"} <= data[name].keys()
    assert data["speed_kms"] is None and data["period_yr"] is None
    assert {
        "index", "radius_arcsec", "sigma_arcsec", "age_yr", "age_sigma_yr", "launched_utc",
        "launched_bmjd_tdb", "launched_sigma_d", "cycle",
    } <= data["shells"][0].keys()  # fmt: skip
    assert {"quantity", "from", "against", "sigma"} <= data["tensions"][0].keys()
    assert data["assumptions"] == ["radii are those of the limb"]


VIEW = ExpectedView(
    62_000.0, "2028-08-18T00:00:00Z",
    (
        ExpectedShell(3, 61_000.0, 20.0, "2025-11-21T00:00:00Z", 2.7, 0.27, 0.01, 0.26, 0.28, 100.0, 2.0, 1.0,
                      570.0, True, 0.97, 330.0, 7.3),
        ExpectedShell(4, 61_950.0, 40.0, "2028-06-29T00:00:00Z", 0.1, 0.01, None, None, None, 100.0, None,
                      0.9),
    ),
    1, 0, 1,
)  # fmt: skip
EXPECTED = ShellExpectation(
    system="Lantern 3", as_of_utc="2031-04-07T00:00:00Z", views=(VIEW, replace(VIEW, bmjd_tdb=63_000.0)),
    resolvable=(ResolvableDate(4, 0.1, 62_300.0, 40.0, "2029-06-14T00:00:00Z"),),
    quantities=RESULT.quantities, field_arcsec=28.0, resolution_arcsec=0.1, assumptions=("so",),
    coming=(ComingShell(5, 65_000.0, None, None),),
)  # fmt: skip


@pytest.mark.parametrize("width", [20, 40, 80, 160])
def test_what_is_expected_fits_any_window(width):
    assert max(len(line) for line in drawn(EXPECTED, width, render_expectation).splitlines()) <= width


def test_what_is_expected_tells_how_many_are_in_view_and_what_comes():
    text = drawn(EXPECTED, None, render_expectation)
    assert "1 in view, 1 inside 0.1 arcsec" in text
    assert "resolvable, past 0.1 arcsec" in text and "launched" in text
    assert "0.01 ± ? (90 %)" in text


def test_negative_numbers_have_a_minus_sign_and_nothing_else_has():
    assert minus_signs("cycle -3 of 2022-08-11, 1-5, MJD -12, (-0.5)") == (
        "cycle −3 of 2022-08-11, 1-5, MJD −12, (−0.5)"
    )
    assert minus_signs("--on 2031-04-07, Kettle-7") == "--on 2031-04-07, Kettle-7"
