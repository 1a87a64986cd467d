"""What a proposed solution would change in the next forecast."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

from campaign.model.forecasts import EventForecast, EventName
from campaign.model.measured import Measured
from campaign.model.records import SystemRecord
from campaign.model.refined import ForecastChange
from campaign.model.systems import DustRule, Solution
from campaign.studies.upcoming import Question, forecast_campaign

_DRAWS = 4000
_AHEAD_PERIODS = 2.5
# Shifts below this, and widths nearer to one, are not worth a word.
_SAME_D, _SAME_RATIO = 0.5, 0.05
_HALF, _DOUBLE = (0.45, 0.55), (1.8, 2.2)


@dataclass(frozen=True, slots=True)
class Change:
    """What is told, and whether the rule 'learned' has to be set for dates to follow from the episodes."""

    told: ForecastChange | None
    learns: bool


def forecast_change(record: SystemRecord, proposal: Solution, as_of: float, event: str) -> Change:
    """Forecast a system as it stands, and as it would stand with the proposal adopted alone.

    Parameters
    ----------
    record : SystemRecord
        As it stands.
    proposal : Solution
        What would be adopted; days, ``bmjd_tdb``.
    as_of : float
        The instant of the question, ``bmjd_tdb``.
    event : str
        The event that was fitted: the next one of that name is compared, else the next periastron.

    Returns
    -------
    Change
        Days; no comparison where nothing is ahead.

    Notes
    -----
    Accuracy: that of ``campaign.studies.upcoming`` with 4,000 draws, without what quiet observations since
    the last episode add.

    Source: DEVELOPERS.md (refined solutions).
    """
    learns = proposal.epoch_marks in ("onset", "maximum") and (
        record.rule is None or record.rule.kind != "learned"
    )
    others = tuple(replace(s, adopted=False, weight=None) for s in record.solutions)
    rule = DustRule(0, record.system.id, "learned") if learns else record.rule
    after = replace(record, solutions=(*others, replace(proposal, id=-1, adopted=True)), rule=rule)
    period = proposal.period_d.value if isinstance(proposal.period_d, Measured) else 3652.5
    # From somewhat before: an event that is overdue is still the next one.
    question = Question(
        as_of=as_of, start=as_of - 0.25 * period, end=as_of + _AHEAD_PERIODS * period, draws=_DRAWS
    )
    now = forecast_campaign([record], {}, question).events
    then = forecast_campaign([after], {}, question).events
    names: tuple[EventName, ...] = (
        ("maximum", "periastron") if event == "maximum" else ("onset", "periastron")
    )
    for name in names:
        found = _next(then, name)
        if found is not None:
            return Change(_told(_same(now, found, period), found), learns)
    return Change(None, learns)


def _next(events: Sequence[EventForecast], name: EventName) -> EventForecast | None:
    """The first that was not seen and is not over."""
    for one in events:
        ahead = one.status not in ("past", "over", "unseen", "late", "under way")
        if one.event == name and not one.observed and one.bmjd_tdb is not None and ahead:
            return one
    return None


def _same(events: Sequence[EventForecast], found: EventForecast, period_d: float) -> EventForecast | None:
    """The same event as it is forecast now: the nearest within half a period, whatever its number."""
    assert found.bmjd_tdb is not None
    place = found.bmjd_tdb.median
    near = [
        one
        for one in events
        if one.event == found.event and one.bmjd_tdb is not None and not one.observed
        and abs(one.bmjd_tdb.median - place) < 0.5 * period_d
    ]  # fmt: skip
    return min(
        near, key=lambda one: abs((one.bmjd_tdb.median if one.bmjd_tdb else 0.0) - place), default=None
    )


def _told(before: EventForecast | None, after: EventForecast) -> ForecastChange:
    now, then = (None if one is None else one.bmjd_tdb for one in (before, after))
    assert then is not None
    shift = None if now is None else then.median - now.median
    ratio = None
    if now is not None and None not in (now.lo68, now.hi68, then.lo68, then.hi68):
        width = (now.hi68 or 0.0) - (now.lo68 or 0.0)
        ratio = ((then.hi68 or 0.0) - (then.lo68 or 0.0)) / width if width > 0.0 else None
    return ForecastChange(
        event=after.event,
        cycle=after.cycle,
        before=now,
        before_utc=None if before is None or before.utc is None else before.utc.median,
        after=then,
        after_utc=None if after.utc is None else after.utc.median,
        shift_d=shift,
        width_ratio=ratio,
        text=_spoken(after.event, shift, ratio, before),
    )


def _spoken(event: str, shift: float | None, ratio: float | None, before: EventForecast | None) -> str:
    if shift is None:
        return f"{event} had no date and now has one"
    if abs(shift) < _SAME_D:
        moved = f"{event} stays where it is"
    else:
        moved = f"{event} moves {abs(shift):.0f} d {'earlier' if shift < 0 else 'later'}"
    if ratio is None:
        missing = before is not None and before.bmjd_tdb is not None and before.bmjd_tdb.lo68 is None
        return f"{moved}, and gets an interval" if missing else moved
    if abs(ratio - 1.0) < _SAME_RATIO:
        return f"{moved}, interval unchanged"
    if _HALF[0] < ratio < _HALF[1]:
        return f"{moved}, interval halves"
    if _DOUBLE[0] < ratio < _DOUBLE[1]:
        return f"{moved}, interval doubles"
    if ratio < 1.0:
        return f"{moved}, interval shrinks to {100.0 * ratio:.0f} % of what it was"
    return f"{moved}, interval grows to {ratio:.1f} times what it was"
