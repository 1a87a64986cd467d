"""Positions and angles as typed. Expected values are worked by hand from the definition of the sexagesimal
system (1 h = 15 deg, 1 deg = 60' = 3600"); forms are common practice, no source."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from campaign.errors import InputRefused
from campaign.reading.angles import (
    read_angle,
    read_declination,
    read_latitude,
    read_longitude,
    read_right_ascension,
    write_declination,
    write_right_ascension,
)

READERS = (read_right_ascension, read_declination, read_latitude, read_longitude, read_angle)

RIGHT_ASCENSIONS = {
    "18:02:31.5": 270.63125,
    "18 02 31.5": 270.63125,
    "18h02m31.5s": 270.63125,
    "18h 02m 31.5s": 270.63125,
    "18h02m31.5": 270.63125,
    "18:02.525": 270.63125,
    "18h02.525m": 270.63125,
    "18.5h": 277.5,
    "18h": 270.0,
    "+18:02:31.5": 270.63125,
    "270.6": 270.6,
    "270.6d": 270.6,
    "270.6 deg": 270.6,
    "270.6°": 270.6,
    "270d36m00s": 270.6,
    "0": 0.0,
    "00:00:00": 0.0,
    "359.999999": 359.999999,
}
DECLINATIONS = {
    "-45:12:30": -(45 + 12 / 60 + 30 / 3600),
    "\u221245:12:30": -(45 + 12 / 60 + 30 / 3600),
    "-45 12 30": -(45 + 12 / 60 + 30 / 3600),
    "-45d12m30s": -(45 + 12 / 60 + 30 / 3600),
    "-45°12'30\"": -(45 + 12 / 60 + 30 / 3600),
    "-45°12′30″": -(45 + 12 / 60 + 30 / 3600),
    "-45:12.5": -(45 + 12.5 / 60),
    "-00 30 10": -(30 / 60 + 10 / 3600),
    "-00:00:01": -1 / 3600,
    "+00 30 10": 30 / 60 + 10 / 3600,
    "-45.2": -45.2,
    "+45.2": 45.2,
    "-0.5 deg": -0.5,
    "90": 90.0,
    "-90:00:00": -90.0,
}
LATITUDES = {
    "-31.2": -31.2,
    "31.2 S": -31.2,
    "31.2S": -31.2,
    "31.2 N": 31.2,
    "31 12 00 S": -31.2,
    "31:12:00 N": 31.2,
    "31d12m00sS": -31.2,
    "31d12m00s": 31.2,
    "19d28m52.5s N": 19 + 28 / 60 + 52.5 / 3600,
}
LONGITUDES = {
    "70.0 W": -70.0,
    "13.5E": 13.5,
    "-70": -70.0,
    "289.9": -70.1,
    "155d55m59.6s W": -(155 + 55 / 60 + 59.6 / 3600),
    "180": 180.0,
    "-180": 180.0,
    "180 W": 180.0,
    "0": 0.0,
}
ANGLES = {
    "143.5": 143.5,
    "143.5 deg": 143.5,
    "143:30:00": 143.5,
    "143d30m": 143.5,
    "-3 arcmin": -0.05,
    "3.14159265358979 rad": 180.0,
    "3600 arcsec": 1.0,
    "-720": -720.0,
}


def _cases(reader, table):
    return [
        pytest.param(reader, text, value, id=f"{reader.__name__}-{text}") for text, value in table.items()
    ]


@pytest.mark.parametrize(
    ("reader", "text", "degrees"),
    _cases(read_right_ascension, RIGHT_ASCENSIONS)
    + _cases(read_declination, DECLINATIONS)
    + _cases(read_latitude, LATITUDES)
    + _cases(read_longitude, LONGITUDES)
    + _cases(read_angle, ANGLES),
)
def test_each_form_of_an_angle_is_read_in_degrees(reader, text, degrees):
    assert reader(text) == pytest.approx(degrees, rel=1e-14, abs=1e-14)


REFUSED = [
    (read_right_ascension, "24:00:00", "360 degrees"),
    (read_right_ascension, "360", "360 degrees"),
    (read_right_ascension, "270:00:00", "4050 degrees"),
    (read_right_ascension, "-1:00:00", "minus"),
    (read_right_ascension, "\u22121", "minus"),
    (read_right_ascension, "18:60:00", "below 60"),
    (read_right_ascension, "18:59:60", "below 60"),
    (read_right_ascension, "18:02:-3", "colons"),
    (read_right_ascension, "18.5:30:00", "colons"),
    (read_right_ascension, "18:02 31", "Sexagesimal"),
    (read_right_ascension, "18h02s", "Sexagesimal"),
    (read_right_ascension, "18,5", "point"),
    (read_right_ascension, "18:02:31,5", "colons"),
    (read_right_ascension, "18h2.5m30s", "decimal point"),
    (read_right_ascension, "1h2h3h", "Sexagesimal"),
    (read_declination, "95", "95 degrees"),
    (read_declination, "-90:00:00.1", "-90.0"),
    (read_declination, "45:12:61", "below 60"),
    (read_declination, "-45h", "not hours"),
    (read_declination, "--45", "number"),
    (read_declination, "-45 -12 30", "Sexagesimal"),
    (read_declination, "45 S", "Sexagesimal"),
    (read_declination, "nan", "finite"),
    (read_declination, "４５", "0 to 9"),
    (read_declination, "45:12:30\x07", "control"),
    (read_declination, "", "none"),
    (read_latitude, "-31.2 S", "not both"),
    (read_latitude, "31.2 s", "Sexagesimal"),
    (read_latitude, "31.2 E", "Sexagesimal"),
    (read_latitude, "91 N", "91 degrees"),
    (read_latitude, "S", "number"),
    (read_longitude, "200 W", "-200 degrees"),
    (read_longitude, "360", "360 degrees"),
    (read_longitude, "-181", "-181 degrees"),
    (read_longitude, "+70 W", "not both"),
    (read_angle, "5h", "not hours"),
    (read_angle, "2 km", "accepted"),
    (read_angle, "1e308 rad", "finite"),
    (read_angle, "inf", "finite"),
]


@pytest.mark.parametrize(("reader", "text", "reason"), REFUSED)
def test_an_angle_that_cannot_be_is_refused_with_the_reason_and_an_accepted_form(reader, text, reason):
    with pytest.raises(InputRefused) as refused:
        reader(text, "--angle")
    assert reason in refused.value.why
    assert refused.value.message.startswith("--angle")
    assert refused.value.details["accepted_form"] in refused.value.hint
    reader(refused.value.details["accepted_form"])


def test_a_declination_beyond_the_pole_says_where_it_must_lie():
    with pytest.raises(InputRefused) as refused:
        read_declination("95")
    assert refused.value.message == "--dec must be from -90 to +90 degrees."


def test_an_angle_outside_its_range_is_refused_with_a_form_inside_it():
    with pytest.raises(InputRefused) as refused:
        read_angle("95", "--horizon", low=0.0, high=90.0)
    assert read_angle(refused.value.details["accepted_form"], "--horizon", low=0.0, high=90.0) <= 90.0


@given(st.integers(0, 23), st.integers(0, 59), st.integers(0, 59_999), st.sampled_from([":", " ", "hms"]))
def test_hours_minutes_and_milliseconds_come_back_as_they_were_typed(hours, minutes, milliseconds, style):
    seconds = f"{milliseconds // 1000:02d}.{milliseconds % 1000:03d}"
    marks = ("h", "m", "s") if style == "hms" else (style, style, "")
    text = f"{hours:02d}{marks[0]}{minutes:02d}{marks[1]}{seconds}{marks[2]}"
    degrees = read_right_ascension(text)
    assert write_right_ascension(degrees, 3) == f"{hours:02d}:{minutes:02d}:{seconds}"
    assert read_right_ascension(write_right_ascension(degrees, 3)) == degrees


@given(st.sampled_from("+-"), st.integers(0, 89), st.integers(0, 59), st.integers(0, 5999))
def test_a_declination_comes_back_as_it_was_typed_also_within_the_first_degree(
    sign, degrees, minutes, hundredths
):
    text = f"{sign}{degrees:02d}:{minutes:02d}:{hundredths // 100:02d}.{hundredths % 100:02d}"
    value = read_declination(text)
    if value != 0.0:
        assert write_declination(value, 2) == text
        assert (value < 0) == (sign == "-")
    assert read_declination(write_declination(value, 2)) == value


@given(st.floats(0.0, 360.0, exclude_max=True))
def test_any_right_ascension_is_written_to_within_half_the_last_digit(degrees):
    # A hundredth of a second of time is 0.15 arcsec.
    difference = abs(read_right_ascension(write_right_ascension(degrees, 2)) - degrees)
    assert min(difference, 360.0 - difference) <= 0.5 * 0.15 / 3600 + 1e-12
    assert read_right_ascension(repr(degrees)) == degrees


@given(st.floats(-90.0, 90.0))
def test_any_decimal_declination_or_latitude_is_read_exactly(degrees):
    assert read_declination(repr(degrees)) == degrees
    assert read_latitude(repr(degrees)) == degrees
    letter = "S" if degrees < 0 else "N"
    assert read_latitude(f"{abs(degrees)!r} {letter}") == degrees


def test_rounding_up_carries_into_minutes_and_hours():
    assert write_right_ascension(359.9999999, 1) == "00:00:00.0"
    assert write_declination(-59.99999999, 0) == "-60:00:00"


NEAR_ANGLES = st.from_regex(r"[0-9:. hmsd°'\"NSEW+\-\u2212,e]{0,16}", fullmatch=True)


@given(st.text(max_size=30) | NEAR_ANGLES, st.sampled_from(READERS))
def test_no_text_raises_anything_but_a_refusal_that_shows_an_accepted_form(text, reader):
    try:
        degrees = reader(text, "--x")
    except InputRefused as refused:
        assert refused.message.isprintable() and refused.why and refused.hint
        reader(refused.details["accepted_form"], "--x")
    else:
        assert reader(repr(degrees), "--x") == degrees


MUTABLE = [
    (reader, text)
    for reader, table in zip(
        READERS, (RIGHT_ASCENSIONS, DECLINATIONS, LATITUDES, LONGITUDES, ANGLES), strict=True
    )
    for text in table
]


@given(st.sampled_from(MUTABLE), st.data())
def test_a_form_with_one_character_changed_is_read_or_refused_never_worse(case, data):
    reader, text = case
    position = data.draw(st.integers(0, len(text) - 1))
    character = data.draw(st.characters())
    for mutated in (text[:position] + character + text[position:], text[:position] + text[position + 1 :]):
        try:
            reader(mutated)
        except InputRefused as refused:
            reader(refused.details["accepted_form"])
