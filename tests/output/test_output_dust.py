"""Dust on the screen and as a document: inside the window, safe, and honest about what means nothing."""

from __future__ import annotations

import io
import json
from dataclasses import replace

import pytest
from output_examples import HOSTILE_NAME, START, utc_of
from rich.cells import cell_len

from campaign.model.dust import (
    BandExcess,
    CondensationAt,
    DustInput,
    DustPhysics,
    DustPush,
    DustResult,
    DustThrough,
    DustVerdict,
    GrainAt,
    MeasuredDust,
    OtherOpacity,
    PairColour,
    ProductionRate,
)
from campaign.model.measured import Measured, Range
from campaign.model.propagated import Propagated
from campaign.output.console import Screen
from campaign.output.dust import dust_json, render_dust
from campaign.output.dust_picture import amount_bar, share_bar


def about(value, share=0.2, name="distance"):
    return Propagated(
        value, value, share * value, value * (1 - share), value * (1 + share), value * (1 - 2 * share),
        value * (1 + 2 * share), 1.0, name, 0.8,
    )  # fmt: skip


def physics():
    return DustPhysics(
        about(5e5),
        tuple(GrainAt(r, about(t)) for r, t in ((10.0, 2800.0), (100.0, 1100.0), (1000.0, 460.0))),
        (CondensationAt(1000.0, about(120.0), about(96.0), 360.0),
         CondensationAt(1800.0, about(30.0), None, None)),
        about(60.0), about(4.5), about(58.0), about(45.0), about(2200.0),
        (DustPush("free grains", about(4e4), about(3.6e4), about(6800.0)),),
        'campaign rule set "Lantern 3" --separation "6.4±0.8 au" --condensation-distance "58 +12 -12 au" '
        '--flow-speed "2200±400 km/s" --scatter-onset "10 d"',
    )  # fmt: skip


def band(name="K", use="measured", **changed):
    base = BandExcess(
        name, "Cold Mesa JHKLM", "Johnson-Glass", use, 2, ("sheet",), START, 2.19, 5.3, 3.4, 1.9, 0.13, 0.05,
        14.6, 0.55, 8500.0, True,
    )  # fmt: skip
    return replace(base, **changed)


def measured(**changed):
    base = MeasuredDust(
        START, utc_of(START),
        (band("J", excess_sigma=0.5, dust_jy=0.06, reason="no excess"), band(),
         band("L", use="fainter than", excess_sigma=None, dust_over_star=None),
         band("N", fitted=False, dust_jy=None, star_jy=None, sigma_jy=None, reason="no zero point")),
        (PairColour("K", "L", about(820.0)), PairColour("J", "K", None, "bluer than any temperature")),
        "fitted", about(820.0), about(2.9e-9), None, about(5.8e24), about(470.0), 1.2, 1, 0.27, 14.9, 260.0,
        0.0033,
        (OtherOpacity("zubko-0.5", 1136.0, 1.9e-10, 0.4), OtherOpacity("preibisch-0.1", None, None, 9.0)),
        (),
    )  # fmt: skip
    return replace(base, **changed)


INPUT = DustInput("distance_pc", "distance", Measured(2100.0, 150.0, 150.0), "pc", "catalogue", "a note")
BASE = DustResult("Lantern 3", utc_of(START), (INPUT,), "zubko-0.1", "a source", assumptions=("One.",))
THICK = DustVerdict("optically-thick", "optically thick: the flux tells an area, not a mass", True)


def through():
    empty = measured(mass_msun=None, temperature_k=None, verdicts=(THICK,))
    lost = Propagated(-3e-9, -3e-9, 6e-10, -3.6e-9, -2.4e-9, -4.2e-9, -1.8e-9, 1.0, "the fluxes", 0.9)
    rate = ProductionRate(START, START + 90.0, utc_of(START), utc_of(START + 90.0), lost)
    return DustThrough((measured(), empty), (rate,))


RESULTS = {
    "physics": replace(BASE, physics=physics()),
    "a date": replace(BASE, measured=measured()),
    "an episode": replace(BASE, through=through()),
}


def drawn(result, width):
    heard = io.StringIO()
    render_dust(Screen(heard, width is not None, width), result)
    return heard.getvalue()


@pytest.mark.parametrize("width", [20, 40, 80, 120, 160])
@pytest.mark.parametrize("name", RESULTS)
def test_it_keeps_inside_the_window(name, width):
    assert max(cell_len(line) for line in drawn(RESULTS[name], width).splitlines()) <= width


def test_the_dominant_error_is_named_at_eighty_columns():
    assert "distance, 80 %" in drawn(RESULTS["physics"], 80)
    assert "distance, 80 %" in drawn(RESULTS["a date"], 80)


def test_a_mass_that_means_nothing_is_not_shown_and_the_reason_stands_first():
    text = drawn(replace(BASE, measured=measured(mass_msun=None, mass_g=None, verdicts=(THICK,))), 100)
    lines = text.splitlines()
    assert lines[2].startswith("No mass: optically thick")
    assert "dust, no gas" not in text


def test_a_limit_reads_as_one_and_a_band_left_out_says_why():
    text = drawn(RESULTS["a date"], 160)
    assert "< 1.9" in text
    assert "left out: no zero point" in text


def test_the_zones_stand_in_order_of_distance():
    lines = drawn(RESULTS["physics"], 80).splitlines()
    zones = next(line for line in lines if "▓" in line and "condenses" not in line).strip()
    assert zones.lstrip("·").lstrip("▓").lstrip("░") == ""
    assert {"·", "▓", "░"} == set(zones)


def test_the_command_is_broken_so_that_a_shell_reads_it():
    import shlex

    text = drawn(RESULTS["physics"], 80)
    block = text[text.index("campaign rule set") :].split("\n\n")[0].replace("\\\n", " ")
    assert shlex.split(block) == shlex.split(physics().rule_line)


def test_an_episode_says_what_a_negative_rate_is():
    text = drawn(RESULTS["an episode"], 120)
    assert "(−3.00 ± 0.60)e-9" in text
    assert "A negative rate is dust destroyed" in text
    assert "optically thick" in text


@pytest.mark.parametrize("name", RESULTS)
def test_no_text_from_the_catalogue_steers_the_terminal(name):
    hostile = replace(INPUT, note=HOSTILE_NAME)
    result = replace(
        RESULTS[name],
        system=HOSTILE_NAME,
        inputs=(hostile,),
        assumptions=(HOSTILE_NAME,),
        warnings=(HOSTILE_NAME,),
    )
    if result.measured is not None:
        result = replace(result, measured=measured(bands=(band(HOSTILE_NAME, reason=HOSTILE_NAME), band())))
    for width in (80, None):
        text = drawn(result, width)
        assert "\x1b" not in text
        assert "\u202e" not in text


@pytest.mark.parametrize("name", RESULTS)
def test_the_document_keeps_every_digit_and_null_for_what_is_not_known(name):
    told = json.loads(dust_json(RESULTS[name]))
    assert told["schema"] == "campaign/dust/1"
    data = told["data"]
    assert data["system"] == "Lantern 3"
    if name == "a date":
        assert data["measured"]["mass_msun"]["value"] == 2.9e-9
        assert data["measured"]["other_opacities"][1]["mass_msun"] is None
        assert data["measured"]["is_meaningless"] is False
    elif name == "an episode":
        assert [epoch["is_meaningless"] for epoch in data["through"]["epochs"]] == [False, True]
    else:
        assert data["measured"] is None


def test_a_range_is_an_input_like_any_other():
    ranged = DustInput("condensation_k", "condensation temperature", Range(1000.0, 1800.0), "K", "assumed")
    assert "1000 to 1800 K" in drawn(replace(BASE, inputs=(ranged,)), 100)


def test_bars_show_shares_and_nothing_for_nothing():
    assert share_bar(3.0, 1.0, 8) == "██████░░"
    assert share_bar(0.001, 1.0, 8) == "█░░░░░░░"
    assert share_bar(-0.2, 1.0, 8) == "░░░░░░░░"
    assert amount_bar(0.0, 1.0) == ""
    assert amount_bar(1.0, 2.0, 4) == "██"
