"""Progress on standard error. Source: the issue (anything over a second; a bar on a terminal, a plain line
every ten seconds otherwise; nothing under --quiet)."""

from __future__ import annotations

import io

import pytest

from campaign.output.console import Screen
from campaign.output.progress import Progress


class Clock:
    def __init__(self) -> None:
        self.now = 100.0

    def __call__(self) -> float:
        return self.now


def work(
    screen: Screen, *, seconds: float, step: float = 0.25, quiet: bool = False, total: int | None = 400
) -> str:
    clock = Clock()
    with Progress(screen, clock, quiet=quiet) as progress:
        done = 0
        while clock.now < 100.0 + seconds:
            clock.now += step
            done += 1
            progress.told("reading \x1b[31m", done, total)
    assert isinstance(screen.stream, io.StringIO)
    return screen.stream.getvalue()


def test_what_is_over_within_a_second_shows_nothing():
    assert work(Screen(io.StringIO()), seconds=0.9) == ""
    assert work(Screen(io.StringIO(), is_terminal=True, width=80), seconds=0.9) == ""


def test_elsewhere_than_on_a_terminal_a_plain_line_comes_every_ten_seconds():
    said = work(Screen(io.StringIO()), seconds=35.0).splitlines()
    assert said == [
        "reading \\x1b[31m: 10 %, 10 s so far",
        "reading \\x1b[31m: 20 %, 20 s so far",
        "reading \\x1b[31m: 30 %, 30 s so far",
    ]


def test_where_nobody_knows_the_end_the_number_done_is_told():
    assert work(Screen(io.StringIO()), seconds=12.0, total=None).startswith("reading \\x1b[31m: 40, 10 s")


def test_on_a_terminal_there_is_a_bar_that_goes_away():
    screen = Screen(io.StringIO(), is_terminal=True, width=80, colour=True)
    said = work(screen, seconds=5.0)
    assert "%" in said
    assert "reading \\x1b[31m" in said
    assert "\x1b[31m:" not in said
    # The last thing written clears the line of the bar (ECMA-48: EL erases in line).
    assert said.rstrip().endswith(("\x1b[2K", "\x1b[?25h", "\x1b[1A\x1b[2K"))


def test_the_bar_goes_out_of_the_way_of_other_words_and_comes_back():
    screen, clock = Screen(io.StringIO(), is_terminal=True, width=80, colour=True), Clock()
    with Progress(screen, clock) as progress:
        clock.now += 2.0
        progress.told("reading", 10, 100)
        progress.clear()
        before = screen.stream.getvalue()
        # Nothing of the bar is left on its line (ECMA-48: EL erases in line), and the cursor is there.
        assert before.rstrip().endswith(("\x1b[2K", "\x1b[?25h", "\x1b[1A\x1b[2K"))
        assert "\x1b[?25h" in before
        screen.line("a table")
        clock.now += 0.2
        progress.told("reading", 20, 100)
        assert "20%" in screen.stream.getvalue()[len(before) :]


@pytest.mark.parametrize("terminal", [False, True])
def test_quiet_means_quiet(terminal):
    assert work(Screen(io.StringIO(), is_terminal=terminal, width=80), seconds=35.0, quiet=True) == ""


def test_no_stream_is_no_trouble():
    with Progress(Screen(None), Clock()) as progress:
        progress.told("reading", 1, 2)
