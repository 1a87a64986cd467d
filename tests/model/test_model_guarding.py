"""Texts that a spreadsheet would run are guarded, and every text comes back as it was.

What a spreadsheet runs: cells that begin with =, +, -, @, a tab or a carriage return (OWASP, "CSV Injection";
memory). Full-width forms and line feeds are common practice, no source.
"""

import doctest

import pytest
from hypothesis import example, given
from hypothesis import strategies as st

from campaign.model import guarding
from campaign.model.guarding import guarded, unguarded

RUN_BY_SPREADSHEETS = ("=", "+", "-", "@", "\t", "\r", "\n", "＝", "＋", "－", "＠")


@pytest.mark.parametrize("start", RUN_BY_SPREADSHEETS)
@pytest.mark.parametrize("rest", ["", "1+1", 'HYPERLINK("x")', "cmd|' /C calc'!A0"])
def test_a_text_that_would_be_run_gets_an_apostrophe(start, rest):
    assert guarded(start + rest) == "'" + start + rest
    assert unguarded("'" + start + rest) == start + rest


@pytest.mark.parametrize(
    "text", ["", "Lantern 3", "'t Hooft", "a=b", "3-4", "1e5", "5.0", "'", "''", "λ Cen", "#1", '"x"']
)
def test_other_texts_are_left_alone(text):
    assert guarded(text) == text == unguarded(text)


def test_spaces_in_front_hide_nothing():
    assert guarded("  =1+1") == "'  =1+1"


@given(st.text(alphabet=st.sampled_from("'=+-@＝ \t\nab1"), max_size=6) | st.text(max_size=20))
@example("''=1")
@example("'  -x")
@example("'\n")
def test_every_text_comes_back_and_none_would_be_run(text):
    cell = guarded(text)
    assert unguarded(cell) == text
    assert not cell.lstrip(" ").startswith(RUN_BY_SPREADSHEETS)
    assert cell == text or cell == "'" + text


@given(st.text(alphabet=st.sampled_from("'=+- \tab"), max_size=5), st.text(max_size=5))
def test_no_two_texts_share_a_cell(first, second):
    assert (guarded(first) == guarded(second)) == (first == second)


def test_the_examples_give_what_they_show():
    assert doctest.testmod(guarding).failed == 0
