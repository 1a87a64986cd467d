"""Instants as typed. Checks from outside: tests/reference/reading_time.csv (source column in each row), the
date arithmetic of the standard library, and the calendar routines of erfa called directly."""

from __future__ import annotations

import csv
import json
import math
import warnings
from datetime import UTC, datetime, timedelta, timezone
from pathlib import Path

import erfa
import pytest
from hypothesis import given
from hypothesis import strategies as st

from campaign.errors import InputRefused
from campaign.reading.dates import has_leap_second, mjd_of_date, utc_day_length_s
from campaign.reading.instants import describe_instant, read_duration, read_instant, write_instant

REFERENCE = Path(__file__).parent.parent / "reference" / "reading_time.csv"
UNIFORM = 1 / math.sqrt(12)  # standard deviation of a uniform distribution of width 1
MJD_EPOCH = datetime(1858, 11, 17, tzinfo=UTC)


def reference(topic):
    with REFERENCE.open(newline="") as file:
        rows = [row for row in csv.DictReader(file) if row["topic"] == topic]
    cases = [(json.loads(row["inputs"]), json.loads(row["expected"])) for row in rows]
    assert cases, topic
    return cases


def mjd_of(moment):
    return (moment - MJD_EPOCH) / timedelta(days=1)


@pytest.mark.parametrize(("inputs", "expected"), reference("time.jd"))
def test_a_date_and_clock_time_has_its_published_julian_date(inputs, expected):
    read = read_instant(inputs["utc"] + "Z")
    jd = float(expected.get("JD_UTC") or expected["JD"])
    assert read.mjd_day + 2400000.5 + read.mjd_fraction == pytest.approx(jd, abs=1e-8)
    assert read.scale == ("ut" if inputs["utc"] < "1960" else "utc")


@pytest.mark.parametrize(("inputs", "expected"), reference("time.date_from_decimal_year"))
def test_a_decimal_year_is_a_calendar_year_unless_j_or_b_stands_before_it(inputs, expected):
    year = inputs["year"]
    for text, key in ((f"{year}", "calendar"), (f"J{year}", "julian_epoch"), (f"B{year}", "besselian")):
        read = read_instant(f"{text} TT")
        jd = float(expected[f"as_{key}"]["JD_TT"])
        assert read.mjd_day + 2400000.5 + read.mjd_fraction == pytest.approx(jd, abs=1e-5)
        assert read.scale == "tt"


@pytest.mark.parametrize(("inputs", "expected"), reference("time.decimal_year_from_date"))
def test_each_kind_of_decimal_year_of_a_date_is_read_back_to_that_date(inputs, expected):
    date = read_instant(inputs["tt"] + " TT").mjd
    for key, prefix in (("calendar_decimal_year", ""), ("julian_epoch", "J"), ("besselian_epoch", "B")):
        # Nine decimals of a year are 0.03 s.
        assert read_instant(f"{prefix}{expected[key]} TT").mjd == pytest.approx(date, abs=1e-6)


@pytest.mark.parametrize(("inputs", "expected"), reference("time.decimal_year_published"))
def test_the_published_worked_example_of_epochs_agrees(inputs, expected):
    assert read_instant(inputs["date"]).mjd == expected["MJD"]
    for key, prefix in (("julian_epoch", "J"), ("besselian_epoch", "B")):
        assert read_instant(f"{prefix}{expected[key]}").mjd == pytest.approx(
            expected["MJD"], abs=5e-6 * 365.25
        )


@pytest.mark.parametrize(("inputs", "expected"), reference("time.epoch_to_jd"))
def test_the_standard_epochs_have_their_standard_julian_dates(inputs, expected):
    read = read_instant(inputs["epoch"])
    assert read.mjd_day + 2400000.5 + read.mjd_fraction == pytest.approx(float(expected["JD"]), abs=1e-7)
    assert read.scale == "tt"


# (text, MJD, minus_d, plus_d, width_d, scale, place, precision). MJD 62963 is 2031-04-07 (from the standard
# library below); errors by hand: width/sqrt(12) of an interval, the last digit's of a rounded number.
DAY, MINUTE = UNIFORM, UNIFORM / 1440
OLD = mjd_of(datetime(1631, 11, 7, 9, tzinfo=UTC))
UNDERSTOOD = [
    ("2031-04-07T03:12:10Z", 62963 + 11530 / 86400, 0, 0, 0, "utc", "observatory", "second"),
    ("2031-04-07t03:12:10z", 62963 + 11530 / 86400, 0, 0, 0, "utc", "observatory", "second"),
    ("2031-04-07 03:12:10", 62963 + 11530 / 86400, 0, 0, 0, "utc", "observatory", "second"),
    ("2031-04-07T03:12:10.5Z", 62963 + 11530.5 / 86400, 0, 0, 0, "utc", "observatory", "second"),
    ("2031-04-07T05:12:10+02:00", 62963 + 11530 / 86400, 0, 0, 0, "utc", "observatory", "second"),
    ("2031-04-06T21:42:10-0530", 62963 + 11530 / 86400, 0, 0, 0, "utc", "observatory", "second"),
    ("2031-04-07T01:12:10\u221202", 62963 + 11530 / 86400, 0, 0, 0, "utc", "observatory", "second"),
    ("2031-04-07T03:12:10 TDB", 62963 + 11530 / 86400, 0, 0, 0, "tdb", "observatory", "second"),
    ("TT 2031-04-07T03:12:10", 62963 + 11530 / 86400, 0, 0, 0, "tt", "observatory", "second"),
    ("2031-04-07T03:12:10 (TAI)", 62963 + 11530 / 86400, 0, 0, 0, "tai", "observatory", "second"),
    ("2031-04-07T03:12:10 UT", 62963 + 11530 / 86400, 0, 0, 0, "utc", "observatory", "second"),
    ("2031-04-07T03:12:10Z ±2 h", 62963 + 11530 / 86400, 1 / 12, 1 / 12, 0, "utc", "observatory", "second"),
    ("2031-04-07T03:12Z", 62963 + 192 / 1440, MINUTE, MINUTE, 0, "utc", "observatory", "minute"),
    ("2031-04-07", 62963.5, DAY, DAY, 1, "utc", "observatory", "day"),
    ("2031-04-07 TDB", 62963.5, DAY, DAY, 1, "tdb", "observatory", "day"),
    ("2031-04-07 ±2 d", 62963.5, 2, 2, 0, "utc", "observatory", "day"),
    ("2031-04-07 ±2", 62963.5, 2, 2, 0, "utc", "observatory", "day"),
    ("2031-04-07 +3 -2 d", 62963.5, 2, 3, 0, "utc", "observatory", "day"),
    ("2031-04-07 -2 +3 d", 62963.5, 2, 3, 0, "utc", "observatory", "day"),
    ("2031-04-07 ±0.1 d", 62963.5, DAY, DAY, 1, "utc", "observatory", "day"),
    ("2031-04-07/08", 62964.0, DAY, DAY, 1, "utc", "observatory", "night"),
    ("2031-04-30/05-01", 62987.0, DAY, DAY, 1, "utc", "observatory", "night"),
    ("2031-04-30/01", 62987.0, DAY, DAY, 1, "utc", "observatory", "night"),
    ("2031-12-31/2032-01-01", 63232.0, DAY, DAY, 1, "utc", "observatory", "night"),
    ("2031-04", 62972.0, 30 * UNIFORM, 30 * UNIFORM, 30, "utc", "observatory", "month"),
    ("2032-02", 63277.5, 29 * UNIFORM, 29 * UNIFORM, 29, "utc", "observatory", "month"),
    ("2031", 63049.5, 365 * UNIFORM, 365 * UNIFORM, 365, "utc", "observatory", "year"),
    ("2032", 63415.0, 366 * UNIFORM, 366 * UNIFORM, 366, "utc", "observatory", "year"),
    ("2031 ±2 yr", 63049.5, 730.5, 730.5, 0, "utc", "observatory", "year"),
    ("MJD 61234.5", 61234.5, None, None, 0, "utc", "observatory", "Julian date"),
    ("mjd61234.5", 61234.5, None, None, 0, "utc", "observatory", "Julian date"),
    ("MJD_TDB 61234.5", 61234.5, None, None, 0, "tdb", "observatory", "Julian date"),
    ("MJD 61234.5 tt", 61234.5, None, None, 0, "tt", "observatory", "Julian date"),
    ("JD 2461235.0", 61234.5, None, None, 0, "utc", "observatory", "Julian date"),
    ("JD 2461235.0 ±3 h", 61234.5, 0.125, 0.125, 0, "utc", "observatory", "Julian date"),
    ("HJD 2461235.0", 61234.5, None, None, 0, "utc", "heliocentre", "Julian date"),
    ("HJD_TDB 2461235.0", 61234.5, None, None, 0, "tdb", "heliocentre", "Julian date"),
    ("BJD 2461235.0", 61234.5, None, None, 0, "tdb", "barycentre", "Julian date"),
    ("BJD_TDB 2461235.0", 61234.5, None, None, 0, "tdb", "barycentre", "Julian date"),
    ("BJD(UTC) 2461235.0", 61234.5, None, None, 0, "utc", "barycentre", "Julian date"),
    ("BMJD 61234.5", 61234.5, None, None, 0, "tdb", "barycentre", "Julian date"),
    ("BJD 2461234.2±0.5", 61233.7, 0.5, 0.5, 0, "tdb", "barycentre", "Julian date"),
    ("BJD 2461234.2+-0.5 d TDB", 61233.7, 0.5, 0.5, 0, "tdb", "barycentre", "Julian date"),
    ("BJD 2461234.2 TDB ± 0.5 d", 61233.7, 0.5, 0.5, 0, "tdb", "barycentre", "Julian date"),
    ("BJD 2461234.20(15)", 61233.7, 0.15, 0.15, 0, "tdb", "barycentre", "Julian date"),
    ("BJD 2461234.2+0.5-0.4", 61233.7, 0.4, 0.5, 0, "tdb", "barycentre", "Julian date"),
    ("BJD 2461234.2 +0.5/-0.4 d", 61233.7, 0.4, 0.5, 0, "tdb", "barycentre", "Julian date"),
    ("BJD 2461234.2 ±0", 61233.7, 0, 0, 0, "tdb", "barycentre", "Julian date"),
    ("2031.27", 62965.55, 3.65 * UNIFORM, 3.65 * UNIFORM, 0, "utc", "observatory", "decimal year"),
    ("2031.3", 62867 + 109.5, 36.5 * UNIFORM, 36.5 * UNIFORM, 0, "utc", "observatory", "decimal year"),
    ("2031.27 ±0.02", 62965.55, 7.305, 7.305, 0, "utc", "observatory", "decimal year"),
    ("2031.27±0.02 yr", 62965.55, 7.305, 7.305, 0, "utc", "observatory", "decimal year"),
    ("2031.27 ±5 d", 62965.55, 5, 5, 0, "utc", "observatory", "decimal year"),
    ("2031.27+0.04-0.02", 62965.55, 7.305, 14.61, 0, "utc", "observatory", "decimal year"),
    ("J2000.000", 51544.5, 0.36525 * UNIFORM, 0.36525 * UNIFORM, 0, "tt", "observatory", "Julian epoch"),
    ("J2015.5 TDB ±0.1", 51544.5 + 15.5 * 365.25, 36.525, 36.525, 0, "tdb", "observatory", "Julian epoch"),
    ("1931-04-07", 26438.5, DAY, DAY, 1, "ut", "observatory", "day"),
    ("1931-04-07T03:00:00Z", 26438.125, 1 / 86400, 1 / 86400, 0, "ut", "observatory", "second"),
    ("1631-11-07T09:00:00", OLD, 20 / 86400, 20 / 86400, 0, "ut", "observatory", "second"),
    ("1931-04-07T03:00:00 TDB", 26438.125, 0, 0, 0, "tdb", "observatory", "second"),
    ("BJD 2426438.625", 26438.125, None, None, 0, "tdb", "barycentre", "Julian date"),
]  # fmt: skip


@pytest.mark.parametrize(
    ("text", "mjd", "minus_d", "plus_d", "width_d", "scale", "place", "precision"),
    UNDERSTOOD,
)
def test_each_form_is_understood_with_its_scale_place_and_error(
    text, mjd, minus_d, plus_d, width_d, scale, place, precision
):
    read = read_instant(text)
    assert read.mjd == pytest.approx(mjd, abs=1e-9)
    assert 0.0 <= read.mjd_fraction < 1.0 and read.mjd_day == math.floor(read.mjd_day)
    assert (read.scale, read.place, read.precision) == (scale, place, precision)
    for size, wanted in ((read.minus_d, minus_d), (read.plus_d, plus_d)):
        assert size == (None if wanted is None else pytest.approx(wanted, rel=1e-12))
    assert read.width_d == width_d
    assert read.text == text


def test_the_caller_s_scale_and_place_are_meant_where_the_text_does_not_say():
    elements = {"default_scale": "tdb", "default_place": "barycentre"}
    for text in (
        "2031-04-07",
        "2031-04-07T03:12:10",
        "JD 2461235.0",
        "MJD 61234.5",
        "2031.27",
        "2031-04",
        "2031",
    ):
        read = read_instant(text, **elements)
        assert (read.scale, read.place) == ("tdb", "barycentre")
    assert read_instant("2031-04-07T03:12:10Z", **elements).scale == "utc"
    assert read_instant("HJD 2461235.0", **elements).place == "heliocentre"
    night = read_instant("2031-04-07/08", **elements)
    assert (night.scale, night.place) == ("utc", "observatory")


def test_a_night_is_centred_on_the_site_s_midnight_when_its_longitude_is_known():
    # Local mean midnight is 24 h x longitude / 360 deg before midnight UTC in the east.
    west, east = (read_instant("2031-04-07/08", longitude_deg_east=longitude) for longitude in (-70.0, 150.0))
    assert west.mjd == pytest.approx(62964 + 70 / 360)
    assert east.mjd == pytest.approx(62964 - 150 / 360)
    assert west.width_d == east.width_d == 0.5
    assert west.plus_d == pytest.approx(0.5 * UNIFORM)


def test_a_leap_second_is_read_where_one_was_inserted_in_utc():
    # IERS: the last leap second ended 2016-12-31; the day is 86401 s long.
    for text in ("2016-12-31T23:59:60Z", "2017-01-01T00:59:60+01:00", "2016-12-31T18:29:60-05:30"):
        read = read_instant(text)
        assert read.mjd_day == 57753
        assert read.mjd_fraction * 86401 == pytest.approx(86400.0, abs=1e-9)
        assert describe_instant(read).startswith("2016-12-31T23:59:60 UTC")


@pytest.mark.parametrize(
    "text",
    ["2015-12-31T23:59:60Z", "2016-12-31T22:59:60Z", "2016-12-31T23:59:61Z", "2016-12-31T23:59:60 TDB",
     "2035-12-31T23:59:60Z", "1950-12-31T23:59:60Z"],
)  # fmt: skip
def test_a_sixtieth_second_elsewhere_is_refused(text):
    with pytest.raises(InputRefused) as refused:
        read_instant(text)
    assert "leap second" in refused.value.why


def test_the_days_with_leap_seconds_are_those_of_the_published_table():
    # TAI-UTC grew from 10 s (1972-01-01) to 37 s (2017-01-01): 27 leap seconds (IERS).
    table = {case["utc"]: expected["TAI_minus_UTC_s"] for case, expected in reference("time.TAI-UTC")}
    first, last = mjd_of_date(1972, 1, 1), mjd_of_date(2017, 1, 1)
    leap_days = sum(has_leap_second(day) for day in range(first, last))
    assert leap_days == table["2017-01-01"] - table["1972-01-01"]
    assert not any(has_leap_second(day) for day in range(last, mjd_of_date(2026, 6, 1)))


@given(st.datetimes(datetime(1960, 1, 1), datetime(9999, 12, 30)))
def test_utc_clock_times_agree_with_the_standards_library(moment):
    read = read_instant(moment.isoformat(timespec="microseconds") + "Z")
    seconds = moment.second + moment.microsecond / 1e6
    with warnings.catch_warnings():
        warnings.simplefilter("ignore", erfa.ErfaWarning)
        jd1, jd2 = erfa.dtf2d(
            "UTC", moment.year, moment.month, moment.day, moment.hour, moment.minute, seconds
        )
    assert (read.mjd_day + 2400000.5 - jd1) + (read.mjd_fraction - jd2) == pytest.approx(0.0, abs=1e-12)


@given(st.datetimes(datetime(1, 1, 2), datetime(9999, 12, 30)), st.integers(-840, 840))
def test_offsets_are_taken_off_as_the_calendar_does(moment, minutes_east):
    local = moment.replace(microsecond=0, tzinfo=timezone(timedelta(minutes=minutes_east)))
    read = read_instant(local.isoformat())
    whole_seconds = (local - MJD_EPOCH) // timedelta(seconds=1)
    day, second = divmod(whole_seconds, 86400)
    assert read.mjd_day == day
    assert read.mjd_fraction == pytest.approx(second / float(utc_day_length_s(day)), abs=1e-15)


@given(st.datetimes(datetime(1, 1, 1), datetime(9999, 12, 30)))
def test_the_description_says_the_second_that_was_typed(moment):
    text = moment.isoformat(timespec="seconds")
    for scale in ("UTC", "TDB"):
        assert describe_instant(read_instant(f"{text} {scale}")).startswith(text + " ")


IMPOSSIBLE = {
    "2031-02-30": "days 01 to 28",
    "2032-02-30": "days 01 to 29",
    "1900-02-29": "days 01 to 28",
    "2031-04-31": "days 01 to 30",
    "2031-04-00": "days 01 to 30",
    "2031-13-01": "no month 13",
    "2031-00": "no month 00",
    "2031-04-07T25:00:00": "Hours 00 to 23",
    "2031-04-07T24:00:00": "next day",
    "2031-04-07T12:60:00": "minutes 00 to 59",
    "2031-04-07T12:30:60": "leap second",
    "2031-04-07T03:12:10+16:00": "15 hours",
    "2031-04-07T03:12:10+02:75": "below 60",
    "2031-04-07T03:12:10Z TDB": "belong to UTC",
    "2031-04-07T03:12:10+02:00 TT": "belong to UTC",
    "2031-04-07/09": "2031-04-08",
    "2031-04-07/07": "2031-04-08",
    "2031-04-30/31": "2031-05-01",
    "2031-04-07/08 TDB": "UTC",
    "0000-01-01": "0001 to 9999",
    "0000": "0001 to 9999",
    "0001-01-01T00:30:00+01:00": "0001 to 9999",
    "9999-12-31T23:30:00-01:00": "0001 to 9999",
    "9999-12-31/01": "0001 to 9999",
    "MJD 2461235.5": "seven it is a JD",
    "JD 61234.5": "seven digits",
    "BJD 61234.5": "seven digits",
    "MJD -700000": "0001 to 9999",
    "JD 9999999": "0001 to 9999",
}
UNREADABLE = {
    "": "there is none",
    "now": "one of these forms",
    "yesterday": "one of these forms",
    "61234.5": "JD, MJD",
    "2461235.0": "JD, MJD",
    "2461235": "JD, MJD",
    "2031-4-7": "two digits",
    "2031/04/07": "hyphens",
    "2031.04.07": "hyphens",
    "07.04.2031": "year first",
    "7 April 2031": "year first",
    "20310407": "one of these forms",
    "2031-04-07T03": "one of these forms",
    "2031-04-07T3:12": "one of these forms",
    "2031-04-07T03:12:10,5": "one of these forms",
    "2031.": "one of these forms",
    "31-04-07": "year first",
    "２０３１": "one of these forms",
    "MJD": "one of these forms",
    "MJD nan": "one of these forms",
    "MJD 1e5": "one of these forms",
    "BJD_TDB 2461235.0 UTC": "there are two",
    "2031-04-07 ±": "After ±",
    "2031-04-07 ±-2 d": "After ±",
    "2031-04-07 ±nan d": "After ±",
    "2031-04-07 ±1 ±2": "After ±",
    "2031-04-07 ±1e400 d": "finite",
    "2031-04-07 ±1e308 yr": "finite",
    "2031-04-07 ±2 pc": "accepted here",
    "2031-04-07 +3 d": "one of these forms",
    "2031 ±1": "needs its unit",
    "2031-04 ±1": "needs its unit",
    "±2 d": "one of these forms",
    "UTC": "one of these forms",
    "2031-04-07\x00": "control",
    "2031-04-07\n": "control",
    "2031-04-07\u202e": "invisible",
    "2" * 200: "At most",
}


@pytest.mark.parametrize(("text", "reason"), (IMPOSSIBLE | UNREADABLE).items(), ids=ascii)
def test_an_instant_that_cannot_be_is_refused_with_the_reason_and_an_accepted_form(text, reason):
    with pytest.raises(InputRefused) as refused:
        read_instant(text, name="--until")
    assert reason in refused.value.why
    assert refused.value.message.startswith("--until")
    assert refused.value.code == "instant-impossible" if text in IMPOSSIBLE else True
    assert refused.value.details["accepted_form"] in refused.value.hint
    read_instant(refused.value.details["accepted_form"])


@pytest.mark.parametrize(
    ("text", "accepted"),
    [("2031-02-30", "2031-02-28"), ("61234.5", "MJD 61234.5"), ("2461235.0", "JD 2461235.0"),
     ("2031/4/7", "2031-04-07"), ("2031-04-07/09", "2031-04-07/08"), ("MJD 2461235.5", "JD 2461235.5"),
     ("BJD 61234.5", "BMJD 61234.5")],
)  # fmt: skip
def test_the_accepted_form_that_is_shown_is_near_what_was_typed(text, accepted):
    with pytest.raises(InputRefused) as refused:
        read_instant(text)
    assert refused.value.details["accepted_form"] == accepted


def test_no_digit_of_a_long_julian_date_is_lost():
    # One double for a JD would keep 4e-5 s; day and fraction apart keep 1e-11 s.
    read = read_instant("JD 2461234.123456789012345")
    assert (read.mjd_day, read.mjd_fraction) == (61233.0, 0.623456789012345)


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("2031-04-07T03:12:10Z", "2031-04-07T03:12:10 UTC at the observatory"),
        ("2031-04-07T05:12:10.25+02:00", "2031-04-07T03:12:10.250 UTC at the observatory"),
        ("2031-04-07T03:12Z", "2031-04-07 03:12 UTC at the observatory, ±17 s"),
        ("2031-04-07", "day 2031-04-07 (centre 2031-04-07 12:00, ±0.29 d), UTC at the observatory"),
        ("2031-04-07/08", "night 2031-04-07/08 (centre 2031-04-08 00:00, ±0.29 d), UTC at the observatory"),
        ("2031-04 TDB", "calendar month 2031-04 (centre 2031-04-16 00:00, ±8.7 d), TDB at the observatory"),
        ("2031", "calendar year 2031 (centre 2031-07-02 12:00, ±105 d), UTC at the observatory"),
        ("2031.27", "2031-04-09 13:12 (calendar decimal year, ±1.1 d), UTC at the observatory"),
        ("J2000.0 ±0", "2000-01-01 12:00 (Julian epoch), TT at the observatory"),
        ("BJD 2461235.0 +0.5 -0.4", "2026-07-13T12:00:00 TDB at the barycentre (MJD 61234.5), +0.5 -0.4 d"),
        ("HJD 2461235.0", "2026-07-13T12:00:00 UTC at the heliocentre (MJD 61234.5), error unknown"),
        ("1931-04-07", "day 1931-04-07 (centre 1931-04-07 12:00, ±0.29 d), UT at the observatory"),
    ],
)
def test_the_instant_as_understood_is_said_in_one_line(text, said):
    assert describe_instant(read_instant(text)) == said


def test_a_night_with_a_known_site_says_its_local_midnight():
    said = describe_instant(read_instant("2031-04-07/08", longitude_deg_east=-70.0))
    assert said == "night 2031-04-07/08 (centre 2031-04-08 04:40, ±0.14 d), UTC at the observatory"


sizes = st.floats(0.0, 1e6, allow_subnormal=False)
scales = st.sampled_from(["UTC", "TT", "TDB", "TAI"])
kinds = st.sampled_from(["MJD", "HMJD", "BMJD"])


@given(kinds, scales, st.integers(-600_000, 2_399_999), st.integers(0, 10**14 - 1), sizes, sizes)
def test_a_julian_date_is_written_and_read_back_identically(kind, scale, day, digits, minus_d, plus_d):
    fraction = f"{digits:014d}".rstrip("0") or "0"
    number = f"{day}.{fraction}" if day >= 0 else f"{day}"
    read = read_instant(f"{kind}_{scale} {number} +{plus_d!r} -{minus_d!r} d")
    again = read_instant(write_instant(read))
    for field in ("mjd_day", "mjd_fraction", "scale", "place", "minus_d", "plus_d"):
        assert getattr(again, field) == getattr(read, field)
    if read.scale != "ut":
        assert (read.minus_d, read.plus_d) == (minus_d, plus_d)


@given(st.sampled_from([case[0] for case in UNDERSTOOD]))
def test_every_form_is_written_as_a_julian_date_that_reads_back_to_the_same_instant(text):
    read = read_instant(text)
    again = read_instant(write_instant(read))
    assert (again.mjd_day, again.mjd_fraction) == (read.mjd_day, read.mjd_fraction)
    assert (again.scale, again.place) == (read.scale, read.place)
    assert (again.minus_d, again.plus_d) == (read.minus_d, read.plus_d)


NEAR_INSTANTS = st.from_regex(r"[0-9TZ:./+\-±\u2212 JDMBHUC_()dyr]{0,28}", fullmatch=True)


@given(st.text(max_size=40) | NEAR_INSTANTS)
def test_no_text_raises_anything_but_a_refusal_that_shows_an_accepted_form(text):
    try:
        read = read_instant(text)
    except InputRefused as refused:
        assert refused.message.isprintable() and refused.why and refused.hint
        read_instant(refused.details["accepted_form"])
    else:
        assert math.isfinite(read.mjd) and 0.0 <= read.mjd_fraction < 1.0
        assert describe_instant(read).isprintable()


@given(st.sampled_from([case[0] for case in UNDERSTOOD]), st.data())
def test_a_form_with_one_character_changed_is_read_or_refused_never_worse(text, data):
    position = data.draw(st.integers(0, len(text) - 1))
    character = data.draw(st.characters() | st.sampled_from("0123456789-+.:TZ/ ±"))
    for mutated in (
        text[:position] + character + text[position:],
        text[:position] + character + text[position + 1 :],
        text[:position] + text[position + 1 :],
    ):
        try:
            describe_instant(read_instant(mutated))
        except InputRefused as refused:
            read_instant(refused.details["accepted_form"])


@pytest.mark.parametrize(
    ("text", "days"), [("5yr", 1826.25), ("90 d", 90.0), ("90", 90.0), ("6 months", 182.625), ("12 h", 0.5)]
)
def test_a_length_of_time_is_read_in_days(text, days):
    assert read_duration(text) == days


@pytest.mark.parametrize("text", ["0", "-5 yr", "5±1 yr", "", "soon", "5 pc", ">5 yr", "1e400", "5 to 6 yr"])
def test_a_length_of_time_that_is_none_is_refused_with_an_accepted_form(text):
    with pytest.raises(InputRefused) as refused:
        read_duration(text)
    read_duration(refused.value.details["accepted_form"])
