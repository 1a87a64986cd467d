"""Limb, ring and plume, and light across a shell: rows of checks_shells.csv (source in each), and points of
a sphere, a ring and a plume turned in three dimensions by numpy."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from shell_reference import checks

from campaign.errors import InputRefused
from campaign.physics.shellprojection import (
    apparent_speed_kms,
    light_delay_yr,
    light_time_matters,
    project_limb,
    project_plume,
    project_ring,
)
from campaign.physics.shellvalues import Sided

SPEED_OF_LIGHT_KMS = 299_792.458  # SI


@pytest.mark.parametrize(("inputs", "expected"), checks("shell.projection"))
def test_the_speed_a_feature_seems_to_have(inputs, expected):
    angle = inputs["angle_out_of_sky_plane_deg(toward observer)"]
    seen = float(apparent_speed_kms(inputs["v_kms"], angle))
    assert seen == pytest.approx(float(expected["apparent_transverse_kms"]), rel=1e-8)
    naive = inputs["v_kms"] * math.cos(math.radians(angle))
    assert naive == pytest.approx(float(expected["naive_v_cos"]), rel=1e-8)
    limb = inputs["v_kms"] * project_limb().factor
    assert limb == pytest.approx(expected["spherical_shell_limb_speed_kms"], rel=1e-12)


@given(speed=st.floats(100, 10_000), angle=st.floats(-80, 80))
@settings(max_examples=50, deadline=None)
def test_two_flashes_of_a_moving_feature_arrive_as_far_apart_as_the_formula_says(speed, angle):
    """Two positions a year apart, each with its own light time."""
    way = np.array([math.cos(math.radians(angle)), math.sin(math.radians(angle))]) * speed
    seconds = 1.0
    arrival = seconds - way[1] * seconds / SPEED_OF_LIGHT_KMS
    assert float(apparent_speed_kms(speed, angle)) == pytest.approx(way[0] * seconds / arrival, rel=1e-10)


@given(tilt=st.floats(1, 88), place=st.floats(0, 360))
@settings(max_examples=80, deadline=None)
def test_a_tilted_ring_is_seen_as_its_points_are(tilt, place):
    around = np.radians(place)
    # Node along x; the ring turned about it.
    x, y = np.cos(around), np.sin(around) * np.cos(np.radians(tilt))
    seen_at = np.degrees(np.arctan2(y, x))
    ring = project_ring(Sided(tilt, 0.0, 0.0), seen_at)
    assert ring.factor == pytest.approx(np.hypot(x, y), rel=1e-9)
    height = abs(np.sin(around) * np.sin(np.radians(tilt)))
    assert math.sin(math.radians(ring.out_of_sky_deg)) == pytest.approx(height, abs=1e-6)


@given(tilt=st.floats(5, 80), place=st.floats(5, 85))
@settings(max_examples=40, deadline=None)
def test_the_error_of_an_inclination_is_carried_over(tilt, place):
    step, sigma = 1e-4, 2.0
    for project in (project_ring, project_plume):
        up = project(Sided(tilt + step, 0.0, 0.0), place).factor
        down = project(Sided(tilt - step, 0.0, 0.0), place).factor
        found = project(Sided(tilt, sigma, sigma), place).factor_sigma
        assert found == pytest.approx(abs(up - down) / (2 * step) * sigma, rel=1e-5, abs=1e-9)


@given(tilt=st.floats(0, 180), around=st.floats(0, 360))
@settings(max_examples=80, deadline=None)
def test_a_plume_is_as_long_as_its_tip_is_far(tilt, around):
    u, i = np.radians(around), np.radians(tilt)
    x, y, z = np.cos(u), np.sin(u) * np.cos(i), np.sin(u) * np.sin(i)  # z away from the observer
    if np.hypot(x, y) < 1e-2:
        return
    plume = project_plume(Sided(tilt, 0.0, 0.0), around)
    assert plume.factor == pytest.approx(np.hypot(x, y), rel=1e-9)
    assert math.sin(math.radians(plume.out_of_sky_deg)) == pytest.approx(-z, abs=1e-9)


def test_a_plume_of_unknown_direction_lies_between_its_shortest_and_its_length():
    plume = project_plume(Sided(60.0, 0.0, 0.0))
    rng = np.random.default_rng(1)
    u = rng.uniform(0, 2 * np.pi, 400_000)
    seen = np.hypot(np.cos(u), np.sin(u) * 0.5)
    assert plume.factor == pytest.approx(seen.mean(), abs=2e-3)
    assert plume.factor_sigma == pytest.approx(seen.std(), rel=0.01)
    assert (plume.least, plume.largest) == (pytest.approx(0.5), 1.0)
    assert math.isnan(plume.out_of_sky_deg)


def test_the_limb_and_the_long_axis_show_the_true_radius():
    for projection in (project_limb(), project_ring(Sided(70.0, 3.0, 3.0))):
        assert (projection.factor, projection.factor_sigma) == (1.0, 0.0)


def test_each_projection_names_what_it_assumes():
    assert "limb" in project_limb().statement
    assert "ring" in project_ring(Sided(60.0, 2.0, 2.0), 30.0).statement
    assert "60 deg" in project_ring(Sided(60.0, 2.0, 2.0), 30.0).statement
    assert "unknown direction" in project_plume(Sided(60.0, 2.0, 2.0)).statement


def test_light_needs_a_year_for_a_light_year_and_none_along_the_sky():
    # 1 light-year = 63 241.077 au (IAU).
    assert float(light_delay_yr(63_241.077, 90.0)) == pytest.approx(1.0, rel=1e-8)
    assert float(light_delay_yr(63_241.077, -90.0)) == pytest.approx(-1.0, rel=1e-8)
    assert float(light_delay_yr(63_241.077, 0.0)) == pytest.approx(0.0, abs=1e-15)


def test_light_time_matters_beyond_a_third_of_the_error():
    assert light_time_matters([0.29, -0.31, 0.31], [1.0, 1.0, np.nan]).tolist() == [False, True, False]


@pytest.mark.parametrize(
    ("call", "code"),
    [
        (lambda: project_ring(Sided(200.0, 1.0, 1.0), 10.0), "inclination-refused"),
        (lambda: project_plume(Sided(-1.0, 1.0, 1.0)), "inclination-refused"),
        (lambda: project_ring(Sided(90.0, 1.0, 1.0), 45.0), "projection-refused"),
        (lambda: project_plume(Sided(90.0, 1.0, 1.0), -90.0), "projection-refused"),
        (lambda: apparent_speed_kms(300_000.0, 0.0), "speed-above-light"),
    ],
)
def test_what_cannot_be_seen_is_refused(call, code):
    with pytest.raises(InputRefused) as refused:
        call()
    assert refused.value.code == code
