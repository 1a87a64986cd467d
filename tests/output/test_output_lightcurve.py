"""A light curve in characters: brighter is higher, later is to the right, and nothing leaves the window.

How a magnitude is drawn: common practice, no source.
"""

import io
import math
import re

import pytest
from hypothesis import given
from hypothesis import strategies as st
from output_examples import HOSTILE_NAME
from rich.cells import cell_len

from campaign.model.curves import Curve, CurvePoint
from campaign.output.console import Screen
from campaign.output.lightcurve import MARKS, render_curves

MARGIN = 10  # eight cells of label, one of space, one of axis


def point(day, value, error=0.02, state="quiet"):
    return CurvePoint(59_215.0 + day, value, error, error, state)


def curve(*points, system="Rook", kind="photometry", of="K", unit="mag", downward=True):
    return Curve(system, kind, of, unit, downward, points)


def drawn(*curves, width=80, unicode=True, colour=False):
    heard = io.StringIO()
    render_curves(Screen(heard, width is not None, width, colour, unicode), curves)
    return heard.getvalue()


def places(text, mark):
    """Row and column of each mark within the strips, from the top left."""
    strips = [line for line in text.splitlines() if len(line) >= MARGIN and line[MARGIN - 1] in "│┤|+"]
    found = []
    for row, line in enumerate(strips):
        found += [(row, column) for column, each in enumerate(line[MARGIN:]) if each == mark]
    return found


def test_a_brighter_magnitude_lies_higher_and_a_later_one_to_the_right():
    text = drawn(curve(point(0, 7.0, None), point(100, 6.0, None), point(200, 8.0, None)))
    (top, middle), (first_row, first), (bottom, last) = sorted(places(text, "●"))
    assert top < first_row < bottom
    assert first < middle < last
    assert middle - first == pytest.approx(last - middle, abs=1)


def test_a_greater_velocity_lies_higher():
    velocities = curve(point(0, -40.0, None, "measured"), point(100, 50.0, None, "measured"), kind="velocity",
                       of="star A", unit="kms", downward=False)  # fmt: skip
    text = drawn(velocities)
    assert [column for _, column in sorted(places(text, "●"))] == sorted(
        (column for _, column in places(text, "●")), reverse=True
    )
    assert "velocity star A, km/s, 2 points" in text
    assert "downward" not in text


def test_labels_stand_beside_the_values_they_name():
    text = drawn(curve(point(0, 6.0, None), point(100, 7.0, None), point(200, 8.0, None)))
    labelled = {float(line[:9]): line for line in text.splitlines() if line[9:10] == "┤"}
    assert len(labelled) >= 3
    assert list(labelled) == sorted(labelled)
    for value in (6.0, 7.0, 8.0):
        assert "●" in labelled[value]


def test_dates_stand_below_the_points():
    # MJD 59215 is 2021-01-01, and eight years are 2,922 days: by definition and calendar, memory.
    text = drawn(curve(point(0, 7.0), point(1461, 7.1), point(2922, 7.2)), width=120)
    *_, rule, dates, _ = text.splitlines()
    first, middle, last = sorted(column + MARGIN for _, column in places(text, "●"))
    assert middle - first == pytest.approx(last - middle, abs=1)
    labels = list(re.finditer(r"\d{4}", dates))
    assert len(labels) >= 4
    for label in labels:
        assert rule[label.start()] == "┬"
        years = int(label.group()) - 2021
        assert label.start() == pytest.approx(first + years / 8 * (last - first), abs=1)


def test_a_limit_points_to_where_the_star_may_be():
    text = drawn(curve(point(0, 7.0), point(100, 12.1, None, "above"), point(200, 6.0, None, "below")))
    assert len(places(text, "▽")) == len(places(text, "△")) == 1
    assert places(text, "▽")[0][0] > places(text, "●")[0][0] > places(text, "△")[0][0]
    assert "▽ too faint to see" in text and "△ saturated" in text
    flux = drawn(curve(point(0, 1.0, None, "above"), kind="flux", unit="jy", downward=False))
    assert "△ above a limit" in flux


def test_what_is_thought_of_a_point_shows_without_colour_and_in_plain_characters():
    states = [state for state in MARKS if state not in ("above", "below", "measured")]
    points = [point(100 * n, 7.0 + n / 10, None, state) for n, state in enumerate(states)]
    text = drawn(curve(*points))
    assert len({mark for state in states for mark in MARKS[state][0]}) == len(states)
    for state in states:
        mark, _, name = MARKS[state]
        assert places(text, mark) and f"{mark} {name}" in " ".join(text.split())
    plain = drawn(curve(*points), unicode=False)
    assert plain.isascii()
    assert len({line for line in plain.splitlines() if "excess" in line}) == 1


def test_an_excess_is_not_hidden_by_a_quiet_point_of_the_same_cell():
    text = drawn(curve(point(0, 7.0, state="quiet"), point(0.001, 7.0, state="excess"), point(1000, 7.0)))
    assert len(places(text, "◆")) == 1


def test_an_error_is_a_bar_as_long_as_it_is():
    text = drawn(
        curve(point(0, 7.0, 0.5), point(100, 7.0, 0.1), point(200, 6.0, None), point(300, 8.0, None))
    )
    (row, long_one), (_, short_one), *_ = sorted(places(text, "●"), key=lambda each: each[1])
    bars = places(text, "│")
    own = [each for each, column in bars if column == long_one]
    assert len(own) > len([each for each, column in bars if column == short_one])
    assert min(own) < row < max(own)
    assert "│ error" in text


def test_crowded_points_are_drawn_without_errors_and_it_says_so():
    crowded = drawn(curve(*(point(n / 10, 7.0 + (n % 7) / 100) for n in range(500))))
    assert "500 points; errors not drawn" in crowded
    assert "│ error" not in crowded


def test_one_large_error_does_not_flatten_the_rest():
    text = drawn(curve(point(0, 7.0), point(100, 7.5), point(200, 7.2, 50.0)))
    rows = {row for row, _ in places(text, "●")}
    assert max(rows) - min(rows) >= 5


def test_each_system_has_its_own_drawing_and_each_band_its_strip():
    text = drawn(curve(point(0, 7.0)), curve(point(0, 6.0), of="L"), curve(point(0, 5.0), system="Quarry"))
    lines = text.splitlines()
    assert [line for line in lines if line in ("Rook", "Quarry")] == ["Rook", "Quarry"]
    assert sum(line.startswith("photometry") for line in lines) == 3
    assert sum(line.startswith("magnitudes") or "a step is" in line for line in lines) == 2


def test_nothing_to_draw_is_said():
    assert drawn() == "No observation with a value passes the filters.\n"


@pytest.mark.parametrize("width", [None, 160, 80, 40, 20])
@pytest.mark.parametrize("unicode", [True, False])
def test_hostile_names_neither_steer_the_screen_nor_widen_it(width, unicode):
    hostile = curve(point(0, 7.0), point(10, 7.1), system=HOSTILE_NAME, of=HOSTILE_NAME, unit="\x1b[2J")
    text = drawn(hostile, width=width, unicode=unicode)
    assert all(line.isprintable() for line in text.splitlines())
    widest = max(cell_len(line) for line in text.splitlines())
    assert width is None or widest <= width
    coloured = drawn(hostile, width=80, colour=True)
    assert "\x1b[2J" not in coloured and "\x1b]0" not in coloured


@given(
    values=st.lists(
        st.tuples(
            st.floats(-2e6, 1e7),
            st.floats(-1e300, 1e300) | st.floats(-30, 40),
            st.none() | st.floats(0.0, 1e300),
            st.sampled_from(sorted(MARKS)),
        ),
        min_size=1,
        max_size=12,
    ),
    width=st.sampled_from([None, 160, 80, 41, 20]),
    downward=st.booleans(),
)
def test_any_values_are_drawn_inside_the_window(values, width, downward):
    points = tuple(CurvePoint(when, value, error, error, state) for when, value, error, state in values)
    text = drawn(Curve("Rook", "flux", "K", "jy", downward, points), width=width)
    lines = text.splitlines()
    assert width is None or max(map(cell_len, lines)) <= width
    assert "nan" not in text and "inf" not in text
    legend = " ".join(text.split())
    assert all(math.isfinite(value) for _, value, _, _ in values) and "a step is" in legend
