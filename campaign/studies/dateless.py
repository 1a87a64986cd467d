"""Systems whose period is only a limit: no date can be given, but a probability a year can."""

from __future__ import annotations

import numpy as np

from campaign.model.forecasts import EventName
from campaign.physics.timescales import utc_iso
from campaign.studies.forecast import DatedEvent
from campaign.studies.preparing import Prepared, Question


def dateless_events(prepared: Prepared, question: Question) -> list[DatedEvent]:
    """Systems whose period is only a limit: no date, but a probability a year.

    Parameters
    ----------
    prepared : Prepared
        Rows and units.
    question : Question
        Window in ``bmjd_tdb``.

    Returns
    -------
    list of DatedEvent
        One for the marked event of each such system.

    Notes
    -----
    Accuracy: rests on a scale-free prior, P(period > p) = limit / p beyond a lower limit (the time already
    passed without one, where that is longer); below an upper
    limit the period is taken to be the limit itself.

    Source: Gott 1993, Nature 363, 315 (the scale-free survival law).
    """
    result = []
    for position, unit in enumerate(prepared.units):
        row = prepared.rows[unit.rows[0]]
        solution = row.solution
        if (
            row.period_limit is None
            or solution is None
            or solution.epoch is None
            or unit.rows[0] in prepared.learned
        ):
            continue
        event: EventName = solution.epoch_marks
        if event not in question.events:
            continue
        bound, since = row.period_limit.bound, question.as_of - solution.epoch.bmjd_tdb
        notes = [*row.notes]
        if row.period_limit.side == "above":
            survived = max(bound, since)
            opens, closes = (t - solution.epoch.bmjd_tdb for t in (question.start, question.end))
            chance = max(0.0, survived / max(opens, survived) - survived / max(closes, survived))
            yearly = 365.25 / (survived + 365.25) if since >= bound - 365.25 else 0.0
            earliest = utc_iso(np.array([solution.epoch.bmjd_tdb + bound]))[0]
            if since < bound and earliest:
                notes.append(f"not before {earliest[:10]}")
            notes.append("scale-free prior on the period")
        else:
            chance = min(1.0, (question.end - question.start) / bound)
            yearly = min(1.0, 365.25 / bound)
            notes.append("at least this often")
        result.append(
            DatedEvent(
                position, event, None, None, None, None, chance, phase_lost=True, probability_per_yr=yearly,
                notes=notes,
            )
        )  # fmt: skip
    return result
