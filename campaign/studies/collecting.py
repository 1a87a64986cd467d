"""Many small results at once: the collector of cyclic garbage stands still while they are made."""

from __future__ import annotations

import gc
from collections.abc import Iterator
from contextlib import contextmanager


@contextmanager
def collector_at_rest() -> Iterator[None]:
    """Make many small objects without interruption.

    Frozen results refer to nothing that refers back, so there is nothing to collect, yet the collector would
    walk through all of them again and again: a fifth of the time of a forecast of ten thousand systems.

    Notes
    -----
    Accuracy: no number changes. Source: documentation of the ``gc`` module.
    """
    was_on = gc.isenabled()
    gc.disable()
    try:
        yield
    finally:
        if was_on:
            gc.enable()
