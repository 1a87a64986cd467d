"""The period as a picture: one line a system, darker where dust is likelier, with years under it."""

from __future__ import annotations

from bisect import bisect_left, bisect_right
from collections.abc import Iterable, Sequence
from dataclasses import dataclass, field
from itertools import groupby, pairwise

from rich.cells import cell_len, set_cell_size

from campaign.model.forecasts import DustWindow, EventForecast, UpcomingResult
from campaign.output.console import Screen, Span
from campaign.output.timeaxis import TimeAxis
from campaign.output.wording import by_date, yearly

# The lowest probability of each shade, and its look; every shade also differs without colour.
SHADES: tuple[tuple[float, str, str], ...] = (
    (0.005, "·", "yellow"),
    (0.05, "░", "yellow"),
    (0.25, "▒", "yellow"),
    (0.50, "▓", "bold yellow"),
    (0.90, "█", "bold yellow"),
)
_TODAY, _MEDIAN, _INTERVAL = "│", "◇", "╌"
_PIPE_WIDTH = 100
_LABEL_LIMIT = 18
_LONG_LABEL_LIMIT = 26


def render_timeline(screen: Screen, result: UpcomingResult) -> None:
    """Write the timeline of every system that has something to show in the period."""
    stories = _stories(result)
    if not stories or result.until_bmjd_tdb <= result.from_bmjd_tdb:
        return
    whole = screen.width or _PIPE_WIDTH
    limit = _LONG_LABEL_LIMIT if any(w.solution for w in result.dust_windows) else _LABEL_LIMIT
    label = min(max(cell_len(screen.spell(each.name)) for each in stories), limit, whole // 3)
    axis = _Axis(result.from_bmjd_tdb, result.until_bmjd_tdb, whole - label - 2)
    today = axis.cell(result.as_of_bmjd_tdb)
    blank = " " * (label + 2)
    if today is not None:
        caption = f"as of {result.as_of_utc.partition('T')[0]}"
        screen.line(blank, Span(_with_caption(today, caption, axis.cells), "cyan"))
    for story in stories:
        screen.line(_label(screen, story.name, label), "  ", *_bar(story, axis, today))
    rule, years = axis.ticks()
    screen.line(blank, Span(rule, "dim"))
    screen.line(blank, Span(years, "dim"))
    screen.wrapped(_legend(stories, axis), hang=2, style="dim")


@dataclass(slots=True)
class _Story:
    """What one system has to show in the period."""

    name: str
    windows: list[DustWindow] = field(default_factory=list)
    periastra: list[EventForecast] = field(default_factory=list)
    lost: EventForecast | None = None


def _stories(result: UpcomingResult) -> list[_Story]:
    """Systems by their first event, without those that have nothing to draw."""
    stories: dict[tuple[str, str | None], _Story] = {}
    side_by_side = {window.system for window in result.dust_windows if window.solution is not None}
    for event in by_date(result.events):
        own = event.solution if event.system in side_by_side else None
        story = stories.setdefault((event.system, own), _Story(_named(event.system, own)))
        if event.phase_lost:
            story.lost = story.lost or event
        elif event.event == "periastron" and event.bmjd_tdb is not None:
            story.periastra.append(event)
    for window in result.dust_windows:
        if window.bmjd_tdb:
            key = (window.system, window.solution)
            stories.setdefault(key, _Story(_named(*key))).windows.append(window)
    return [story for story in stories.values() if story.windows or story.periastra or story.lost]


def _named(system: str, solution: str | None) -> str:
    return system if solution is None else f"{system}: {solution}"


def _label(screen: Screen, name: str, width: int) -> str:
    text = screen.spell(name)
    if cell_len(text) <= width:
        return set_cell_size(text, width)
    mark = "…" if screen.unicode else "~"
    return set_cell_size(text, width - 1) + mark


def _bar(story: _Story, axis: _Axis, today: int | None) -> Iterable[str | Span]:
    marks = [(" ", "")] * axis.cells
    if story.windows:
        marks = [_shade(probability) for probability in axis.probabilities(story.windows)]
    elif story.lost is not None:
        text = f"phase lost: {yearly(story.lost)}"[: axis.cells]
        return [Span(text, "magenta")]
    else:
        for event in story.periastra:
            _mark_periastron(marks, event, axis)
    if today is not None and marks[today][0] == " ":
        marks[today] = (_TODAY, "cyan")
    return [
        Span("".join(character for character, _ in run), style)
        for style, run in groupby(marks, key=lambda mark: mark[1])
    ]


def _shade(probability: float) -> tuple[str, str]:
    found = (" ", "")
    for least, character, style in SHADES:
        if probability >= least:
            found = (character, style)
    return found


def _mark_periastron(marks: list[tuple[str, str]], event: EventForecast, axis: _Axis) -> None:
    assert event.bmjd_tdb is not None
    low, high = event.bmjd_tdb.lo68, event.bmjd_tdb.hi68
    if low is not None and high is not None:
        for place in range(max(0, axis.place(low)), min(axis.cells - 1, axis.place(high)) + 1):
            marks[place] = (_INTERVAL, "")
    middle = axis.cell(event.bmjd_tdb.median)
    if middle is not None:
        marks[middle] = (_MEDIAN, "bold")


def _with_caption(today: int, caption: str, cells: int) -> str:
    if today + 2 + len(caption) <= cells:
        return " " * today + "▾ " + caption
    if today - 1 >= len(caption):
        return " " * (today - 1 - len(caption)) + caption + " ▾"
    return " " * today + "▾"


def _legend(stories: Sequence[_Story], axis: _Axis) -> str:
    parts = []
    if any(story.windows for story in stories):
        bounds = [least for least, _, _ in SHADES] + [1.0]
        shades = [
            f"{character} {100 * low:g}-{100 * high:g} %"
            for (_, character, _), (low, high) in zip(SHADES, pairwise(bounds), strict=True)
        ]
        parts.append(f"{'  '.join(shades)}  the chance that dust is being made, at its highest in a step")
    if any(story.periastra and not (story.windows or story.lost) for story in stories):
        parts.append(f"{_MEDIAN} periastron  {_INTERVAL} its 68 % interval, where no dust is forecast")
    return (
        f"{'; '.join(parts)}; a step is {axis.step_d:.3g} d." if parts else f"A step is {axis.step_d:.3g} d."
    )


class _Axis(TimeAxis):
    """The time axis, with the probability of dust in each of its cells."""

    def probabilities(self, windows: Sequence[DustWindow]) -> list[float]:
        """Per cell the highest probability in it; windows of several cycles count as independent."""
        free = [1.0] * self.cells
        for window in windows:
            first, last = self.place(window.bmjd_tdb[0]), self.place(window.bmjd_tdb[-1])
            for i in range(max(first, 0), min(last, self.cells - 1) + 1):
                free[i] *= 1.0 - self._highest(window, i)
        return [1.0 - value for value in free]

    def _highest(self, window: DustWindow, i: int) -> float:
        low, high = self.start + i * self.step_d, self.start + (i + 1) * self.step_d
        times = window.bmjd_tdb
        inside = window.probability[bisect_left(times, low) : bisect_right(times, high)]
        return max([_interpolated(window, low), _interpolated(window, high), *inside])


def _interpolated(window: DustWindow, instant: float) -> float:
    times, values = window.bmjd_tdb, window.probability
    if instant < times[0] or instant > times[-1]:
        return 0.0
    right = bisect_left(times, instant)
    if times[right] == instant or right == 0:
        return values[right]
    share = (instant - times[right - 1]) / (times[right] - times[right - 1])
    return values[right - 1] + share * (values[right] - values[right - 1])
