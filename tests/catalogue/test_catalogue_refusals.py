"""Values that cannot be true are refused by the database itself, whatever the program let through."""

from __future__ import annotations

import math
from dataclasses import replace

import pytest
from catalogue_examples import (
    bare_system,
    full_episode,
    full_rule,
    full_site,
    full_solution,
    full_system,
    moment,
    photometry,
)

from campaign.catalogue import episodes, observations, rules, sites, solutions, systems
from campaign.errors import Conflict, InputRefused
from campaign.model.measured import Limit, Measured, Range
from campaign.model.systems import DatedEvent


@pytest.mark.parametrize(
    "changes",
    [
        {"dec_deg": 95.0},
        {"dec_deg": -90.000001},
        {"ra_deg": 360.0},
        {"ra_deg": -0.1},
        {"ra_deg": math.nan},
        {"distance_pc": Measured(0.0)},
        {"distance_pc": Measured(2100.0, -1.0, 1.0)},
        {"parallax_mas": Measured(0.5, 0.1, -0.1)},
        {"priority": 0},
        {"priority": 2.0},
        {"state": "sleeping"},
        {"notes": "a\x07"},
        {"name": "x" * 201},
    ],
    ids=str,
)
def test_no_such_system(changes, write, database):
    before = database.read_bytes()
    with pytest.raises(InputRefused) as refused, write() as writing:
        systems.add_system(writing, replace(full_system(), **changes))
    assert refused.value.exit_status == 3
    assert refused.value.message
    assert database.read_bytes() == before


@pytest.mark.parametrize(
    "changes",
    [
        {"eccentricity": Measured(1.0)},
        {"eccentricity": Measured(-0.01)},
        {"period_d": Measured(0.0)},
        {"period_d": Measured(-3127.5)},
        {"period_d": Measured(math.inf)},
        {"period_d": Limit(-1.0, "above")},
        {"period_d": Limit(9000.0, "above", 0.0)},
        {"period_d": Limit(9000.0, "above", None)},
        {"period_d": Range(12_000.0, 9_000.0)},
        {"inclination_deg": Measured(181.0)},
        {"omega_of": None},
        {"omega_of": "C"},
        {"k_a_kms": Measured(-1.0)},
        {"a_au": Measured(0.0)},
        {"k_b_kms": Measured(75.0, 1.0, -1.0)},
        {"epoch": moment(61234.0, -0.5)},
        {"epoch_cycle": 1.5},
        {"epoch_marks": "apastron"},
        {"label": "\t"},
    ],
    ids=str,
)
def test_no_such_solution(changes, write, database):
    with write() as writing:
        system_id = systems.add_system(writing, bare_system("Dim"))
    before = database.read_bytes()
    with pytest.raises(InputRefused), write() as writing:
        solutions.add_solution(writing, replace(full_solution(system_id), **changes))
    assert database.read_bytes() == before


@pytest.mark.parametrize(
    "changes",
    [
        {"kind": "magic"},
        {"critical_separation_au": Measured(0.0)},
        {"flow_speed_kms": Measured(-2000.0)},
        {"scatter_onset_d": -1.0},
        {"end": Measured(120.0, None, -5.0)},
    ],
    ids=str,
)
def test_no_such_rule(changes, write):
    with pytest.raises(InputRefused), write() as writing:
        system_id = systems.add_system(writing, bare_system("Dim"))
        rules.set_rule(writing, replace(full_rule(system_id), **changes))


@pytest.mark.parametrize(
    "changes",
    [
        {"latitude_deg": 91.0},
        {"latitude_deg": None},
        {"longitude_deg_east": 361.0},
        {"horizon_deg": 91.0},
        {"kind": "moon"},
        {"elongation_min_deg": 100.0, "elongation_max_deg": 90.0},
    ],
    ids=str,
)
def test_no_such_site(changes, write):
    with pytest.raises(InputRefused), write() as writing:
        sites.add_site(writing, replace(full_site(), **changes))


def test_no_such_episode(write):
    with pytest.raises(InputRefused), write() as writing:
        system_id = systems.add_system(writing, bare_system("Dim"))
        episodes.add_episode(
            writing, replace(full_episode(system_id), end=DatedEvent(moment(58_300.0, -1.0)))
        )


@pytest.mark.parametrize(
    "changes",
    [
        {"value": None},
        {"kind": "remark"},
        {"kind": "guess"},
        {"value": Measured(math.nan)},
        {"value": Measured(7.3, -0.1, 0.1)},
        {"limit_side": "above", "limit_sigma": None},
        {"limit_side": "above", "limit_sigma": 0.0},
        {"limit_side": "beside", "limit_sigma": 3.0},
        {"frequency_ghz": 0.0},
        {"energy_low_kev": 10.0, "energy_high_kev": 0.5},
        {"correlation": 1.5},
        {"shell_index": 0},
        {"quality": "superb"},
        {"moment": replace(moment(), bmjd_tdb=math.nan)},
        {"moment": replace(moment(), scale="gps")},
        {"band": "K\x1b]0;x\x07"},
        {"observer": "x" * 201},
    ],
    ids=str,
)
def test_no_such_observation(changes, write, database):
    with write() as writing:
        system_id = systems.add_system(writing, bare_system("Dim"))
    before = database.read_bytes()
    wrong = photometry(system_id, **changes)
    with pytest.raises(InputRefused), write() as writing:
        observations.add_observation(writing, wrong)
    with pytest.raises(InputRefused), write() as writing:
        observations.add_observations(writing, [photometry(system_id, 61900.0), wrong])
    assert database.read_bytes() == before


def test_a_refusal_names_table_column_and_row(write):
    with pytest.raises(InputRefused) as refused, write() as writing:
        system_id = systems.add_system(writing, bare_system("Dim"))
        good, bad = photometry(system_id), photometry(system_id, 61600.0, value=Measured(math.nan))
        observations.add_observations(writing, [good, bad])
    assert refused.value.details == {"table": "observations", "column": "value", "row": 1}


def test_a_refused_check_names_what_it_concerns(write):
    with pytest.raises(InputRefused) as refused, write() as writing:
        systems.add_system(writing, replace(bare_system("Dim"), dec_deg=95.0))
    assert refused.value.details["name"] == "ck_systems_dec"


def test_an_observation_of_no_system_is_refused(write):
    with pytest.raises(Conflict) as refused, write() as writing:
        observations.add_observation(writing, photometry(77))
    assert refused.value.code == "reference-broken"


def test_a_solution_of_another_system_cannot_be_adopted(write):
    with write() as writing:
        one = systems.add_system(writing, bare_system("One"))
        two = systems.add_system(writing, bare_system("Two"))
        of_one = solutions.add_solution(writing, full_solution(one))
        with pytest.raises(InputRefused):
            solutions.adopt_weighted(writing, two, {of_one: 1.0})
