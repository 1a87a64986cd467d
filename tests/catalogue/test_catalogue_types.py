"""What the columns refuse. Source of each trap: engineering notes, section 3.6 (measured on SQLite)."""

from __future__ import annotations

import json
import math
from datetime import UTC, datetime, timedelta, timezone
from fractions import Fraction

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from campaign.catalogue.types import (
    Choice,
    JsonText,
    Line,
    Prose,
    Real,
    UtcText,
    ValueRefused,
    Whole,
    utc_text,
)
from campaign.errors import InputRefused


def bind(column_type, value):
    return column_type.process_bind_param(value, None)


@pytest.mark.parametrize(
    "value",
    [
        math.nan,
        math.inf,
        -math.inf,
        np.float64("nan"),
        np.float32(0.1),
        np.float16(0.5),
        np.int64(7),
        np.bool_(True),
        True,
        "7.31",
        b"7",
        7 + 0j,
        Fraction(1, 3),
        2**53 + 1,
        [1.0],
    ],
    ids=repr,
)
def test_a_real_column_refuses(value):
    with pytest.raises(ValueRefused) as refused:
        bind(Real(), value)
    assert refused.value.exit_status == 3


@pytest.mark.parametrize("value", [0.1, -0.0, 5e-324, 1.7976931348623157e308, 3, np.float64(0.1)])
def test_a_real_column_keeps_every_digit_as_a_python_float(value):
    kept = bind(Real(), value)
    assert type(kept) is float
    assert kept == value
    assert math.copysign(1, kept) == math.copysign(1, value)


@pytest.mark.parametrize(
    "value", [1.0, np.float64(2.0), True, np.bool_(True), "7", 2**31, -(2**31) - 1, 2**70, None.__class__]
)
def test_a_whole_column_refuses(value):
    with pytest.raises(ValueRefused):
        bind(Whole(), value)


@pytest.mark.parametrize("value", [7, np.int64(7), np.int8(7), np.uint16(7)])
def test_a_numpy_integer_becomes_a_plain_one_and_not_bytes(value):
    kept = bind(Whole(), value)
    assert type(kept) is int
    assert kept == 7


@pytest.mark.parametrize(
    "character", ["\x00", "\x1b", "\x9b", "\r", "\x7f", "\u202e", "\u200b", "\ud800", "\u2028"]
)
def test_no_text_column_takes_an_invisible_character(character):
    for column_type in (Line(50), Prose()):
        with pytest.raises(ValueRefused) as refused:
            bind(column_type, f"Lantern{character}3")
        assert refused.value.code == "control-character"
        assert refused.value.details["position"] == 7
        assert character not in str(refused.value)


def test_notes_have_lines_and_tabs_and_names_have_not():
    assert bind(Prose(), "one\n\ttwo") == "one\n\ttwo"
    for text in ("one\ntwo", "one\ttwo"):
        with pytest.raises(ValueRefused):
            bind(Line(50), text)


def test_a_text_is_never_cut_silently():
    assert bind(Line(5), "Åse\u00a0é") == "Åse\u00a0é"
    with pytest.raises(ValueRefused):
        bind(Line(5), "Lantern")
    with pytest.raises(ValueRefused):
        bind(Line(5), 3)


def test_a_choice_is_one_of_its_words():
    assert bind(Choice("A", "B"), "A") == "A"
    with pytest.raises(ValueRefused) as refused:
        bind(Choice("A", "B"), "C")
    assert refused.value.details["accepted"] == ["A", "B"]


def test_an_instant_with_another_offset_is_the_same_instant():
    five_hours = timezone(timedelta(hours=5))
    assert utc_text(datetime(2031, 4, 7, 2, 0, tzinfo=five_hours)) == "2031-04-06T21:00:00.000000Z"


@pytest.mark.parametrize(
    "value",
    [
        datetime(2031, 4, 7, 12, 0),
        datetime(1, 1, 1, tzinfo=timezone(timedelta(hours=14))),
        datetime.now(UTC).date(),
        "2031-04-07T12:00:00Z",
    ],
    ids=repr,
)
def test_a_naive_or_impossible_instant_is_refused(value):
    with pytest.raises(ValueRefused):
        bind(UtcText(), value)


offsets = st.integers(-14 * 60, 14 * 60).map(lambda minutes: timezone(timedelta(minutes=minutes)))
instants = st.datetimes(datetime(1, 1, 3), datetime(9999, 12, 29), timezones=offsets)


@given(instants, instants)
def test_text_order_of_instants_is_time_order_and_nothing_is_lost(first, second):
    column_type = UtcText()
    texts = bind(column_type, first), bind(column_type, second)
    assert len(texts[0]) == len(texts[1]) == 27
    assert (texts[0] < texts[1]) == (first < second)
    assert column_type.process_result_value(texts[0], None) == first


json_documents = st.recursive(
    st.none() | st.booleans() | st.integers() | st.floats(allow_nan=False, allow_infinity=False) | st.text(),
    lambda inner: st.lists(inner, max_size=3) | st.dictionaries(st.text(), inner, max_size=3),
    max_leaves=8,
)


@given(json_documents)
def test_a_document_comes_back_as_it_went_in(document):
    column_type = JsonText()
    text = bind(column_type, document)
    if document is not None:
        assert column_type.process_result_value(text, None) == document
        assert json.loads(text) == document


def test_equal_documents_are_equal_text():
    assert (
        bind(JsonText(), {"b": 1, "a": [0.1]})
        == bind(JsonText(), {"a": [0.1], "b": 1})
        == '{"a":[0.1],"b":1}'
    )


@pytest.mark.parametrize(
    "document", [{"x": math.nan}, [math.inf], {1, 2}, {"t": datetime(2031, 1, 1)}], ids=repr
)
def test_what_json_cannot_hold_is_refused(document):
    with pytest.raises(ValueRefused):
        bind(JsonText(), document)


def test_every_column_type_leaves_the_unknown_unknown():
    for column_type in (Real(), Whole(), Line(3), Prose(), Choice("A"), UtcText(), JsonText()):
        assert bind(column_type, None) is None


def test_a_refusal_is_an_input_error_with_what_and_why():
    with pytest.raises(InputRefused) as refused:
        bind(Real(), math.nan)
    assert refused.value.why
    assert refused.value.hint
