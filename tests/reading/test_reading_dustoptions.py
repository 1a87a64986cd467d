"""Opacities, zero points, levels and ranges as an observer types them."""

from __future__ import annotations

import pytest

from campaign.errors import InputRefused
from campaign.model.dust import DustOpacity, LevelGiven, ZeroPointGiven
from campaign.model.measured import Measured, Range
from campaign.reading.dustoptions import (
    read_distances,
    read_extinction,
    read_level,
    read_opacity,
    read_value_or_range,
    read_zero_point,
    read_zero_points_of,
)


def test_an_opacity_is_a_name_or_a_power_law():
    assert read_opacity("zubko-0.1") == DustOpacity(table="zubko-0.1")
    law = DustOpacity(kappa_cm2_g=Measured(1000.0, 300.0, 300.0), wavelength_um=10.0, index=1.2)
    for text in (
        "1000±300 cm2/g at 10 um, index 1.2",
        "1000±300 at 10, s=1.2",
        "100±30 m2/kg at 10 um, index 1.2",
    ):
        assert read_opacity(text) == law


def test_square_metres_a_kilogram_are_ten_square_centimetres_a_gram():
    # 1e4 cm^2 over 1e3 g; mistaking them is a factor of ten (common practice, no source).
    assert read_opacity("1 m2/kg at 10 um, index 1").kappa_cm2_g == Measured(10.0)


def test_a_zero_point_has_its_wavelength_and_perhaps_its_system():
    assert read_zero_point("K=640±20 Jy at 2.19 um") == ZeroPointGiven(
        "K", None, Measured(640.0, 20.0, 20.0), 2.19
    )
    found = read_zero_point("L of Cold Mesa JHKLM=285±9 Jy at 3.45 um")
    assert (found.band, found.photometric_system) == ("L", "Cold Mesa JHKLM")


def test_a_stand_in_is_for_all_or_for_one():
    assert read_zero_points_of("Johnson-Glass") == ("*", "Johnson-Glass")
    assert read_zero_points_of("Cold Mesa JHKLM = MKO") == ("Cold Mesa JHKLM", "MKO")


def test_an_extinction_has_an_error():
    assert read_extinction("0.35±0.05") == Measured(0.35, 0.05, 0.05)


def test_a_level_has_an_error_or_is_none():
    assert read_level("K=7.31±0.02") == LevelGiven("K", Measured(7.31, 0.02, 0.02))
    assert read_level("N=none") == LevelGiven("N", None)


def test_a_range_is_read_where_a_value_is():
    assert read_value_or_range("1000..1800 K", "K", "--condensation") == Range(1000.0, 1800.0)
    assert read_value_or_range("1.2±0.1 kK", "K", "--condensation") == Measured(1200.0, 100.0, 100.0)


def test_distances_share_their_unit():
    assert read_distances("20,50,100 au") == (20.0, 50.0, 100.0)
    assert read_distances("20") == (20.0,)


@pytest.mark.parametrize(
    ("read", "text"),
    [
        (read_opacity, "1000 cm2/g"),
        (read_opacity, "-5 cm2/g at 10 um, index 1"),
        (read_opacity, "1000 cm2/g at 10 um, index 9"),
        (read_opacity, "zubko 0.1; drop"),
        (read_zero_point, "640 Jy"),
        (read_zero_point, "K=640"),
        (read_zero_point, "K=0 Jy at 2.2 um"),
        (read_zero_points_of, "Cold Mesa="),
        (read_zero_points_of, ""),
        (read_extinction, "0.35"),
        (read_extinction, "-0.1±0.1"),
        (read_level, "7.31±0.02"),
        (read_level, "K=7.31"),
        (read_level, "K=nan±0.1"),
        (read_distances, "20,,50 au"),
        (read_distances, "-3 au"),
        (read_distances, "20\x1b[31m"),
    ],
)
def test_what_cannot_be_read_is_refused_with_an_accepted_form(read, text):
    with pytest.raises(InputRefused) as refused:
        read(text)
    assert refused.value.why
    assert refused.value.hint


def test_a_limit_is_no_value():
    with pytest.raises(InputRefused):
        read_value_or_range(">1000 K", "K", "--condensation")
