"""The wind collision of one system: geometry, cooling, temperatures and line of sight through the orbit."""

from __future__ import annotations

from dataclasses import dataclass, field
from datetime import datetime

import numpy as np
from numpy.typing import NDArray

from campaign.errors import InputRefused
from campaign.model.instants import TypedInstant
from campaign.model.records import SystemRecord
from campaign.model.systems import Solution
from campaign.model.winds import WindOverrides, WindsResult
from campaign.physics import windmomentum
from campaign.physics.sightline import skew_rad
from campaign.physics.timescales import utc_iso
from campaign.studies.instants import axis_instant
from campaign.studies.sampling import DEFAULT_DRAWS, DEFAULT_SEED
from campaign.studies.systems import require_solution
from campaign.studies.watch import DEFAULT_ROWS, Campaign, mjd_of
from campaign.studies.winds_cooling import coolings
from campaign.studies.winds_draws import Propagation
from campaign.studies.winds_events import events
from campaign.studies.winds_geometry import forms, surface, winds_of_stars
from campaign.studies.winds_inputs import WindInputs, gather, told_inputs
from campaign.studies.winds_notes import assumptions, warnings
from campaign.studies.winds_sightline import flare_needs, line_of_sight
from campaign.studies.winds_table import profile, table

FloatArray = NDArray[np.float64]

MOST_ROWS = 2_000
# Rows times draws of a table; longer ones are drawn more thinly, down to the least.
_TABLE_DRAWS, _LEAST_DRAWS = 4_000_000, 2_000


@dataclass(frozen=True, slots=True)
class WindsQuestion:
    """What is asked: instants ``bmjd_tdb``; ``step_d`` None for a fortieth of the span."""

    as_of: float
    start: float | None = None
    end: float | None = None
    step_d: float | None = None
    solution: str | None = None
    overrides: WindOverrides = field(default_factory=WindOverrides)
    draws: int = DEFAULT_DRAWS
    seed: int = DEFAULT_SEED


def ask(
    campaign: Campaign,
    *,
    now: datetime,
    as_of: TypedInstant | None,
    start: TypedInstant | None,
    end: TypedInstant | None,
    step_d: float | None,
    solution: str | None,
    overrides: WindOverrides,
    draws: int | None,
    seed: int | None,
) -> WindsQuestion:
    """Put the question on the catalogue's axis of time.

    Parameters
    ----------
    campaign : Campaign
        Its own date stands in for the clock, if it has one.
    now : datetime
        The clock.
    as_of, start, end : TypedInstant or None
        As typed.
    step_d : float or None
        Days.
    solution : str or None
        Label; the adopted one when not given.
    overrides : WindOverrides
        What stands in for the catalogue.
    draws, seed : int or None
        Of the random draws.

    Returns
    -------
    WindsQuestion
        Instants ``bmjd_tdb``.

    Notes
    -----
    Accuracy: see ``campaign.studies.instants.axis_instant``. Source: project convention.
    """
    if as_of is not None:
        today = axis_instant(as_of)
    else:
        today = campaign.own_as_of if campaign.own_as_of is not None else mjd_of(now)
    return WindsQuestion(
        today,
        None if start is None else axis_instant(start),
        None if end is None else axis_instant(end),
        step_d,
        solution,
        overrides,
        draws or DEFAULT_DRAWS,
        DEFAULT_SEED if seed is None else seed,
    )


def winds(record: SystemRecord, question: WindsQuestion) -> WindsResult:
    """The wind collision of one system, with the errors of everything it follows from.

    Parameters
    ----------
    record : SystemRecord
        The system: mass loss in Msun/yr, wind speed in km/s, radius in Rsun, and its solutions.
    question : WindsQuestion
        Instants ``bmjd_tdb``, and what stands in for the catalogue.

    Returns
    -------
    WindsResult
        Units in the names; None where the inputs do not give a quantity, with a note on what is missing.

    Raises
    ------
    Conflict
        If the momentum ratio follows from nothing.
    NotFound
        If there is no solution of the label.
    InputRefused
        If the span or the step cannot be used, or a value is zero or negative.

    Notes
    -----
    Accuracy: 20,000 seeded draws, about 1 % of each error; published formulas, whose own limits are larger.

    Source: Stevens, Blondin & Pollock 1992, ApJ 386, 265; Canto, Raga & Wilkin 1996, ApJ 469, 729; and the
    forms named in the result.
    """
    solution = _solution(record, question)
    inputs = gather(record, solution, question.overrides)
    of = Propagation(inputs, question.draws, question.seed)
    momenta = inputs.momentum_needs()
    found = of.many(
        lambda d: {
            "eta": d.eta,
            "weaker": windmomentum.stagnation_fractions(d.eta)[0],
            "stronger": windmomentum.stagnation_fractions(d.eta)[1],
            "opening": np.degrees(d.opening_rad),
            "shocks": np.degrees(d.shock_opening_rad),
        },
        {name: momenta for name in ("eta", "weaker", "stronger", "opening")}
        | {"shocks": flare_needs(inputs)},
    )
    eta = found["eta"][0]
    span = _span(inputs, question)
    dated = None if span is None else of.thinned(max(_LEAST_DRAWS, _TABLE_DRAWS // span.size))
    skew = _skew_deg(inputs, of)
    swap = None if eta.unknown_errors else float(np.mean(of.all.eta > 1.0))
    told_winds, told_forms = winds_of_stars(of), forms(of)
    told_cooling, told_sight = coolings(of), line_of_sight(of)
    told_events = () if span is None else events(of, float(span[0]), float(span[-1]))
    rows = () if span is None or dated is None else table(dated, span)
    name = None if inputs.solution is None else inputs.solution.label
    return WindsResult(
        record.system.name,
        name,
        utc_iso(np.array([question.as_of]))[0] or "",
        inputs.stronger,
        inputs.weaker,
        inputs.weaker == "A",
        swap,
        eta,
        found["weaker"][0],
        found["stronger"][0],
        found["opening"][0],
        found["shocks"][0],
        told_winds,
        told_forms,
        surface(eta),
        told_cooling,
        told_sight,
        skew[0],
        skew[1],
        profile(of),
        told_events,
        rows,
        told_inputs(inputs, of.used),
        question.draws,
        question.seed,
        tuple(assumptions(record, inputs, of, dated, skew)),
        tuple(warnings(inputs, of, swap)),
    )


def _solution(record: SystemRecord, question: WindsQuestion) -> Solution | None:
    """The solution asked for or adopted; none is needed for what does not depend on the orbit."""
    if question.solution is None and not any(each.adopted for each in record.solutions):
        return None
    return require_solution(record, question.solution)


def _span(inputs: WindInputs, question: WindsQuestion) -> FloatArray | None:
    """Instants of the table; None where nothing can be dated."""
    if not inputs.has_dates:
        return None
    period = inputs.measured("period_d").value
    start = question.as_of if question.start is None else question.start
    end = question.end if question.end is not None else start + period
    if end < start:
        raise InputRefused(
            "The table ends before it begins.",
            why="--until is earlier than --from (or than now, when --from is not given).",
            hint="Swap them, for example --from 2030-01-01 --until 2032-01-01.",
            code="span-refused",
        )
    step = question.step_d if question.step_d is not None else max((end - start) / DEFAULT_ROWS, 1e-6)
    if not step > 0.0:
        raise InputRefused(
            "The step of the table is not positive.",
            why=f"A table cannot advance by {step:g} d.",
            hint="Give a step such as --step 30d.",
            code="step-refused",
        )
    if (end - start) / step > MOST_ROWS:
        raise InputRefused(
            f"The table would have more than {MOST_ROWS} rows.",
            why="Each row is drawn thousands of times to know its errors.",
            hint="Choose a longer --step or a shorter span.",
            code="span-refused",
        )
    times: FloatArray = start + step * np.arange(int(np.floor((end - start) / step + 1e-9)) + 1.0)
    return times


def _skew_deg(inputs: WindInputs, of: Propagation) -> tuple[float | None, float | None]:
    """Nominal turn of the cone by the orbital motion at periastron and apastron, by the slower wind."""
    speeds = [inputs.values[n].value for n in ("wind_speed_kms_a", "wind_speed_kms_b") if n in inputs.values]
    if not (speeds and inputs.size and inputs.has("eccentricity", "period_d")):
        return None, None
    d = of.nominal
    angles = skew_rad(
        float(d.input("period_d")[0]),
        float(d.input("eccentricity")[0]),
        float(d.a_au[0]),
        np.array([0.0, np.pi]),
        min(speeds),
    )
    near, far = (float(x) for x in np.degrees(angles))
    return near, far
