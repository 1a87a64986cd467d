"""Values with errors, limits and ranges as people publish them.

The forms are those of the astronomical literature (common practice, no source); expected values are
written out by hand from the text.
"""

from __future__ import annotations

import math

import pytest
from hypothesis import assume, given
from hypothesis import strategies as st

from campaign.errors import InputRefused
from campaign.model.measured import Limit, Measured, Range
from campaign.reading.units import FAMILIES, accepted_units
from campaign.reading.values import (
    read_assignment,
    read_measured,
    read_measured_or_bound,
    read_plain_value,
    write_measured,
)

SAME_VALUE_IN_DAYS = {
    "3127.5+-0.3": Measured(3127.5, 0.3, 0.3),
    "3127.5±0.3": Measured(3127.5, 0.3, 0.3),
    "3127.5 ± 0.3 d": Measured(3127.5, 0.3, 0.3),
    "3127.5+/-0.3 days": Measured(3127.5, 0.3, 0.3),
    "3127.5(3)": Measured(3127.5, 0.3, 0.3),
    "3127.50(12) d": Measured(3127.5, 0.12, 0.12),
    "3127.5(13)": Measured(3127.5, 1.3, 1.3),
    "3127(3)": Measured(3127.0, 3.0, 3.0),
    "31.2 +0.4 -0.3": Measured(31.2, 0.3, 0.4),
    "31.2+0.4-0.3": Measured(31.2, 0.3, 0.4),
    "31.2 -0.3 +0.4": Measured(31.2, 0.3, 0.4),
    "31.2 +0.4/-0.3 d": Measured(31.2, 0.3, 0.4),
    "31.2 (+0.4/-0.3) d": Measured(31.2, 0.3, 0.4),
    "31.2 +0.4 \u22120.3": Measured(31.2, 0.3, 0.4),
    "(31.2 +0.4 -0.3) d": Measured(31.2, 0.3, 0.4),
    "(\u221231.2 +0.4 -0.3)": Measured(-31.2, 0.3, 0.4),
    "0.30": Measured(0.3, None, None),
    "4.70±0": Measured(4.7, 0.0, 0.0),
    "-4.70±0.1": Measured(-4.7, 0.1, 0.1),
    "(3.1±0.2)e-5": Measured(3.1e-5, 2e-6, 2e-6),
    "3.1e-5±2e-6": Measured(3.1e-5, 2e-6, 2e-6),
    "3.1(2)e-5": Measured(3.1e-5, 2e-6, 2e-6),
    "(3.1 +0.2 -0.3)e-5": Measured(3.1e-5, 3e-6, 2e-6),
    "(3.1±0.2)×10^-5": Measured(3.1e-5, 2e-6, 2e-6),
    "(3.1±0.2) x 10⁻⁵ d": Measured(3.1e-5, 2e-6, 2e-6),
}


@pytest.mark.parametrize(("text", "value"), SAME_VALUE_IN_DAYS.items())
def test_each_published_form_of_a_value_is_read_digit_for_digit(text, value):
    assert read_measured(text) == value


def test_a_missing_error_is_unknown_and_a_zero_error_is_exact():
    assert not read_measured("0.30").error_known
    assert read_measured("0.30±0").sigma == 0.0


# (text, canonical unit, value in it). Factors from outside: au 149 597 870.7 km and nominal solar
# radius 695 700 km and luminosity 3.828e26 W (IAU 2012 B2, 2015 B3); pc = 648000/pi au (IAU 2015 B2) and
# 1 pc = 3.261563777 ly, 1 Jy = 1e-26 W m-2 Hz-1 = 1e-23 erg s-1 cm-2 Hz-1 (memory).
IN_UNITS = [
    ("8.5 yr", "d", 3104.625), ("8.5yr", "d", 3104.625), ("2 Julian years", "d", 730.5), ("12 h", "d", 0.5),
    ("36 hours", "d", 1.5), ("90 min", "d", 0.0625), ("86400 s", "d", 1.0), ("2 weeks", "d", 14.0),
    ("2.1 kpc", "pc", 2100.0), ("3.261563777 ly", "pc", 1.0), ("1500", "pc", 1500.0),
    ("149597870.7 km", "au", 1.0), ("215.032155 Rsun", "au", 1.0), ("1 au", "rsun", 215.032155),
    ("3.14159265358979 rad", "deg", 180.0), ("30 arcmin", "deg", 0.5), ("143°", "deg", 143.0),
    ("7200 arcsec", "deg", 2.0), ("480 mas", "arcsec", 0.48), ('1.2"', "arcsec", 1.2),
    ("1.2″", "arcsec", 1.2), ("2 arcmin", "arcsec", 120.0), ("480000 µas", "arcsec", 0.48),
    ("0.48 arcsec", "mas", 480.0),
    ("1.5 μas", "mas", 0.0015), ("3.5 mas/yr", "mas/yr", 3.5), ("0.0035 arcsec/yr", "mas/yr", 3.5),
    ("1800 km/s", "kms", 1800.0), ("1800 km s-1", "kms", 1800.0), ("1800 km s^-1", "kms", 1800.0),
    ("1800 km s⁻¹", "kms", 1800.0), ("1800 km.s**-1", "kms", 1800.0), ("250 m/s", "kms", 0.25),
    ("12 M☉", "msun", 12.0), ("12 Msun", "msun", 12.0), ("70 kK", "K", 70000.0),
    ("3.828e33 erg/s", "lsun", 1.0),
    ("3.1e-5 Msun/yr", "msun/yr", 3.1e-5), ("3.1e-5 M⊙ yr⁻¹", "msun/yr", 3.1e-5), ("30 mmag", "mag", 0.03),
    ("7.31 mag", "mag", 7.31), ("24 mJy", "jy", 0.024), ("24 uJy", "jy", 2.4e-5), ("24 µJy", "jy", 2.4e-5),
    ("2.4e-26 W m-2 Hz-1", "jy", 2.4), ("2.4e-23 erg s-1 cm-2 Hz-1", "jy", 2.4),
    ("1.24 nm", "angstrom", 12.4),
    ("-12.4 Å", "angstrom", -12.4), ("-12.4 \u212b", "angstrom", -12.4), ("500 mA", "angstrom", 0.5),
    ("2.2 µm", "um", 2.2), ("2%", "fraction", 0.02), ("2.4 km", "m", 2400.0), ("1400 MHz", "ghz", 1.4),
]  # fmt: skip


@pytest.mark.parametrize(("text", "unit", "value"), IN_UNITS)
def test_each_unit_is_converted_to_the_one_the_catalogue_keeps(text, unit, value):
    assert read_measured(text, unit).value == pytest.approx(value, rel=1e-8)


def test_the_unit_also_scales_both_errors():
    assert read_measured("2.1 +0.2 -0.1 kpc", "pc") == Measured(2100.0, 100.0, 200.0)


def test_a_metre_is_not_a_mega_and_a_milli_not_a_mega():
    # Case carries nine orders of magnitude: SI prefixes.
    assert read_measured("1 mJy", "jy").value == 1e-3
    assert read_measured("1 MJy", "jy").value == 1e6
    with pytest.raises(InputRefused):
        read_measured("1 MAS", "mas")


REFUSED = {
    "": "there is none",
    "nan": "finite",
    "inf±1": "finite",
    "1e400": "finite",
    "1e99999": "finite",
    "3127.5±nan": "this order",
    "3127.5±1e400": "finite",
    "3127.5±-0.3": "no sign",
    "3127.5 ± 0.3 ± 0.2": "this order",
    "31.2 +0.4": "Two errors",
    "31.2 -0.3": "Two errors",
    "31.2 +0.4 +0.3": "this order",
    "3127,5±0,3": "comma",
    "3127.5 d ± 0.3": "after the error",
    "3127.5 d ± 0.3 d": "after the error",
    "3127.5(0.3)": "this order",
    "3127.5 (3": "this order",
    "3127.5±": "this order",
    "±0.3": "number is expected",
    "3127.5 parsec": "accepted here",
    "3127.5 furlongs": "accepted here",
    ">12.1": "not a limit",
    "28..32 yr": "not a range",
    "28–32 yr": "not a range",
    "28 to 32 yr": "not a range",
    "28-32 yr": "not a range",
    "12 34": "this order",
    "1_000": "underscores",
    "３": "0 to 9",
    "12\x1b[31m": "control",
    "12\u202e": "invisible",
    "x" * 300: "at most 200",
}


@pytest.mark.parametrize(("text", "reason"), REFUSED.items(), ids=ascii)
def test_what_is_not_one_value_is_refused_with_the_reason_and_an_accepted_form(text, reason):
    with pytest.raises(InputRefused) as refused:
        read_measured(text, "d", "--period")
    assert reason in refused.value.why
    assert refused.value.message.startswith("--period")
    assert refused.value.details["accepted_form"] in refused.value.hint
    read_measured(refused.value.details["accepted_form"], "d", "--period")


def test_a_decimal_comma_is_answered_with_the_point_in_its_place():
    with pytest.raises(InputRefused) as refused:
        read_measured("3127,5±0,3 d")
    assert refused.value.details["accepted_form"] == "3127.5±0.3 d"


def test_a_unit_of_another_kind_is_refused_with_the_list_of_accepted_units():
    with pytest.raises(InputRefused) as refused:
        read_measured("2.1 km/s", "pc", "--distance")
    assert "kpc" in refused.value.why and "ly" in refused.value.why
    assert refused.value.code == "unit-not-accepted"
    assert accepted_units("pc") in refused.value.why


ECCENTRICITY = {"unit": "", "name": "--eccentricity", "low": 0.0, "high": 1.0, "high_open": True}


@pytest.mark.parametrize("text", ["0", "0.71±0.02", "0.99999"])
def test_an_eccentricity_from_zero_to_below_one_is_read(text):
    assert 0 <= read_measured(text, **ECCENTRICITY).value < 1


@pytest.mark.parametrize("text", ["1", "1.0±0.1", "-0.1", "1.2"])
def test_an_eccentricity_of_one_or_more_or_below_zero_is_refused_with_the_range(text):
    with pytest.raises(InputRefused) as refused:
        read_measured(text, **ECCENTRICITY)
    assert refused.value.message == "--eccentricity must be at least 0 and below 1."
    assert refused.value.code == "out-of-range"
    read_measured(refused.value.details["accepted_form"], **ECCENTRICITY)


def test_a_period_of_zero_is_refused():
    with pytest.raises(InputRefused) as refused:
        read_measured("0 d", "d", "--period", low=0.0, low_open=True)
    assert refused.value.message == "--period must be above 0 d."


@given(
    st.sampled_from(sorted(FAMILIES)),
    st.floats(-1e6, 1e6) | st.none(),
    st.floats(-1e6, 1e6) | st.none(),
    st.booleans(),
    st.booleans(),
)
def test_the_form_shown_in_a_refusal_is_itself_accepted_whatever_the_range(
    unit, low, high, low_open, high_open
):
    if low is not None and high is not None:
        low, high = sorted((low, high))
        assume(high - low > 1e-6)
    wanted = {"low": low, "high": high, "low_open": low_open, "high_open": high_open}
    with pytest.raises(InputRefused) as refused:
        read_measured("?", unit, "--x", **wanted)
    read_measured(refused.value.details["accepted_form"], unit, "--x", **wanted)


def test_a_value_that_can_have_no_error_is_read_into_its_unit():
    assert read_plain_value("2.4 km", "m", "--height") == 2400.0
    for text in ("2.4±0.1 km", "2.4(1) km", "2.4 km to 2.5 km", ">2.4 km", "nan", "-500 km", "2.4 d"):
        with pytest.raises(InputRefused) as refused:
            read_plain_value(text, "m", "--height", low=-500.0)
        assert read_plain_value(refused.value.details["accepted_form"], "m", "--height", low=-500.0) >= -500.0


BOUNDS = {
    ">12.1": Limit(12.1, "above"),
    "<6.0": Limit(6.0, "below"),
    "> 12.1": Limit(12.1, "above"),
    ">=12.1": Limit(12.1, "above"),
    "≥ 12.1 d": Limit(12.1, "above"),
    "≤6": Limit(6.0, "below"),
    "<=6": Limit(6.0, "below"),
    ">32 yr": Limit(11688.0, "above"),
    "28–32 yr": Range(10227.0, 11688.0),
    "28—32 yr": Range(10227.0, 11688.0),
    "28..32 yr": Range(10227.0, 11688.0),
    "28 .. 32 yr": Range(10227.0, 11688.0),
    "28 to 32 yr": Range(10227.0, 11688.0),
    "28 yr to 32 yr": Range(10227.0, 11688.0),
    "10227 d to 32 yr": Range(10227.0, 11688.0),
    "28-32 yr": Range(10227.0, 11688.0),
    "28 - 32 yr": Range(10227.0, 11688.0),
    "-5 to -3": Range(-5.0, -3.0),
    "-5–-3": Range(-5.0, -3.0),
    "-5..3": Range(-5.0, 3.0),
    "1e-5-2e-5": Range(1e-5, 2e-5),
    "31.2 -0.3 +0.4": Measured(31.2, 0.3, 0.4),
    "31.2-0.3+0.4": Measured(31.2, 0.3, 0.4),
    "8.5±0.1 yr": Measured(3104.625, 36.525, 36.525),
}


@pytest.mark.parametrize(("text", "value"), BOUNDS.items())
def test_limits_and_ranges_are_told_from_values(text, value):
    read = read_measured_or_bound(text)
    assert type(read) is type(value)
    if isinstance(value, Measured):
        assert (read.value, read.minus, read.plus) == pytest.approx((value.value, value.minus, value.plus))
    else:
        assert read == value


def test_the_level_of_a_limit_is_kept():
    assert read_measured_or_bound(">12.1 mag", "mag", limit_sigma=5.0) == Limit(12.1, "above", 5.0)
    with pytest.raises(InputRefused) as refused:
        read_measured_or_bound(">12.1", "mag", limit_sigma=float("nan"))
    assert refused.value.hint.endswith("3")


@pytest.mark.parametrize(
    "text",
    [
        "28 -32", "-5-3", "32-28", "32 to 28", "28 to 28", "28 to", "to 32", "28 to 30 to 32", ">", "<",
        "> nan",
        ">12.1±0.3", "28±1 to 32", ">28..32", "<>3", "28,5 to 32,5", "0 to 1e400", "28 pc to 32 yr",
        "28 yr to 32",
    ],
)  # fmt: skip
def test_a_bound_that_could_be_read_in_two_ways_or_in_none_is_refused(text):
    with pytest.raises(InputRefused) as refused:
        read_measured_or_bound(text, "d", "--period", low=0.0, low_open=True)
    assert refused.value.why and refused.value.hint
    accepted = refused.value.details["accepted_form"]
    read_measured_or_bound(accepted, "d", "--period", low=0.0, low_open=True)


def test_both_ends_of_a_range_and_the_bound_of_a_limit_must_lie_where_a_value_may():
    for text in (">1.2", "0.5 to 1.2"):
        with pytest.raises(InputRefused):
            read_measured_or_bound(text, **ECCENTRICITY)


numbers = st.floats(allow_nan=False, allow_infinity=False)
sizes = st.floats(min_value=0.0, allow_nan=False, allow_infinity=False)
values = st.one_of(
    st.builds(Measured, numbers),
    st.builds(lambda v, e: Measured(v, e, e), numbers, sizes),
    st.builds(Measured, numbers, sizes, sizes),
    st.builds(Limit, numbers, st.sampled_from(["above", "below"])),
    st.tuples(numbers, numbers).filter(lambda ends: ends[0] < ends[1]).map(lambda ends: Range(*ends)),
)


@given(values, st.sampled_from(sorted(FAMILIES)))
def test_what_is_written_is_read_back_identically(value, unit):
    assert read_measured_or_bound(write_measured(value, unit), unit) == value


def test_a_value_with_only_one_error_known_has_no_text():
    with pytest.raises(ValueError, match="both"):
        write_measured(Measured(1.0, None, 0.2), "d")


NEAR_VALUES = st.from_regex(r"[0-9.eE+\-±()<>≥–,x×^⁻⁵ toydrkmsnaif\u2212\"°%?]{0,24}", fullmatch=True)


@given(st.text(max_size=40) | NEAR_VALUES, st.sampled_from(sorted(FAMILIES)))
def test_no_text_raises_anything_but_a_refusal_that_shows_an_accepted_form(text, unit):
    for read in (read_measured, read_measured_or_bound):
        try:
            value = read(text, unit, "--x")
        except InputRefused as refused:
            assert refused.message.isprintable() and refused.why and refused.hint
            read(refused.details["accepted_form"], unit, "--x")
        else:
            assert read_measured_or_bound(write_measured(value, unit), unit) == value
            if isinstance(value, Measured):
                assert math.isfinite(value.value)
                assert value.minus is None or value.minus >= 0


@given(st.sampled_from(sorted(SAME_VALUE_IN_DAYS) + sorted(BOUNDS)), st.data())
def test_a_form_with_one_character_changed_is_read_or_refused_never_worse(text, data):
    position = data.draw(st.integers(0, len(text) - 1))
    character = data.draw(st.characters())
    for mutated in (
        text[:position] + character + text[position:],
        text[:position] + character + text[position + 1 :],
        text[:position] + text[position + 1 :],
    ):
        try:
            read_measured_or_bound(mutated)
        except InputRefused as refused:
            read_measured_or_bound(refused.details["accepted_form"])


@pytest.mark.parametrize(
    ("text", "band", "value"),
    [
        ("J=8.91±0.03", "J", "8.91±0.03"),
        ("L=>5.0", "L", ">5.0"),
        ("K = 7.31", "K", "7.31"),
        ("8.7 um=3.1±0.2 Jy", "8.7 um", "3.1±0.2 Jy"),
        ("F444W=<12.0", "F444W", "<12.0"),
    ],
)
def test_a_band_and_its_value_are_split_at_the_first_equals_sign(text, band, value):
    assert read_assignment(text) == (band, value)


@pytest.mark.parametrize(
    "text", ["", "=", "J", "J=", "=8.91", "J>5.0", "J\x1b=8", "J=8\x00", "-J=3", "L>=5.0", "x" * 25 + "=1"]
)
def test_a_word_that_is_no_assignment_is_refused_with_an_accepted_form(text):
    with pytest.raises(InputRefused) as refused:
        read_assignment(text)
    assert refused.value.why
    assert read_assignment(refused.value.details["accepted_form"]) == ("J", "8.91±0.03")


@given(st.text(max_size=30))
def test_no_word_given_as_an_assignment_raises_anything_but_a_refusal(text):
    try:
        band, value = read_assignment(text)
    except InputRefused:
        return
    assert band and value
