"""Whether the nominal orbit reaches the critical separation at all, and whether it ever leaves it."""

from __future__ import annotations

from campaign.studies.ephemeris import semi_major_axis_au
from campaign.studies.rows import ForecastRow


def reach_note(row: ForecastRow) -> str | None:
    """Why a rule 'separation' dates no onset, or dates one only within the errors of the elements.

    Parameters
    ----------
    row : ForecastRow
        A system with one solution and its rule; sizes in au.

    Returns
    -------
    str or None
        One phrase; None where the nominal orbit crosses the critical separation.

    Notes
    -----
    Accuracy: nominal values, no errors.

    Source: a(1 - e) <= D <= a(1 + e).
    """
    rule, solution = row.rule, row.solution
    if rule is None or rule.kind != "separation" or solution is None or "onset" not in row.events:
        return None
    a_au = semi_major_axis_au(row.record, solution, row.values["period_d"][0])
    if a_au is None:
        return None
    e, critical = row.values["eccentricity"][0], row.values["critical_separation_au"][0]
    if critical >= a_au * (1.0 + e):
        return "the pair is never farther apart than the critical separation: production never stops"
    if critical < a_au * (1.0 - e):
        return "at the nominal elements the critical separation is never reached"
    return None
