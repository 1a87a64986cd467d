"""Ctrl-C while something long is written: it stops the work, or comes too late and is noted."""

from __future__ import annotations

import signal
import threading
from types import FrameType
from typing import Any, Self


class LateInterrupts:
    """Keeps Ctrl-C from an end that is under way, so that what is said of the work stays true."""

    def __init__(self) -> None:
        self.came = False
        self._before: Any = None

    def __enter__(self) -> Self:
        return self

    def __exit__(self, *problem: object) -> None:
        if self._before is not None:
            signal.signal(signal.SIGINT, self._before)

    def watch(self, stage: str) -> None:
        """From the last stage on an interrupt is noted and stops nothing."""
        from campaign.model.loading import FINISHING

        if stage == FINISHING and threading.current_thread() is threading.main_thread():
            self._before = signal.signal(signal.SIGINT, self._note)

    def _note(self, number: int, frame: FrameType | None) -> None:
        self.came = True
