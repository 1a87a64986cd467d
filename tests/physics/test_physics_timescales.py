"""Time scales, decimal years and UTC text. Checks from outside: the time rows of
tests/reference/checks_orbit_time.csv (source and basis in each row), the leap seconds announced by the IERS,
skyfield's reconstruction of TT - UT, and the calendar of the standard library."""

from __future__ import annotations

import datetime
import warnings

import erfa
import numpy as np
import pytest
from hypothesis import example, given, settings
from hypothesis import strategies as st
from physics_reference import checks

from campaign.errors import InputRefused
from campaign.physics import constants, years
from campaign.physics.deltat import delta_t_s
from campaign.physics.timescales import tdb_to_tt, tdb_to_utc, to_tdb, utc_iso

patient = settings(max_examples=300, deadline=None)
# Days at whose end a leap second was inserted: IERS Bulletin C (memory).
LEAP_SECOND_DAYS = [
    "1972-06-30",
    "1972-12-31",
    "1973-12-31",
    "1974-12-31",
    "1975-12-31",
    "1976-12-31",
    "1977-12-31",
    "1978-12-31",
    "1979-12-31",
    "1981-06-30",
    "1982-06-30",
    "1983-06-30",
    "1985-06-30",
    "1987-12-31",
    "1989-12-31",
    "1990-12-31",
    "1992-06-30",
    "1993-06-30",
    "1994-06-30",
    "1995-12-31",
    "1997-06-30",
    "1998-12-31",
    "2005-12-31",
    "2008-12-31",
    "2012-06-30",
    "2015-06-30",
    "2016-12-31",
]


def mjd_parts(text: str) -> tuple[float, float]:
    """Day and fraction of an ISO text in a day of 86400 s, by the standard library's calendar."""
    date, clock = text.split("T")
    hours, minutes, seconds = clock.split(":")
    day = datetime.date.fromisoformat(date).toordinal() - datetime.date(1858, 11, 17).toordinal()
    return float(day), (int(hours) * 3600 + int(minutes) * 60 + float(seconds)) / 86400.0


def seconds_between(later: tuple[float, float], earlier: tuple[float, float]) -> float:
    return float(((later[0] - earlier[0]) + (later[1] - earlier[1])) * 86400.0)


@pytest.mark.parametrize(("inputs", "expected", "tolerance"), checks("time.TAI-UTC"))
def test_leap_seconds_since_1972_are_counted(inputs, expected, tolerance):
    assert tolerance == "exact"
    utc = mjd_parts(inputs["utc"] + "T00:00:00")
    tt = tdb_to_tt(*to_tdb(*utc, "utc"))
    assert seconds_between(tt, utc) == pytest.approx(expected["TT_minus_UTC_s"], abs=1e-9)
    assert seconds_between(tt, utc) - 32.184 == pytest.approx(expected["TAI_minus_UTC_s"], abs=1e-9)


@pytest.mark.parametrize(("inputs", "expected", "tolerance"), checks("time.scales_sofa"))
def test_the_worked_instant_of_the_standards_library_in_every_scale(inputs, expected, tolerance):
    assert tolerance == "1e-6 s"  # the row's TCG and TCB are no scales of this program
    want = mjd_parts(expected["TDB"])
    for scale, text in (
        ("utc", inputs["utc"]),
        ("tai", expected["TAI"]),
        ("tt", expected["TT"]),
        ("tdb", expected["TDB"]),
    ):
        assert seconds_between(to_tdb(*mjd_parts(text), scale), want) == pytest.approx(0.0, abs=1e-6)
    assert seconds_between(tdb_to_tt(*want), mjd_parts(expected["TT"])) == pytest.approx(0.0, abs=1e-6)
    # One double holds a date to about 1 us.
    assert seconds_between(tdb_to_utc(sum(want)), mjd_parts(inputs["utc"])) == pytest.approx(0.0, abs=2e-6)


@pytest.mark.parametrize(("inputs", "expected", "tolerance"), checks("time.jd"))
def test_julian_dates_of_calendar_dates_in_utc_tt_and_tdb(inputs, expected, tolerance):
    assert tolerance == "1e-8 d"
    utc = mjd_parts(inputs["utc"])
    jd = float(expected.get("JD_UTC") or expected["JD"])
    assert sum(utc) + constants.MJD_ZERO_JD == pytest.approx(jd, abs=1e-8, rel=0)
    tdb = to_tdb(*utc, "utc")
    if "JD_TDB" in expected:
        assert sum(tdb) + constants.MJD_ZERO_JD == pytest.approx(float(expected["JD_TDB"]), abs=1e-8, rel=0)
        tt = tdb_to_tt(*tdb)
        assert sum(tt) + constants.MJD_ZERO_JD == pytest.approx(float(expected["JD_TT"]), abs=1e-8, rel=0)
    assert utc_iso(sum(tdb)) == [inputs["utc"] + "Z"]


@pytest.mark.parametrize(("inputs", "expected", "tolerance"), checks("time.decimal_year_from_date"))
def test_the_three_decimal_years_of_a_date(inputs, expected, tolerance):
    assert tolerance == "1e-8 yr"
    mjd = sum(mjd_parts(inputs["tt"]))
    assert years.julian_epoch(mjd) == pytest.approx(float(expected["julian_epoch"]), abs=1e-8, rel=0)
    assert years.besselian_epoch(mjd) == pytest.approx(float(expected["besselian_epoch"]), abs=1e-8, rel=0)
    assert years.calendar_year(mjd) == pytest.approx(
        float(expected["calendar_decimal_year"]), abs=1e-8, rel=0
    )


@pytest.mark.parametrize(("inputs", "expected", "tolerance"), checks("time.decimal_year_published"))
def test_the_published_decimal_years_of_a_date(inputs, expected, tolerance):
    assert tolerance == "5e-6 yr"
    mjd = sum(mjd_parts(inputs["date"]))
    assert mjd == expected["MJD"]
    assert years.julian_epoch(mjd) == pytest.approx(expected["julian_epoch"], abs=5e-6, rel=0)
    assert years.besselian_epoch(mjd) == pytest.approx(expected["besselian_epoch"], abs=5e-6, rel=0)


@pytest.mark.parametrize(("inputs", "expected", "tolerance"), checks("time.date_from_decimal_year"))
def test_the_three_dates_of_a_decimal_year(inputs, expected, tolerance):
    assert tolerance == "1e-5 d"
    year = inputs["year"]
    found = {
        "as_julian_epoch": years.mjd_of_julian_epoch(year),
        "as_besselian": years.mjd_of_besselian_epoch(year),
        "as_calendar": years.mjd_of_calendar_year(year),
    }
    for key, mjd in found.items():
        jd = float(expected[key]["JD_TT"])
        assert float(mjd) + constants.MJD_ZERO_JD == pytest.approx(jd, abs=1e-5, rel=0)
    late = float(found["as_julian_epoch"] - found["as_calendar"])
    assert late == pytest.approx(float(expected["julian_minus_calendar_d"]), abs=1e-5)
    late = float(found["as_julian_epoch"] - found["as_besselian"])
    assert late == pytest.approx(float(expected["julian_minus_besselian_d"]), abs=1e-5)


@pytest.mark.parametrize(("inputs", "expected", "tolerance"), checks("time.epoch_to_jd"))
def test_standard_epochs_fall_on_their_julian_dates(inputs, expected, tolerance):
    assert tolerance == "1e-7 d"
    kind, year = inputs["epoch"][0], float(inputs["epoch"][1:])
    of_epoch = years.mjd_of_julian_epoch if kind == "J" else years.mjd_of_besselian_epoch
    mjd = of_epoch(year)
    assert float(mjd) == pytest.approx(float(expected["JD"]) - constants.MJD_ZERO_JD, abs=1e-7, rel=0)
    to_epoch = years.julian_epoch if kind == "J" else years.besselian_epoch
    assert to_epoch(mjd) == pytest.approx(year, abs=1e-11, rel=0)


@pytest.mark.parametrize(("inputs", "expected", "tolerance"), checks("time.size_of_mistake.decimal_year"))
def test_how_far_the_three_decimal_years_are_apart(inputs, expected, tolerance):
    assert tolerance == "0.002 d"
    assert inputs["range"] == "1950.0..2100.999"
    want = {key: float(value) for key, value in expected.items()}
    year = np.round(np.arange(1950.0, 2100.9995, 0.001), 3)
    julian, calendar = years.mjd_of_julian_epoch(year), years.mjd_of_calendar_year(year)
    assert (julian - calendar).min() == pytest.approx(want["julian_minus_calendar_min_d"], abs=0.002)
    assert (julian - calendar).max() == pytest.approx(want["max_d"], abs=0.002)
    late = julian - years.mjd_of_besselian_epoch(year)
    assert late[0] == pytest.approx(want["julian_minus_besselian_at_1950_d"], abs=0.002)
    assert late[-1] == pytest.approx(want["at_2100.999_d"], abs=0.002)


@pytest.mark.parametrize(("inputs", "expected", "tolerance"), checks("time.size_of_mistake.table"))
def test_the_size_of_each_confusion_of_scales_and_years(inputs, expected, tolerance):
    assert tolerance == "as printed"
    # Light times of the same row are in test_physics_lighttime.py; the tropical year is not used here.
    utc = mjd_parts("2031-04-07T00:00:00")
    assert seconds_between(tdb_to_tt(*to_tdb(*utc, "utc")), utc) == pytest.approx(
        expected["TT-UTC_2017on_s"], abs=1e-9
    )
    tt = np.arange(33282.0, 88000.0, 1.7)
    _, tdb = to_tdb(tt, 0.0, "tt")
    assert 1e-4 * np.ceil(1e4 * 86400.0 * np.abs(tdb).max()) == pytest.approx(expected["TDB-TT_max_s"])
    assert expected["MJD_taken_as_JD-2400000_d"] == constants.MJD_ZERO_JD - 2400000
    span = 28 * constants.JULIAN_YEAR_D
    assert span - 28 * 365 == expected["year_365_vs_365.25_over_28yr_d"]
    assert span - 28 * constants.BESSELIAN_YEAR_D == pytest.approx(
        float(expected["besselian_year_vs_julian_over_28yr_d"]), abs=5e-5
    )
    gregorian = (years.mjd_of_calendar_year(2400.0) - years.mjd_of_calendar_year(2000.0)) / 400.0
    assert span - 28 * float(gregorian) == pytest.approx(
        float(expected["gregorian_365.2425_vs_julian_over_28yr_d"]), abs=5e-4
    )


@pytest.mark.parametrize(("inputs", "expected", "tolerance"), checks("time.constants"))
def test_constants_are_those_of_the_resolutions(inputs, expected, tolerance):
    assert tolerance == "exact"  # to the digits printed
    assert expected["au_km"] == constants.AU_KM
    assert expected["julian_year_s"] == constants.JULIAN_YEAR_D * constants.DAY_S
    assert expected["besselian_year_d"] == constants.BESSELIAN_YEAR_D
    assert f"{constants.LIGHT_TIME_AU_S:.9f}" == expected["light_time_1au_s"]
    assert f"{constants.LIGHT_TIME_AU_D:.12f}" == expected["light_time_1au_d"]
    assert f"{constants.KMS_PER_AU_YR:.12f}" == expected["kms_per_au_per_julian_yr"]


@pytest.mark.parametrize("day", LEAP_SECOND_DAYS)
def test_a_leap_second_has_its_own_second_60(day):
    mjd, _ = mjd_parts(day + "T00:00:00")
    after = sum(to_tdb(mjd + 1.0, 0.0, "utc"))
    next_day = datetime.date.fromisoformat(day) + datetime.timedelta(days=1)
    assert utc_iso(after - np.array([2.0, 1.0, 0.0]) / 86400.0) == [
        f"{day}T23:59:59Z",
        f"{day}T23:59:60Z",
        f"{next_day}T00:00:00Z",
    ]
    # The quasi-MJD counts the day's 86401 seconds.
    assert sum(to_tdb(mjd, 86400.0 / 86401.0, "utc")) == pytest.approx(
        after - 1.0 / 86400.0, abs=2e-11, rel=0
    )


@patient
@given(st.datetimes(datetime.datetime(1960, 1, 2), datetime.datetime(2100, 1, 1)))
@example(datetime.datetime(2016, 12, 31, 23, 59, 59))
def test_utc_written_and_taken_through_tdb_comes_back_to_the_second(moment):
    text = moment.replace(microsecond=0).isoformat()
    day, fraction = mjd_parts(text)
    if text[:10] in LEAP_SECOND_DAYS:
        fraction *= 86400.0 / 86401.0
    elif moment.year < 1972:
        # Days of these years differed from 86400 s: erfa's own encoder knows by how much.
        clock = (moment.hour, moment.minute, float(moment.second))
        jd1, jd2 = erfa.dtf2d("UTC", moment.year, moment.month, moment.day, *clock)
        day, fraction = float(jd1) - constants.MJD_ZERO_JD, float(jd2)
    tdb = sum(to_tdb(day, fraction, "utc"))
    assert utc_iso(tdb) == [text + "Z"]
    assert seconds_between(tdb_to_utc(tdb), (day, fraction)) == pytest.approx(0.0, abs=2e-6)


@patient
@given(st.datetimes(datetime.datetime(1, 1, 2), datetime.datetime(1959, 12, 30)))
def test_before_1960_universal_time_stands_in_for_utc(moment):
    text = moment.replace(microsecond=0).isoformat()
    as_utc = sum(to_tdb(*mjd_parts(text), "utc"))
    assert as_utc == sum(to_tdb(*mjd_parts(text), "ut"))
    assert utc_iso(as_utc) == [text + "Z"]


def test_universal_time_passes_into_utc_in_1960_without_a_jump_of_a_tenth_of_a_second():
    # The first line of the IERS table: TAI - UTC = 1.4178180 s + (MJD - 37300) x 0.001296 s (memory).
    first_line_s = 32.184 + 1.4178180 + (36934 - 37300) * 0.001296
    utc = (36934.0, 0.0)
    assert seconds_between(tdb_to_tt(*to_tdb(*utc, "utc")), utc) == pytest.approx(first_line_s, abs=1e-6)
    before, after = sum(to_tdb(36933.0, 0.9999999, "utc")), sum(to_tdb(36934.0, 0.0000001, "utc"))
    assert (after - before) * 86400.0 == pytest.approx(0.0173, abs=0.1)


@pytest.mark.parametrize(
    ("first", "last", "allowed_s"),
    [(1900, 1960, 1.2), (1700, 1900, 6.0), (1600, 1700, 20.0), (1, 1600, 240.0)],
)
def test_tt_minus_ut_agrees_with_another_reconstruction(first, last, allowed_s):
    # skyfield: Stephenson, Morrison & Hohenkerk 2016 and IERS.
    from skyfield.api import load

    scale = load.timescale(builtin=True)
    year = np.linspace(first, last, 400)
    assert np.abs(delta_t_s(year) - scale.J(year).delta_t).max() < allowed_s


def test_the_short_series_behind_utc_text_is_good_to_10_us():
    from campaign.physics.timescales import _leading_tdb_minus_tt_d

    mjd = np.linspace(33282.0, 88000.0, 5000)  # 1950 to 2100
    full = erfa.dtdb(constants.MJD_ZERO_JD, mjd, 0.0, 0.0, 0.0, 0.0)
    assert np.abs(_leading_tdb_minus_tt_d(mjd) * 86400.0 - full).max() < 2e-5


def test_dates_with_unknown_leap_seconds_give_no_warning_and_no_error():
    with warnings.catch_warnings():
        warnings.simplefilter("error")
        far = utc_iso([200000.0, 2973483.9, -678574.0])
    assert [text[:4] for text in far] == ["2406", "9999", "0001"]


def test_what_no_calendar_holds_has_no_text():
    found = utc_iso([np.nan, np.inf, -np.inf, -678576.0, 2973484.5, 60000.0, 1e300])
    assert found[:5] == [None] * 5
    assert found[6] is None
    assert found[5].startswith("2023-02-24T")  # MJD 60000.0 began on 2023-02-25 UTC
    assert utc_iso([]) == []
    day, fraction = tdb_to_utc([np.nan, 1e9])
    assert np.isnan(day).all() and np.isnan(fraction).all()


def test_not_a_number_stays_alone():
    day, fraction = to_tdb([60000.0, np.nan], 0.25, "utc")
    assert day[0] + fraction[0] == sum(to_tdb(60000.0, 0.25, "utc"))
    assert np.isnan(day[1] + fraction[1])


def test_the_two_parts_keep_what_one_double_would_lose():
    _, early = to_tdb(60000.0, 1e-13, "tai")
    _, zero = to_tdb(60000.0, 0.0, "tai")
    assert early - zero == pytest.approx(1e-13, rel=1e-3)


@patient
@given(st.floats(-678575.0, 2973483.0))
def test_calendar_years_are_those_of_the_standard_library_and_come_back(mjd):
    date = datetime.date.fromordinal(int(np.floor(mjd)) + datetime.date(1858, 11, 17).toordinal())
    year = float(years.calendar_year(mjd))
    begin = datetime.date(date.year, 1, 1)
    length = 366 if datetime.date(date.year, 12, 31).timetuple().tm_yday == 366 else 365
    fraction = ((date - begin).days + mjd - np.floor(mjd)) / length
    assert year == pytest.approx(date.year + fraction, abs=1e-11, rel=0)
    # A year of four digits in one double has a quantum of 1.8e-12 yr, 6.6e-10 d.
    assert float(years.mjd_of_calendar_year(year)) == pytest.approx(mjd, abs=2e-9, rel=0)


def test_an_unknown_scale_is_refused():
    with pytest.raises(InputRefused) as refusal:
        to_tdb(60000.0, 0.0, "gps")
    assert refusal.value.code == "scale-refused"
    assert "utc" in refusal.value.hint
