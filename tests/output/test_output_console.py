"""A screen knows its width and what it can show, from what it is given alone."""

import io
import os
import pty

import pytest
from rich.cells import cell_len

from campaign.output.console import Screen, Span, fold, rich_console, screen_for


@pytest.fixture
def terminal():
    """A real terminal of 93 columns, as the kernel makes one."""
    import fcntl
    import struct
    import termios

    leader, follower = pty.openpty()
    fcntl.ioctl(follower, termios.TIOCSWINSZ, struct.pack("HHHH", 40, 93, 0, 0))
    with os.fdopen(follower, "w", encoding="utf-8") as stream:
        yield stream
    os.close(leader)


def test_a_pipe_has_no_width_and_no_colour_even_when_colour_is_forced():
    screen = screen_for(io.StringIO(), {"TERM": "xterm", "FORCE_COLOR": "1", "COLUMNS": "40"})
    assert (screen.is_terminal, screen.width, screen.colour) == (False, None, False)
    assert not rich_console(screen).is_interactive


def test_a_terminal_tells_its_width(terminal):
    screen = screen_for(terminal, {"TERM": "xterm"})
    assert (screen.is_terminal, screen.width, screen.colour) == (True, 93, True)
    assert screen_for(terminal, {"TERM": "xterm", "COLUMNS": "61"}).width == 61
    assert screen_for(terminal, {"TERM": "xterm"}, width=160).width == 160


@pytest.mark.parametrize("environ", [{"TERM": "dumb"}, {}, {"TERM": "xterm", "NO_COLOR": "1"}])
def test_no_escape_code_where_colour_is_not_wanted(terminal, environ):
    screen = screen_for(terminal, environ)
    assert not screen.colour
    heard = io.StringIO()
    Screen(heard, True, 80, screen.colour).line(Span("late", "bold red"))
    assert heard.getvalue() == "late\n"


def test_colour_is_of_the_sixteen():
    heard = io.StringIO()
    Screen(heard, True, 80, True).line(Span("late", "bold yellow"))
    assert heard.getvalue() == "\x1b[1;33mlate\x1b[0m\n"


def test_no_stream_is_no_error():
    screen = screen_for(None, {})
    screen.line("nobody listens")
    assert screen.width is None


@pytest.mark.parametrize("encoding", ["ascii", "latin-1"])
def test_a_narrow_encoding_gets_plain_forms_and_keeps_the_width(encoding):
    raw = io.BytesIO()
    stream = io.TextIOWrapper(raw, encoding=encoding)
    screen = screen_for(stream, {})
    assert not screen.unicode
    screen.wrapped("±12 … 灯", label="- ")
    stream.flush()
    assert raw.getvalue() == b"- +-12 .. \\u706f\n"


def test_folding_keeps_every_word_and_every_width():
    text = "a long sentence with averyveryverylongword and 灯灯灯灯灯灯灯灯灯灯 in it"
    lines = fold(text, 12, hang=2)
    assert all(cell_len(line) <= 12 - (2 if number else 0) for number, line in enumerate(lines))
    assert "".join("".join(lines).split()) == "".join(text.split())


def test_an_indent_stays_whether_the_text_is_folded_or_not():
    assert fold("    short", 12) == ["    short"]
    assert fold("    one two three", 12, hang=6) == ["    one two", "three"]
    assert fold("    ", 2) == [""]
    heard = io.StringIO()
    Screen(heard, True, 12).wrapped("one two three", label="    ", hang=6)
    assert heard.getvalue() == "    one two\n      three\n"


def test_data_in_a_line_cannot_colour_it():
    heard = io.StringIO()
    Screen(heard, True, 80, True).line(Span("\x1b[31mred", ""))
    assert heard.getvalue() == "\\x1b[31mred\n"
