"""JSON documents: one, of pure ASCII, with every digit and null for the unknown."""

import json
import math
from dataclasses import dataclass

import numpy as np
import pytest
from hypothesis import example, given
from hypothesis import strategies as st

from campaign.model.measured import Measured
from campaign.output.documents import document, dumps, error_document, plain


@dataclass
class Speed:
    speed_kms: float
    sigma_kms: float | None


def test_a_document_has_the_four_parts_of_the_contract():
    text = document("upcoming", {"events": []}, as_of="2031-04-07T00:00:00Z", warnings=("w",))
    assert text.endswith("}\n")
    assert json.loads(text) == {
        "schema": "campaign/upcoming/1",
        "as_of": "2031-04-07T00:00:00Z",
        "data": {"events": []},
        "warnings": ["w"],
    }


def test_unknown_is_null_and_never_zero_or_nan():
    assert plain(Speed(math.nan, None)) == {"speed_kms": None, "sigma_kms": None}
    assert plain([math.inf, -math.inf]) == [None, None]
    assert plain(Measured(3.0)) == {"value": 3.0, "minus": None, "plus": None}


@given(st.floats(allow_nan=False, allow_infinity=False))
def test_a_float_reads_back_as_the_same_float(value):
    assert json.loads(dumps({"x_d": value}))["x_d"] == value


@given(st.text())
@example("\x7f\x1b\x9b\u202e")
def test_any_text_comes_back_and_stays_ascii(text):
    written = dumps([text])
    assert written.isascii()
    assert json.loads(written) == [text]
    assert "\x1b" not in written
    assert "\x7f" not in written


@pytest.mark.parametrize(
    ("value", "kind"),
    [(np.int64(7), int), (np.float64(0.1), float), (np.bool_(True), bool), (np.float32(0.5), float)],
)
def test_array_scalars_become_plain_ones(value, kind):
    assert type(plain(value)) is kind
    assert plain(value) == value


def test_arrays_become_lists():
    assert plain({"bmjd_tdb": np.array([1.5, np.nan])}) == {"bmjd_tdb": [1.5, None]}


def test_an_error_is_one_object_under_one_key():
    told = json.loads(error_document("not-found", "m", "h", {"given": "x"}))
    assert told == {"error": {"code": "not-found", "message": "m", "hint": "h", "details": {"given": "x"}}}
