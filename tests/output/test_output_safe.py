"""Text from data never steers the terminal."""

import unicodedata

import pytest
from hypothesis import given
from hypothesis import strategies as st

from campaign.output.safe import safe_text, visible

# Common practice, no source: the bytes by which text moves a cursor, sets a title, fills a clipboard,
# or reverses the order of a line.
STEERING = [
    "\x1b[31m",
    "\x1b]52;c;aGk=\x07",
    "\x9b31m",
    "\x00",
    "\r",
    "\n",
    "\u202e",
    "\u2066",
    "\u200b",
    "\u2028",
]


@pytest.mark.parametrize("text", STEERING)
def test_steering_characters_become_readable_escapes(text):
    shown = visible(f"Lantern{text}3")
    assert shown.isprintable()
    assert shown.startswith("Lantern\\")
    assert shown.endswith("3")


def test_ordinary_names_stay_as_they_are():
    for name in ("Lantern 3", "Størtebæk", "灯 3", "α Cru", "O'Dell", "a & b [c]"):
        assert visible(name) == name


@given(st.text(st.characters()))
def test_whatever_comes_in_nothing_steering_comes_out(text):
    shown = visible(text)
    assert not any(unicodedata.category(c) in {"Cc", "Cf", "Cs", "Zl", "Zp"} for c in shown)
    assert visible(shown) == shown


def test_markup_and_emoji_names_are_plain_text_for_rich():
    text = safe_text("[bold]x[/bold] :bomb:", style="red")
    assert text.plain == "[bold]x[/bold] :bomb:"
    assert text.spans == []
