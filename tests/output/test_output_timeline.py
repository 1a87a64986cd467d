"""The timeline: darker where dust is likelier, a mark for today, years on the axis."""

import datetime
import io
import re
from dataclasses import replace

import pytest
from output_examples import START, dated, forecast, lost, utc_of
from rich.cells import cell_len

from campaign.model.forecasts import DustWindow
from campaign.output.console import Screen
from campaign.output.timeline import SHADES, render_timeline


def empty(days, start=START, as_of=START, **more):
    result = forecast()
    return replace(
        result, events=(), dust_windows=(), bases=(), from_bmjd_tdb=start, until_bmjd_tdb=start + days,
        as_of_bmjd_tdb=as_of, as_of_utc=utc_of(as_of), **more,
    )  # fmt: skip


def drawn(result, width=80, unicode=True):
    heard = io.StringIO()
    render_timeline(Screen(heard, width is not None, width, False, unicode), result)
    return heard.getvalue().splitlines()


def steady(probability, start=START, days=700.0, system="Rook", cycle=1):
    return DustWindow(system, cycle, (start, start + days), (probability, probability))


@pytest.mark.parametrize(
    ("probability", "shade"),
    [(0.001, " "), (0.01, "·"), (0.06, "░"), (0.3, "▒"), (0.6, "▓"), (0.95, "█"), (1.0, "█")],
)
def test_shade_follows_probability(probability, shade):
    lines = drawn(replace(empty(700.0, as_of=START - 1), dust_windows=(steady(probability),)))
    assert lines[0].rstrip() == f"Rook  {shade * 74}".rstrip()


def test_each_shade_has_its_own_plain_character():
    result = replace(
        empty(700.0, as_of=START - 1),
        dust_windows=tuple(steady(least + 0.01, system=f"S{i}") for i, (least, _, _) in enumerate(SHADES)),
    )
    plain = [line.split()[1][0] for line in drawn(result, unicode=False)[: len(SHADES)]]
    assert len(set(plain)) == len(SHADES)
    assert "".join(plain).isascii()


def test_the_bar_stands_where_the_dust_does():
    # 74 cells over 740 d: a cell is 10 d, so days 100 to 150 are cells 10 to 14.
    window = DustWindow("Rook", 1, (START + 101.0, START + 149.0), (1.0, 1.0))
    line = drawn(replace(empty(740.0, as_of=START - 1), dust_windows=(window,)))[0]
    assert line == "Rook  " + " " * 10 + "█" * 5


def test_a_burst_shorter_than_a_step_is_not_lost():
    times = tuple(START + 333.0 + i for i in range(3))
    window = DustWindow("Rook", 1, times, (0.0, 0.97, 0.0))
    line = drawn(replace(empty(7400.0, as_of=START - 1), dust_windows=(window,)))[0]
    assert line.removeprefix("Rook").strip() == "█"


def test_windows_of_two_cycles_share_one_line():
    windows = (steady(0.4), steady(0.4, cycle=2))
    # independent: 1 - 0.6 x 0.6 = 0.64
    lines = drawn(replace(empty(700.0, as_of=START - 1), dust_windows=windows))
    assert lines[0] == "Rook  " + "▓" * 74
    assert sum(line.startswith("Rook") for line in lines) == 1


def test_today_is_marked_and_dated_inside_the_period_only():
    result = replace(empty(740.0, as_of=START + 205.0), dust_windows=(steady(1.0, START + 600, 50.0),))
    lines = drawn(result)
    assert lines[0] == " " * (6 + 20) + "▾ as of " + utc_of(START + 205.0)[:10]
    assert lines[1][6 + 20] == "│"
    assert not any("▾" in line for line in drawn(replace(result, as_of_bmjd_tdb=START - 5)))
    late = drawn(replace(result, as_of_bmjd_tdb=START + 735.0))
    assert late[0].endswith("▾")
    assert cell_len(late[0]) <= 80


@pytest.mark.parametrize("years", [0.1, 0.5, 1, 3, 5, 12, 40, 300, 9000])
@pytest.mark.parametrize("width", [30, 80, 160])
def test_ticks_stand_at_the_start_of_their_month_or_year(years, width):
    result = replace(empty(365.25 * years, as_of=START - 1), dust_windows=(steady(1.0),))
    lines = drawn(result, width)
    rule, labels = lines[1], lines[2]
    step_d = 365.25 * years / (width - 6)
    found = [(match.start() - 6, match.group()) for match in re.finditer(r"\d{4,5}(-\d\d)?", labels)]
    if years >= 1 and width >= 80:
        assert len(found) >= 2
    for place, label in found:
        assert rule[place + 6] == "┬"
        year, _, month = label.partition("-")
        if int(year) > 9999:
            continue
        first = datetime.date(int(year), int(month or 1), 1).toordinal() - 678_576
        assert 0.0 <= first - START - place * step_d <= step_d


def test_without_dust_the_periastron_and_its_interval_are_drawn():
    # A cell is 10 d: the median in cell 40, the interval from cell 34 to cell 46.
    result = replace(
        empty(740.0, as_of=START - 1), events=(dated("Rook", "periastron", 1, START + 405.0, 60.0),)
    )
    lines = drawn(result)
    assert lines[0] == "Rook  " + " " * 34 + "╌" * 6 + "◇" + "╌" * 6
    assert "◇ periastron" in " ".join(lines)


def test_a_lost_phase_is_said_in_the_picture():
    lines = drawn(replace(empty(740.0), events=(lost("Drift"),)))
    assert lines[1].split(maxsplit=1) == ["Drift", "phase lost: 8 %/yr"]


def test_nothing_to_show_draws_nothing():
    assert drawn(empty(740.0)) == []


def test_a_system_of_long_name_keeps_its_bar():
    result = replace(
        empty(740.0, as_of=START - 1),
        dust_windows=(steady(1.0, days=740.0, system="The Long Name of It All"),),
    )
    line = drawn(result)[0]
    assert line.startswith("The Long Name of …  █")
    assert cell_len(line) == 80
