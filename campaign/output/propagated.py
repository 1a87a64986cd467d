"""Numbers with propagated errors as short text."""

from __future__ import annotations

import math
from dataclasses import replace

from campaign.model.measured import Measured
from campaign.model.propagated import Propagated
from campaign.output.values import number


def brief(value: Propagated | None) -> str:
    """As ``told``, for a narrow cell: a question mark stands for an error that is not known."""
    return told(value).replace(" (error unknown)", " ?")


def told(value: Propagated | None, unit: str = "") -> str:
    """Median with its 68 % interval as errors; empty where there is none.

    Errors that differ by less than a sixth are told as one; where one side all but vanishes, the interval
    itself is told.
    """
    if value is None or (value.value is None and value.median is None):
        return ""
    tail = unit if unit in {"", "°"} else f" {unit}"
    if value.median is None or value.lo68 is None or value.hi68 is None:
        middle = value.value if value.value is not None else value.median
        return f"{middle:.4g}{tail} (error unknown)".replace("e-", "e−")
    below, above = value.median - value.lo68, value.hi68 - value.median
    if below <= 0.0 and above <= 0.0:
        return f"{value.median:.4g}{tail}"
    if abs(above - below) * 6.0 <= max(above, below):
        below = above = 0.5 * (above + below)
    if min(above, below) < 0.05 * max(above, below):
        # The median stands at an end of what can be: an interval says it better than errors.
        return f"{value.lo68:.2g} … {value.hi68:.2g}{tail}"
    return number(Measured(value.median, below, above)) + tail


def in_millions(value: Propagated | None) -> Propagated | None:
    """The same number in a unit a million times as large."""
    if value is None:
        return None
    value_, median, sigma, lo68, hi68, lo95, hi95 = (
        None if x is None else 1e-6 * x
        for x in (value.value, value.median, value.sigma, value.lo68, value.hi68, value.lo95, value.hi95)
    )
    return replace(
        value, value=value_, median=median, sigma=sigma, lo68=lo68, hi68=hi68, lo95=lo95, hi95=hi95
    )


def phase(value: Propagated, *, error: bool = True) -> str:
    """A phase from periastron with its sign, by default with the error."""
    middle = value.median if value.median is not None else value.value
    if middle is None:
        return ""
    if not error or value.lo68 is None or value.hi68 is None:
        return bare_phase(middle)
    half = 0.5 * (value.hi68 - value.lo68)
    # Two digits of the error: next to periastron of a very eccentric orbit they are far behind the point.
    places = min(max(1 - math.floor(math.log10(half)), 2), 9) if half > 0.0 else 4
    return f"{middle:+.{places}f} ± {half:.{places}f}".replace("-", "−")


def bare_phase(value: float) -> str:
    """A phase from periastron with its sign, and as many places as keep it from looking like none."""
    places = min(1 - math.floor(math.log10(abs(value))), 9) if 0.0 < abs(value) < 1e-3 else 4
    return f"{value:+.{places}f}".replace("-", "−")


def mostly(value: Propagated | None) -> str:
    """The input that makes most of the error, with its share."""
    if value is None:
        return ""
    if value.unknown_errors:
        return f"error unknown: {', '.join(value.unknown_errors)}"
    if value.dominant is None or value.dominant_share is None:
        return ""
    share = f"{100.0 * value.dominant_share:.0f} %"
    return f"{value.dominant}, {share}" if value.dominant_share < 0.995 else value.dominant
