"""Radii of shells as people type them."""

from __future__ import annotations

import pytest

from campaign.errors import InputRefused
from campaign.reading.shells import read_shell_radii, read_shell_radius, read_with_unit


@pytest.mark.parametrize(
    ("text", "arcsec", "error", "index"),
    [
        ("1.20±0.05 arcsec", 1.2, 0.05, None),
        ("1.20+-0.05", 1.2, 0.05, None),
        ("355±14 mas", 0.355, 0.014, None),
        ("3=5.523(22) arcsec", 5.523, 0.022, 3),
        ("2 = 0.5 arcmin", 30.0, None, 2),
    ],
)
def test_a_radius_may_have_a_unit_an_error_and_an_index(text, arcsec, error, index):
    read = read_shell_radius(text)
    assert read.radius_arcsec.value == pytest.approx(arcsec)
    assert read.radius_arcsec.plus == pytest.approx(error)
    assert (read.index, read.instant) == (index, None)


def test_the_date_of_its_image_may_stand_behind_it():
    read = read_shell_radius("1=0.355±0.014 arcsec on 2019-06-03T12:00:00Z")
    assert read.instant is not None and read.instant.mjd == 58_637.5  # 2019-06-03 is MJD 58637
    assert (read.index, read.radius_arcsec.value) == (1, 0.355)


@pytest.mark.parametrize(
    ("texts", "code"),
    [
        (["1.2", "500 mas"], "mixed-units"),
        (["500 mas", "1.2±0.1"], "mixed-units"),
        (["1.2 on 2020", "2.2"], "image-unclear"),
        (["0"], "out-of-range"),
        (["-1 arcsec"], "out-of-range"),
        (["1.5=2 arcsec"], "index-refused"),
        (["0=2 arcsec"], "index-refused"),
        (["1=2=3 arcsec"], "value-unreadable"),
        (["5 au"], "unit-not-accepted"),
        (["1.2 arcsec on someday"], "instant-unreadable"),
        ([">1.2 arcsec"], "value-unreadable"),
        (["nan arcsec"], "value-unreadable"),
        (["1..2 arcsec"], "value-unreadable"),
    ],
)
def test_what_is_no_radius_is_refused(texts, code):
    with pytest.raises(InputRefused) as refused:
        read_shell_radii(texts)
    assert refused.value.code == code and refused.value.why and refused.value.hint


def test_arcseconds_and_bare_numbers_may_stand_together():
    read = read_shell_radii(["1.2", '2.4"', "3.6 arcsec"])
    assert [each.radius_arcsec.value for each in read] == [1.2, 2.4, 3.6]


def test_a_period_needs_its_unit():
    assert read_with_unit("8 yr", "d", "--period", "8 yr").value == pytest.approx(2922.0)
    with pytest.raises(InputRefused) as refused:
        read_with_unit("8±0.1", "d", "--period", "8 yr")
    assert refused.value.code == "unit-missing"
