"""A table keeps inside the window, and says what it left out."""

import io

import pytest
from rich.cells import cell_len

from campaign.output.console import Screen
from campaign.output.tables import Cell, Column, fits, print_table

COLUMNS = (
    Column("system", shrinks=True, min_width=8),
    Column("date"),
    Column("days", align="right", drop=1, name="days from now"),
    Column("note", shrinks=True, drop=2),
)
ROWS = [
    ["Lantern 3", "2031-04-07", "12", Cell("under way", "bold green")],
    ["[red]x[/red] \x1b[31m 灯灯灯灯灯灯灯", "2031-04-08", "−1234", "a long remark that goes on and on"],
    ["O", "2031-04-09", "", ""],
]


def drawn(width, colour=False, columns=COLUMNS, rows=ROWS, unicode=True):
    heard = io.StringIO()
    print_table(Screen(heard, width is not None, width, colour, unicode), columns, rows)
    return heard.getvalue()


@pytest.mark.parametrize("width", [160, 80, 60, 45, 30, 22, 20])
@pytest.mark.parametrize("unicode", [True, False])
def test_no_line_is_wider_than_the_window(width, unicode):
    assert max(cell_len(line) for line in drawn(width, unicode=unicode).splitlines()) <= width


def test_columns_go_in_the_declared_order_and_their_absence_is_said():
    assert "Left out" not in drawn(80)
    assert "Left out at 30 columns: note." in drawn(30)
    assert "Left out at 22 columns: days from now, note." in " ".join(drawn(22).split())


def test_numbers_and_dates_are_never_broken():
    for width in (80, 45, 30):
        text = drawn(width)
        assert all(word in text for word in ("2031-04-07", "2031-04-08", "−1234"))


def test_a_window_too_narrow_for_a_table_gets_one_record_after_the_other():
    columns = (Column("first"), Column("second"))
    text = drawn(20, columns=columns, rows=[["2031-04-07T03:12:10Z", "2031-04-08T03:12:10Z"], ["x", "y"]])
    assert text.splitlines()[-3:] == ["", "first: x", "second: y"]
    assert max(map(len, text.splitlines())) <= 20


def test_in_a_pipe_each_record_is_one_line_of_plain_aligned_text():
    lines = drawn(None).splitlines()
    assert len(lines) == 1 + len(ROWS)
    assert lines[1] == "Lantern 3                             2031-04-07     12  under way"
    assert lines[2].startswith("[red]x[/red] \\x1b[31m 灯灯灯灯灯灯灯  2031-04-08  −1234  a long remark")
    assert lines[0].index("date") == lines[1].index("2031")


def test_style_comes_from_code_and_says_nothing_that_words_do_not():
    import re

    coloured = drawn(80, colour=True)
    assert "\x1b[1;32munder way" in coloured
    assert re.sub(r"\x1b\[[0-9;]*m", "", coloured) == drawn(80)


def test_fit_is_judged_with_every_column():
    assert fits(Screen(None, True, 80), COLUMNS, ROWS)
    assert not fits(Screen(None, True, 30), COLUMNS, ROWS)
    assert fits(Screen(None, False, None), COLUMNS, ROWS)
