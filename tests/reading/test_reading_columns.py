"""Whole columns mean what their cells mean alone. Source of the expectations: the readers of single values,
which have tests of their own, and what numbers are refused (`nan`, `1e400`, U+2212)."""

from __future__ import annotations

import math
from datetime import datetime

import numpy as np
import pytest
from hypothesis import example, given, settings
from hypothesis import strategies as st

from campaign.errors import InputRefused
from campaign.model.loading import TimeMeaning
from campaign.reading.columncells import Vocabulary, read_numbers, without_missing
from campaign.reading.columntimes import PLACES, SCALES, read_times
from campaign.reading.instants import read_instant
from campaign.reading.numbers import read_number
from campaign.reading.timenames import read_time_name, stated

patient = settings(max_examples=200, deadline=None)

NUMBERS = st.one_of(
    st.floats(allow_nan=False, allow_infinity=False).map(repr),
    st.decimals(-1000, 1000, places=3).map(str),
    st.integers(-(10**20), 10**20).map(str),
    st.sampled_from(
        ["", "nan", "inf", "1e400", "1e-400", "0", "0.0", "-0", "0e5", "1_000", "7,31", "\u22127.5", "+3",
         " 7.1 ", "7.", ".5", ".", "1e5", "1e00001", "1E+3", "0x10", "\uff17", "7 1", "--", "1" * 201, "7\t",
         "\u00a07", "e5", "4.9e-324", "2e-324", "1.7976931348623157e308"]
    ),
)  # fmt: skip


@patient
@given(st.lists(NUMBERS, max_size=12))
@example(["7.31", "7.32"])
@example(["0.0", "2e-324"])
def test_a_number_of_a_column_is_the_number_of_its_cell(cells):
    found = read_numbers(cells, "mag")
    refused = {fault.place: fault for fault in found.faults}
    for place, cell in enumerate(cells):
        if not cell.strip(" "):
            assert math.isnan(found.values[place])
            assert place not in refused
            continue
        try:
            alone = read_number(cell, "mag")
        except InputRefused as error:
            assert (refused[place].code, refused[place].why) == (error.code, error.why)
        else:
            assert place not in refused
            assert found.values[place] == alone
            assert math.copysign(1.0, found.values[place]) == math.copysign(1.0, alone)


def test_words_that_stand_for_unknown_are_unknown_only_when_said():
    assert [fault.place for fault in read_numbers(["99.99", "--", "1"], "e_mag").faults] == [1]
    found = read_numbers(without_missing(["99.99", " -- ", "1"], ["--", "99.99"]), "e_mag")
    assert not found.faults
    assert np.isnan(found.values).tolist() == [True, True, False]


def decimals(low, high, most):
    return st.tuples(st.integers(low, high), st.integers(0, most)).flatmap(
        lambda drawn: st.integers(0, 10 ** drawn[1] - 1).map(
            lambda digits: str(drawn[0]) + (f".{digits:0{drawn[1]}d}" if drawn[1] else "")
        )
    )


COLUMNS = {
    "JD_UTC": decimals(2_400_000, 2_490_000, 17),
    "HJD_UTC": decimals(2_437_000, 2_480_000, 12),
    "HJD_TT-2450000": decimals(0, 20_000, 14),
    "BJD_TDB-2400000.5": decimals(0, 80_000, 14),
    "BJD_TDB": decimals(2_300_000, 2_480_000, 17),
    "MJD_UTC": decimals(0, 80_000, 16),
    "MJD_TAI-50000": decimals(0, 20_000, 12),
    "BMJD_TDB": decimals(0, 80_000, 16),
    "JD_TT-2450000.25": decimals(0, 9_999, 6),
}


@patient
@given(
    st.sampled_from(sorted(COLUMNS)).flatmap(
        lambda name: st.tuples(st.just(name), st.lists(COLUMNS[name], max_size=9))
    )
)
def test_a_count_of_days_is_read_as_its_text_is_read_alone(drawn):
    name, cells = drawn
    meaning = read_time_name(name)
    times = read_times(cells, meaning, name)
    assert not times.faults
    for place, text in enumerate(times.texts):
        alone = read_instant(text, "utc", "observatory")
        assert times.day[place] == alone.mjd_day, text
        assert times.fraction[place] == alone.mjd_fraction, text
        assert SCALES[times.scale[place]] == alone.scale
        assert PLACES[times.place[place]] == alone.place
        unknown = (alone.minus_d is None, alone.plus_d is None)
        assert (bool(np.isnan(times.minus_d[place])), bool(np.isnan(times.plus_d[place]))) == unknown
        if not unknown[0]:
            assert times.minus_d[place] == alone.minus_d


def test_offsets_are_added_in_decimals():
    # 2450000 + 1234.567 by hand; the text must hold the digits of the table and no others.
    times = read_times(["1234.567", "0.1"], read_time_name("HJD-2450000"), "HJD-2450000")
    assert times.texts == ["HJD_UTC 2451234.567", "HJD_UTC 2450000.1"]
    times = read_times(["1234.5"], read_time_name("MJD-50000 (UTC)"), "MJD-50000")
    assert times.texts == ["MJD_UTC 51234.5"]
    times = read_times(["51234.25"], read_time_name("JD_TT-2400000.5"), "JD")
    assert (times.day[0], times.fraction[0], times.texts[0]) == (51234.0, 0.25, "MJD_TT 51234.25")


CLOCKS = st.datetimes(
    min_value=datetime(1955, 1, 1),
    max_value=datetime(2199, 1, 1),
).flatmap(
    lambda when: st.sampled_from(["", ".5", ".25", ".123456", "Z", ".250Z", " ", "+02:00"]).map(
        lambda tail: (
            when.strftime("%Y-%m-%dT%H:%M:%S") + tail if tail != " " else when.strftime("%Y-%m-%d %H:%M:%S")
        )
    )
)


@patient
@given(st.lists(CLOCKS, max_size=8), st.sampled_from([None, "utc", "tt"]))
@example(["2016-12-31T23:59:60Z", "2016-12-31T12:00:00Z", "2015-06-30T23:59:59.5Z"], None)
@example(
    ["2031-02-29T00:00:00Z", "2031-13-01T00:00:00Z", "2031-01-01T24:00:00Z", "2031-01-01T00:00:00!"], None
)
@example(["2000-02-29T00:00:00Z", "1900-02-29T00:00:00Z", "1969-07-20T20:17:40Z"], None)
@example(
    ["2031-04-07T03:12:10Z", "2031-04-07", "2031.27", "MJD 61234.5 TT", "2031-04-07/08", "2031-04"], "utc"
)
def test_a_written_date_is_read_as_it_is_read_alone(cells, scale):
    times = read_times(cells, TimeMeaning("text", scale=scale), "date")
    refused = {fault.place: fault.code for fault in times.faults}
    for place in range(len(cells)):
        text = times.texts[place]
        if place in refused:
            if refused[place] == "scale-missing":
                assert scale is None
                assert "Z" not in cells[place]
                continue
            with pytest.raises(InputRefused):
                read_instant(cells[place])
            continue
        alone = read_instant(text)
        assert (times.day[place], times.fraction[place]) == (alone.mjd_day, alone.mjd_fraction), text
        assert (SCALES[times.scale[place]], PLACES[times.place[place]]) == (alone.scale, alone.place)
        assert (times.minus_d[place], times.plus_d[place]) == (alone.minus_d, alone.plus_d) or (
            alone.minus_d is None and np.isnan(times.minus_d[place])
        )


def test_the_scale_of_a_clock_is_never_guessed():
    times = read_times(["2031-04-07T03:12:10"], TimeMeaning("text"), "date")
    assert [fault.code for fault in times.faults] == ["scale-missing"]
    with pytest.raises(InputRefused) as refused:
        stated(read_time_name("MJD"), None, None, "MJD")
    assert refused.value.code == "scale-missing"
    assert "--constant scale=utc" in refused.value.hint


def test_name_and_option_may_not_contradict():
    with pytest.raises(InputRefused) as refused:
        stated(read_time_name("HJD_TT"), "utc", None, "HJD_TT")
    assert refused.value.code == "time-contradicted"
    with pytest.raises(InputRefused):
        stated(read_time_name("BJD_TDB"), None, "observatory", "BJD_TDB")
    # The usage of the trade gives way to what is said.
    assert stated(read_time_name("HJD"), "tt", None, "HJD").scale == "tt"
    assert stated(read_time_name("MJD_UTC"), None, "geocentre", "MJD_UTC").place == "geocentre"


def test_a_bare_number_is_no_date():
    times = read_times(["51234.5", "2451234.5"], TimeMeaning("text", scale="utc"), "time")
    assert [fault.code for fault in times.faults] == ["time-unclear", "time-unclear"]


@pytest.mark.parametrize(
    ("name", "count", "offset", "scale", "place"),
    [
        # Names as tables of light curves carry them (common practice, no source).
        ("HJD-2450000", "jd", 2450000, "utc", "heliocentre"),
        ("HJD \u2212 2450000", "jd", 2450000, "utc", "heliocentre"),
        ("HJD (2400000+)", "jd", 2400000, "utc", "heliocentre"),
        ("JD-2400000.5", "mjd", 0, None, "observatory"),
        ("MJD-50000", "mjd", 50000, None, "observatory"),
        ("BJD_TDB", "jd", 0, "tdb", "barycentre"),
        ("BJD (TDB) - 2457000", "jd", 2457000, "tdb", "barycentre"),
        ("BTJD", "jd", 2457000, "tdb", "barycentre"),
        ("bmjd_tdb", "mjd", 0, "tdb", "barycentre"),
        ("RJD", "jd", 2400000, None, "observatory"),
        ("MJD-OBS", "mjd", 0, None, "observatory"),
        ("UTC", "text", 0, "utc", None),
        ("DATE-OBS", "text", 0, None, None),
    ],
)
def test_names_of_times(name, count, offset, scale, place):
    meaning = read_time_name(name)
    assert (meaning.count, meaning.offset_d, meaning.scale, meaning.place) == (count, offset, scale, place)


@pytest.mark.parametrize("name", ["mag", "HJD2450000", "JD_UTC_TDB", "K", "jdk", ""])
def test_other_names_are_none_of_times(name):
    assert read_time_name(name) is None


def test_each_word_of_a_column_is_read_once():
    asked = []

    def read(word):
        asked.append(word)
        if word == "bad":
            raise InputRefused("No.", why="Not this.", code="band-refused")
        return word.upper()

    vocabulary = Vocabulary(read)
    faults = []
    codes = vocabulary.codes(["k", "K", "", "bad", "j", " ", "k"], faults)
    words = [vocabulary.words[code] if code >= 0 else None for code in codes.tolist()]
    assert words == ["K", "K", None, None, "J", None, "K"]
    assert [(fault.place, fault.code) for fault in faults] == [(3, "band-refused")]
    vocabulary.codes(["bad", "k"], faults)
    assert sorted(asked) == ["K", "bad", "j", "k"]
