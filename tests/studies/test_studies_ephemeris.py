"""The dated table of an orbit. Oracle: rebound, an N-body package, for positions and velocities."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest
import rebound
from studies_examples import CLOCK, exact, moment, record, solution

from campaign.errors import Conflict, InputRefused, NotFound
from campaign.model.measured import Limit, Measured, Range
from campaign.model.systems import Star
from campaign.reading.instants import read_instant
from campaign.studies import watch
from campaign.studies.ephemeris import MOST_ROWS, ephemeris

AU_KM, DAY_S = 149_597_870.7, 86_400.0
PERIOD, EPOCH, E, A_AU = 2_900.0, 58_500.0, 0.71, 15.0
TILT, NODE, OMEGA_B, GAMMA = 63.0, 127.0, 214.0, -31.0
MASS_A, MASS_B, DISTANCE = 12.0, 28.0, 2_100.0


def full(**fields):
    share_a, share_b = MASS_B / (MASS_A + MASS_B), MASS_A / (MASS_A + MASS_B)
    k = 2 * math.pi * A_AU * AU_KM * math.sin(math.radians(TILT)) / (PERIOD * DAY_S * math.sqrt(1 - E * E))
    return solution(
        **{
            "period_d": exact(PERIOD),
            "epoch": EPOCH,
            "epoch_error": 0.0,
            "eccentricity": exact(E),
            "omega_deg": exact(OMEGA_B),
            "omega_of": "B",
            "inclination_deg": exact(TILT),
            "node_deg": exact(NODE),
            "a_au": exact(A_AU),
            "k_a_kms": exact(k * share_a),
            "k_b_kms": exact(k * share_b),
            "gamma_kms": exact(GAMMA),
            **fields,
        }
    )


def table(one, start=EPOCH, end=EPOCH, step=1.0, **system_fields):
    fields = {"distance_pc": exact(DISTANCE), **system_fields}
    return ephemeris(record(one, **fields), one, start, end, step, "2031-04-07T00:00:00Z")


def nbody(time_d):
    """B relative to A (au: north, east, away) and both velocities along the sight (km/s, receding)."""
    mean = 2 * math.pi * (time_d - EPOCH) / PERIOD
    pair = rebound.Simulation()
    # Units in which G = 1: au, Msun scaled so that the period is PERIOD days.
    total = 4 * math.pi**2 * A_AU**3 / PERIOD**2
    pair.add(m=total * MASS_A / (MASS_A + MASS_B))
    pair.add(
        m=total * MASS_B / (MASS_A + MASS_B),
        a=A_AU,
        e=E,
        M=mean,
        inc=math.radians(TILT),
        Omega=math.radians(NODE),
        omega=math.radians(OMEGA_B),
    )
    pair.move_to_com()
    a, b = pair.particles
    speeds = [GAMMA + p.vz * AU_KM / DAY_S for p in (a, b)]
    return (b.x - a.x, b.y - a.y, b.z - a.z), speeds


def test_positions_and_velocities_are_those_of_an_n_body_package():
    # rebound's reference direction x is North, y East, z away where the node is counted from North.
    one = full()
    for row in table(one, EPOCH - 700.0, EPOCH + 3_000.0, 61.7).rows:
        (north, east, away), (speed_a, speed_b) = nbody(row.bmjd_tdb)
        assert row.separation_au == pytest.approx(math.sqrt(north**2 + east**2 + away**2), rel=1e-9)
        mas = 1_000.0 / DISTANCE
        assert row.separation_mas == pytest.approx(row.separation_au * mas, rel=1e-12)
        assert row.projected_separation_mas == pytest.approx(math.hypot(north, east) * mas, rel=1e-9)
        angle = math.degrees(math.atan2(east, north)) % 360.0
        assert (row.position_angle_deg - angle + 180.0) % 360.0 - 180.0 == pytest.approx(0.0, abs=1e-7)
        assert row.velocity_a_kms == pytest.approx(speed_a, abs=1e-7)
        assert row.velocity_b_kms == pytest.approx(speed_b, abs=1e-7)


def test_omega_of_the_other_star_gives_the_same_table():
    turned = full(omega_deg=exact((OMEGA_B + 180.0) % 360.0), omega_of="A")
    for one, two in zip(
        table(full(), EPOCH, EPOCH + PERIOD, 97.0).rows,
        table(turned, EPOCH, EPOCH + PERIOD, 97.0).rows,
        strict=True,
    ):
        assert two.position_angle_deg == pytest.approx(one.position_angle_deg, abs=1e-9)
        assert two.velocity_a_kms == pytest.approx(one.velocity_a_kms, abs=1e-9)


def test_rows_are_at_even_steps_with_both_ends():
    rows = table(full(), 60_000.0, 60_300.0, 30.0).rows
    assert [r.bmjd_tdb for r in rows] == pytest.approx([60_000.0 + 30.0 * i for i in range(11)], abs=1e-9)
    assert len(table(full(), 60_000.0, 60_299.0, 30.0).rows) == 10
    assert len(table(full(), 60_000.0, 60_000.0, 30.0).rows) == 1
    assert rows[0].utc == "2023-02-24T23:58:51Z"  # TDB - UTC is 69.184 s


def test_phases_keep_the_sign_of_the_side_of_periastron_and_cycles_turn_at_apastron():
    one = full(epoch_cycle=4)
    times = {-0.49: 4, -0.01: 4, 0.0: 4, 0.49: 4, 0.51: 5, 1.0: 5}
    for phase, cycle in times.items():
        (row,) = table(one, EPOCH + phase * PERIOD, EPOCH + phase * PERIOD).rows
        assert row.cycle == cycle
        assert row.phase == pytest.approx(phase - round(phase), abs=1e-9)
        assert -180.0 <= row.true_anomaly_deg <= 180.0
        assert np.sign(round(row.true_anomaly_deg, 6)) == np.sign(round(row.phase, 9))


def test_the_size_of_the_orbit_comes_from_whatever_is_known():
    by_angle = full(a_au=None, a_arcsec=exact(A_AU / DISTANCE))
    by_velocities = full(a_au=None)
    # Kepler's third law: a^3 = M P^2 in au, Msun and years of 365.25 d (to the Gaussian year, 1e-5).
    masses = {"star_a": Star("A", mass_msun=exact(20.0)), "star_b": Star("B", mass_msun=exact(33.5357))}
    by_masses = full(a_au=None, k_a_kms=None)
    periastron = A_AU * (1 - E)
    assert table(by_angle).rows[0].separation_au == pytest.approx(periastron, rel=1e-9)
    assert table(by_velocities).rows[0].separation_au == pytest.approx(periastron, rel=1e-9)
    third_law = (53.5357 * (PERIOD / 365.25) ** 2) ** (1 / 3) * (1 - E)
    assert table(by_masses, **masses).rows[0].separation_au == pytest.approx(third_law, rel=1e-4)


def test_without_a_distance_there_are_no_angles_and_with_an_angular_size_no_distance_is_needed():
    row = table(full(), distance_pc=None).rows[0]
    assert row.separation_au is not None and row.separation_mas is None and row.position_angle_deg is None
    row = table(full(a_au=None, k_a_kms=None, a_arcsec=exact(0.007)), distance_pc=None).rows[0]
    assert row.separation_mas == pytest.approx(7.0 * (1 - E), rel=1e-9)
    assert row.separation_au is None and row.position_angle_deg is not None


def test_a_parallax_stands_in_for_the_distance():
    row = table(full(), distance_pc=None, parallax_mas=Measured(0.5, 0.01, 0.01)).rows[0]
    assert row.separation_mas == pytest.approx(A_AU * (1 - E) * 0.5, rel=1e-9)


@pytest.mark.parametrize(
    ("lacking", "empty", "said"),
    [
        ({"node_deg": None}, {"position_angle_deg"}, "no node"),
        ({"inclination_deg": None}, {"position_angle_deg", "projected_separation_mas"}, ""),
        ({"k_a_kms": None}, {"velocity_a_kms"}, ""),
        (
            {"omega_deg": None, "omega_of": None},
            {"position_angle_deg", "projected_separation_mas", "velocity_a_kms", "velocity_b_kms"},
            "",
        ),
        ({"gamma_kms": None}, set(), "systemic velocity"),
    ],
)
def test_what_the_elements_do_not_give_is_left_empty(lacking, empty, said):
    found = table(full(**lacking))
    (row,) = found.rows
    names = [
        "true_anomaly_deg",
        "separation_au",
        "separation_mas",
        "projected_separation_mas",
        "position_angle_deg",
        "velocity_a_kms",
        "velocity_b_kms",
    ]
    assert {name for name in names if getattr(row, name) is None} == empty
    assert said == "" or any(said in text for text in found.assumptions)


def test_without_an_eccentricity_there_is_only_a_phase():
    found = table(full(eccentricity=None), EPOCH + 290.0, EPOCH + 290.0)
    (row,) = found.rows
    assert row.phase == pytest.approx(0.1) and row.true_anomaly_deg is None
    assert any("phase only" in text for text in found.assumptions)


def test_an_epoch_of_conjunction_is_turned_into_periastron_or_said_not_to_be():
    e, nu = E, math.radians((270.0 - OMEGA_B + 180.0) % 360.0 - 180.0)
    big_e = 2 * math.atan2(math.sqrt(1 - e) * math.sin(nu / 2), math.sqrt(1 + e) * math.cos(nu / 2))
    conjunction = EPOCH + PERIOD * (big_e - e * math.sin(big_e)) / (2 * math.pi)
    told = replace(full(), epoch=moment(conjunction), epoch_marks="B in front")
    found = table(told, EPOCH + 100.0, EPOCH + 100.0)
    assert found.rows[0].phase == pytest.approx(100.0 / PERIOD, abs=1e-9)
    assert any("derived from the epoch of 'B in front'" in text for text in found.assumptions)
    bare = replace(told, omega_deg=None, omega_of=None)
    found = table(bare, conjunction, conjunction)
    assert found.rows[0].phase == pytest.approx(0.0, abs=1e-12)
    assert any("phase counts from 'B in front'" in text for text in found.assumptions)


@pytest.mark.parametrize(
    ("start", "end", "step", "code"),
    [
        (60_000.0, 60_100.0, 0.0, "step-refused"),
        (60_000.0, 60_100.0, -5.0, "step-refused"),
        (60_000.0, 60_100.0, float("nan"), "step-refused"),
        (60_100.0, 60_000.0, 5.0, "span-refused"),
        (60_000.0, 60_000.0 + MOST_ROWS + 2.0, 1.0, "span-refused"),
        (60_000.0, 60_001.0, 1e-9, "span-refused"),
    ],
)
def test_impossible_tables_are_refused(start, end, step, code):
    with pytest.raises(InputRefused) as refused:
        table(full(), start, end, step)
    assert refused.value.code == code and refused.value.hint


@pytest.mark.parametrize(
    "lacking", [{"period_d": Limit(11_000.0, "above")}, {"period_d": None}, {"epoch": None}]
)
def test_elements_without_period_or_epoch_give_no_table(lacking):
    one = replace(full(), **lacking)
    with pytest.raises(Conflict) as refused:
        table(one)
    assert refused.value.code == "no-ephemeris"


def test_a_range_of_periods_is_tabulated_at_its_middle():
    one = full(period_d=Range(2_800.0, 3_000.0))
    assert table(one, EPOCH + 290.0, EPOCH + 290.0).rows[0].phase == pytest.approx(0.1)


# ------------------------------------------------------------------------- as a user asks for it


def ask(names=("Kettle 7",), **fields):
    campaign = watch.load_sample_campaign(list(names))
    asked = {"as_of": None, "start": None, "end": None, "step_d": None, "label": None, **fields}
    return campaign, watch.tabulate(campaign, now=CLOCK, **asked)


def test_asked_for_nothing_in_particular_it_covers_one_period_from_today():
    campaign, found = ask()
    assert found.rows[0].bmjd_tdb == pytest.approx(campaign.own_as_of)
    period = next(s for s in campaign.records[0].solutions if s.adopted).period_d.value
    assert found.rows[-1].bmjd_tdb - found.rows[0].bmjd_tdb == pytest.approx(period, rel=1e-6)
    assert 30 < len(found.rows) < 60
    assert found.solution == "orbit 2024"


def test_another_solution_may_be_named_and_an_unknown_one_is_refused():
    _, found = ask(label="ORBIT 2009")
    assert found.solution == "orbit 2009"
    with pytest.raises(NotFound) as refused:
        ask(label="orbit 1066")
    assert refused.value.code == "solution-not-found" and "'orbit 2024'" in refused.value.why
    with pytest.raises(Conflict) as refused:
        ask(["Tallow 8"])
    assert refused.value.code == "no-adopted-solution"


def test_from_until_and_step_are_kept():
    at = [read_instant(t) for t in ("2030-01-01T00:00:00Z", "2030-01-11T00:00:00Z")]
    _, found = ask(start=at[0], end=at[1], step_d=2.5)
    assert [r.utc for r in found.rows] == [
        "2030-01-01T00:00:00Z",
        "2030-01-03T12:00:00Z",
        "2030-01-06T00:00:00Z",
        "2030-01-08T12:00:00Z",
        "2030-01-11T00:00:00Z",
    ]
