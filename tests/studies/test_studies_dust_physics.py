"""Grains in the light of a system: what the study makes of catalogue, options and assumptions."""

from __future__ import annotations

import csv
import json
from dataclasses import replace

import numpy as np
import pytest
from dust_examples import STAR_A, STAR_B, system, told
from studies_examples import REFERENCE

from campaign.errors import Conflict, InputRefused
from campaign.model.dust import DustOverrides
from campaign.model.instants import Moment
from campaign.model.measured import Measured, Range
from campaign.model.records import SystemRecord
from campaign.model.systems import DustRule, Solution, Star

RULE = DustRule(
    1, 1, "separation", critical_separation_au=Measured(6.4, 0.8, 0.8),
    condensation_distance_au=Measured(100.0, 20.0, 20.0), flow_speed_kms=Measured(2000.0, 200.0, 200.0),
    maximum_lag_d=Measured(30.0, 5.0, 5.0), scatter_onset_d=10.0,
)  # fmt: skip
RECORD = SystemRecord(system(), rule=RULE)


def exact(value):
    return Measured(value, 0.0, 0.0)


def rows(topic):
    with (REFERENCE / "checks_dust.csv").open(newline="") as file:
        chosen = [row for row in csv.DictReader(file) if row["topic"] == topic]
    assert chosen
    return [(json.loads(row["inputs"]), json.loads(row["expected"])) for row in chosen]


def physics(overrides=None, record=RECORD, **question):
    asked = {"draws": 1500, **question}
    return told(None, DustOverrides(inputs=overrides or {}), record=record, nothing=True, **asked)


@pytest.mark.parametrize(("inputs", "expected"), rows("dust.T_Quv1"))
@pytest.mark.parametrize("t", [1000, 1200, 1500, 1800])
def test_condensation_radii_are_those_of_the_reference_rows(inputs, expected, t):
    result = physics(
        {
            "luminosity_lsun": exact(inputs["L_Lsun"]), "emissivity_index": exact(inputs["s"]),
            "grain_radius_um": exact(inputs["lam0_um"] / (2.0 * np.pi)), "condensation_k": exact(float(t)),
        }
    )  # fmt: skip
    found = result.physics.condensation_radius_au
    assert found.value == pytest.approx(float(expected[f"r_cond_T{t}_au"]), rel=1e-6)
    assert found.sigma == 0.0


def test_the_light_of_both_stars_counts_with_its_error():
    light = physics(draws=8000).physics.luminosity_lsun
    assert light.value == 5e5
    assert light.sigma == pytest.approx(np.hypot(2e4, 3e4), rel=0.02)
    assert light.dominant == "luminosity of star B"
    assert light.dominant_share == pytest.approx(9.0 / 13.0, abs=0.01)


def test_the_delay_is_the_way_from_the_stagnation_point_over_the_flow_speed():
    one = {
        "condensation_k": exact(1200.0), "emissivity_index": exact(1.0), "grain_radius_um": exact(0.1),
    }  # fmt: skip
    found = physics(one).physics
    # By hand: eta = (1.5e-6 x 2900)/(2e-5 x 2400), stagnation D/(1 + sqrt eta) from A at D = 6.4 au, centre
    # of light 0.6 D from A.
    eta = 1.5e-6 * 2900.0 / (2e-5 * 2400.0)
    from_a = 6.4 / (1.0 + np.sqrt(eta))
    assert found.stagnation_from_a_au.value == pytest.approx(from_a, rel=1e-9)
    way = found.condensation_radius_au.value - (from_a - 0.6 * 6.4)
    assert found.travel_au.value == pytest.approx(way, rel=1e-9)
    # 1 au at 1000 km/s takes 1.731456837 d (reference sheet, computed).
    assert found.delay_d.value == pytest.approx(way * 1.731456837 / 2.0, rel=1e-9)


def test_where_star_b_has_the_stronger_wind_the_gas_streams_the_other_way_and_it_is_said():
    swapped = system(star_a=replace(STAR_B, star="A"), star_b=replace(STAR_A, star="B"))
    one, other = physics(), physics(record=SystemRecord(swapped, rule=RULE))
    assert other.physics.travel_au.value == pytest.approx(one.physics.travel_au.value, rel=1e-9)
    assert any("star B has the stronger wind" in note for note in other.assumptions)


def test_the_dominant_error_of_the_delay_is_named():
    delay = physics(draws=4000).physics.delay_d
    assert delay.dominant == "condensation temperature"
    known = physics(
        {"condensation_k": exact(1200.0), "emissivity_index": exact(1.0), "grain_radius_um": exact(0.1)}
    )
    assert known.physics.delay_d.dominant == "flow speed"


def test_a_range_of_temperatures_spreads_as_wide_as_its_ends():
    found = physics(
        {"emissivity_index": exact(1.0), "grain_radius_um": exact(0.1), "luminosity_lsun": exact(3e5)}
    )
    radius = found.physics.condensation_radius_au
    table = found.physics.condensation
    assert (table[0].temperature_k, table[-1].temperature_k) == (1000.0, 1800.0)
    # 95 % of an even range lie between its 2.5 and 97.5 % points: 1020 and 1780 K.
    assert table[-1].radius_au.value < radius.lo95 < radius.hi95 < table[0].radius_au.value
    # By hand: r goes as T^-2.5 for s = 1.
    assert radius.hi95 / radius.lo95 == pytest.approx((1780.0 / 1020.0) ** 2.5, rel=0.01)


def test_the_line_for_the_rule_can_be_typed_and_keeps_what_the_rule_said(run_campaign):
    line = physics().physics.rule_line
    assert line.startswith('campaign rule set "Lantern 3" --separation "6.4±0.8 au" --condensation-distance')
    assert '--maximum-lag "30±5 d"' in line
    assert '--scatter-onset "10 d"' in line
    import shlex

    assert run_campaign("begin").status == 0
    added = run_campaign("system", "add", "Lantern 3", "--ra", "18:02:31.5", "--dec", "-45:12:30")
    assert added.status == 0
    ran = run_campaign(*shlex.split(line)[1:])
    assert ran.status == 0, ran.err
    assert "flow speed 2000 ± 200 km/s" in ran.out


def test_without_a_critical_separation_there_is_no_line_and_it_is_said_how_to_have_one():
    bare = SystemRecord(system())
    result = physics(record=bare)
    assert result.physics.rule_line is None
    assert any("--separation" in note for note in result.assumptions)
    given = physics({"separation_au": Measured(5.0, 0.5, 0.5)}, record=bare)
    assert '--separation "5±0.5 au"' in given.physics.rule_line


def test_a_line_that_would_date_nothing_says_so():
    orbit = Solution(
        1, 1, "orbit", period_d=Measured(3000.0, 1.0, 1.0), epoch=Moment(61_000.0, 1.0, 1.0),
        eccentricity=Measured(0.8, 0.01, 0.01), adopted=True,
    )  # fmt: skip
    massless = system(star_a=replace(STAR_A, mass_msun=None), star_b=replace(STAR_B, mass_msun=None))
    sized = replace(orbit, a_au=Measured(16.0, 0.2, 0.2))
    for record, says in ((SystemRecord(massless, (orbit,), rule=RULE), True),
                         (SystemRecord(massless, (sized,), rule=RULE), False),
                         (SystemRecord(system(), (orbit,), rule=RULE), False)):  # fmt: skip
        notes = physics(record=record).assumptions
        assert any("dates no dust before the size" in note for note in notes) is says


def test_without_a_rule_the_separation_at_periastron_stands_in():
    orbit = Solution(
        1, 1, "orbit", period_d=Measured(3000.0, 1.0, 1.0), epoch=Moment(61_000.0, 1.0, 1.0),
        eccentricity=Measured(0.8, 0.01, 0.01), a_au=Measured(16.0, 0.2, 0.2), adopted=True,
    )  # fmt: skip
    result = physics(record=SystemRecord(system(), (orbit,)))
    told_of = {one.key: one for one in result.inputs}["separation_au"]
    assert told_of.origin == "derived"
    # a (1 - e) = 3.2 au.
    assert told_of.value.value == pytest.approx(3.2, rel=2e-3)


def test_radiation_pressure_is_that_of_the_reference_rows():
    for inputs, expected in rows("dust.beta_rp"):
        result = physics(
            {
                "luminosity_lsun": exact(inputs["L_Lsun"]), "mass_msun": exact(inputs["M_Msun"]),
                "kappa_pr_cm2_g": exact(inputs["kappa_pr_cm2_g"]), "dust_share": exact(0.01),
            }
        )  # fmt: skip
        free, coupled = result.physics.pushes
        assert free.beta.value == pytest.approx(float(expected["beta"]), rel=1e-6)
        assert coupled.beta.value == pytest.approx(0.01 * float(expected["beta"]), rel=1e-6)


def test_grains_end_faster_than_they_were_launched_and_free_ones_fastest():
    free, coupled = physics({"launch_speed_kms": exact(1500.0)}).physics.pushes
    assert 1500.0 < coupled.terminal_speed_kms.value < free.terminal_speed_kms.value


@pytest.mark.parametrize(
    ("changed", "words"),
    [
        ({"luminosity_lsun": None}, "luminosity of star A is not known"),
        ({"mass_msun": None}, "mass of star A is not known"),
        ({"mass_loss_msun_yr": None}, "stagnation point is not known"),
    ],
)
def test_what_a_star_lacks_is_said(changed, words):
    result = physics(record=SystemRecord(system(star_a=replace(STAR_A, **changed)), rule=RULE))
    assert any(words in note for note in result.assumptions)


def test_a_luminosity_without_a_temperature_says_what_it_takes_for_granted():
    dark = {"temperature_k": None}
    stars = system(star_a=replace(STAR_A, **dark), star_b=replace(STAR_B, **dark))
    result = physics(record=SystemRecord(stars, rule=RULE))
    assert all(row.power_law_radius_au is None for row in result.physics.condensation)
    assert any("no temperature of a star is known" in note for note in result.assumptions)


def test_nothing_is_known_of_the_light_of_dark_stars():
    with pytest.raises(Conflict) as refused:
        physics(record=SystemRecord(system(star_a=Star("A"), star_b=Star("B"))))
    assert refused.value.code == "luminosity-unknown"
    assert "--luminosity" in refused.value.hint


@pytest.mark.parametrize("wrong", [Measured(2600.0, 50.0, 50.0), Range(1500.0, 3000.0)])
def test_nothing_condenses_above_2500_k(wrong):
    with pytest.raises(InputRefused) as refused:
        physics({"condensation_k": wrong})
    assert refused.value.code == "condensation-temperature-refused"


def test_an_unknown_error_of_an_input_is_never_zero():
    vague = system(star_a=replace(STAR_A, luminosity_lsun=Measured(2e5)))
    found = physics(record=SystemRecord(vague, rule=RULE)).physics
    assert found.luminosity_lsun.value == 5e5
    assert found.luminosity_lsun.sigma is None
    assert found.delay_d.unknown_errors == ("luminosity of star A",)


def test_the_answer_depends_on_the_seed_and_on_nothing_else():
    assert physics(seed=4) == physics(seed=4)
    assert physics(seed=4).physics.delay_d.median != physics(seed=5).physics.delay_d.median
