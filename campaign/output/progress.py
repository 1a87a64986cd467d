"""How far a long piece of work is: a bar on a terminal, a plain line every ten seconds elsewhere."""

from __future__ import annotations

from collections.abc import Callable
from types import TracebackType
from typing import TYPE_CHECKING, Self

from campaign.output.console import Screen, rich_console

if TYPE_CHECKING:
    from rich.progress import Progress as Bar

# Nothing is shown of what is over sooner.
_SILENT_S = 1.0
_LINE_EVERY_S = 10.0
_DRAWN_EVERY_S = 0.1


class Progress:
    """Shows progress on ``screen`` while the block lasts, and leaves nothing of it on a terminal.

    ``clock`` gives seconds from any origin. Under ``quiet`` nothing is ever shown.
    """

    def __init__(self, screen: Screen, clock: Callable[[], float], *, quiet: bool = False) -> None:
        self._screen = screen
        self._clock = clock
        self._quiet = quiet or screen.stream is None
        self._began = clock()
        self._shown = self._began
        self._stage = ""
        self._bar: Bar | None = None

    def __enter__(self) -> Self:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, where: TracebackType | None
    ) -> None:
        self.clear()

    def clear(self) -> None:
        """Take the bar away, so that something else can be shown; it comes back with the next word."""
        if self._bar is not None:
            self._bar.stop()
            self._bar = None

    def told(self, stage: str, done: int, total: int | None) -> None:
        """Say what is being done, how far it is, and out of how much (None: nobody knows)."""
        if self._quiet:
            return
        now = self._clock()
        if now - self._began < _SILENT_S:
            return
        if self._screen.is_terminal:
            if stage != self._stage or now - self._shown >= _DRAWN_EVERY_S:
                self._shown = now
                self._draw(stage, done, total)
        elif now - max(self._shown, self._began) >= _LINE_EVERY_S:
            self._shown = now
            self._screen.line(f"{stage}: {_share(done, total)}, {now - self._began:.0f} s so far")
            if self._screen.stream is not None:
                self._screen.stream.flush()
        self._stage = stage

    def _draw(self, stage: str, done: int, total: int | None) -> None:
        if self._bar is None:
            self._bar = _bar(self._screen)
            self._bar.start()
        described = self._screen.spell(stage)
        if not self._bar.task_ids:
            self._bar.add_task(described, completed=done, total=total)
        self._bar.update(self._bar.task_ids[0], description=described, completed=done, total=total)
        self._bar.refresh()


def _share(done: int, total: int | None) -> str:
    return f"{100.0 * done / total:.0f} %" if total else f"{done:,}"


def _bar(screen: Screen) -> Bar:
    from rich.progress import BarColumn, Progress, TaskProgressColumn, TextColumn, TimeElapsedColumn

    return Progress(
        TextColumn("{task.description}", markup=False),
        BarColumn(),
        TaskProgressColumn(),
        TimeElapsedColumn(),
        console=rich_console(screen, screen.stream),
        auto_refresh=False,
        transient=True,
        redirect_stdout=False,
        redirect_stderr=False,
    )
