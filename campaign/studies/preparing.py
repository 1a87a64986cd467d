"""Which solution speaks for a system, with what weight, and what is known of its episodes and light curve."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field, replace

from campaign.model.arrays import PhotometryArrays
from campaign.model.forecasts import EVENT_NAMES, EventName
from campaign.model.records import SystemRecord
from campaign.model.systems import DatedEvent as DatedEpisodeEvent
from campaign.model.systems import DustRule, Episode, Solution
from campaign.studies.cycles import nominal_period_d, with_cycles
from campaign.studies.forecast import ForecastUnit
from campaign.studies.judging import judge
from campaign.studies.learned import LearnedDates, learn
from campaign.studies.quietness import JudgedPhotometry
from campaign.studies.rows import NO_RULE, ForecastRow, build_row
from campaign.studies.sampling import DEFAULT_DRAWS, DEFAULT_SEED
from campaign.studies.summaries import Window


@dataclass(frozen=True, slots=True)
class Question:
    """What is asked of the forecaster; instants are ``bmjd_tdb``.

    ``solutions`` is 'adopted' for one forecast a system (a mixture where solutions carry weights) or
    'each' for every solution side by side. ``resolution_arcsec`` is what an image resolves, for the event
    'resolvable', which has no date without it.
    """

    as_of: float
    start: float
    end: float
    events: tuple[EventName, ...] = EVENT_NAMES
    min_probability: float = 0.0
    draws: int = DEFAULT_DRAWS
    seed: int = DEFAULT_SEED
    solutions: str = "adopted"
    resolution_arcsec: float | None = None

    @property
    def window(self) -> Window:
        return Window(self.start, self.end, self.as_of)


@dataclass(slots=True)
class Prepared:
    """Rows and units of a campaign, ready to be forecast."""

    rows: list[ForecastRow]
    units: list[ForecastUnit]
    learned: dict[int, LearnedDates]
    judged: dict[int, JudgedPhotometry] = field(default_factory=dict)

    def system_id(self, unit: int) -> int:
        return self.rows[self.units[unit].rows[0]].record.system.id

    def judge(
        self, unit: int, photometry: Mapping[int, PhotometryArrays], as_of: float
    ) -> JudgedPhotometry | None:
        """Verdicts on the light curve of a unit's system up to ``as_of``, made once; None without any."""
        record = self.rows[self.units[unit].rows[0]].record
        number = record.system.id
        if number not in self.judged:
            arrays = photometry.get(number)
            if arrays is None or not arrays.bmjd_tdb.size:
                return None
            self.judged[number] = judge(record, arrays, as_of)
        return self.judged[number]


def prepare(
    records: Sequence[SystemRecord], photometry: Mapping[int, PhotometryArrays], question: Question
) -> Prepared:
    """Turn records into rows and units: which solution speaks for a system, and with what weight.

    Parameters
    ----------
    records : sequence of SystemRecord
        Active systems.
    photometry : mapping of int to PhotometryArrays
        Light curves by system id.
    question : Question
        Only ``as_of`` (``bmjd_tdb``) and ``solutions`` are used.

    Returns
    -------
    Prepared
        Rows, units and learned dates.

    Notes
    -----
    Accuracy: no numbers are changed.

    Source: DEVELOPERS.md (solution, rule) and 4 (Forecast).
    """
    prepared = Prepared([], [], {})
    for whole in records:
        record, before = hide_later_episodes(whole, question.as_of), len(prepared.rows)
        for solutions, weights in _speakers(record, question.solutions):
            rows = tuple(_add_row(prepared, record, solution) for solution in solutions)
            first = prepared.rows[rows[0]]
            unit = ForecastUnit(
                rows=rows,
                weights=weights,
                label=" + ".join(s.label for s in solutions if s is not None) or None,
                episodes=episodes_with_cycles(first),
                watched=record.system.id in photometry,
            )
            prepared.units.append(unit)
        _count_conjunctions_alike(prepared.rows[before:])
    return prepared


def _count_conjunctions_alike(rows: Sequence[ForecastRow]) -> None:
    """A conjunction near apastron lies half a period from two periastra: one solution decides for all."""
    known = [row.values["omega_b_deg"][0] for row in rows if "omega_b_deg" in row.values]
    for row in rows:
        row.omega_reference_deg = known[0] if known else None


def hide_later_episodes(record: SystemRecord, as_of: float) -> SystemRecord:
    """The record without what had not happened at ``as_of`` (``bmjd_tdb``).

    Parameters
    ----------
    record : SystemRecord
        A system.
    as_of : float
        ``bmjd_tdb``.

    Returns
    -------
    SystemRecord
        Later episodes, maxima and ends removed.

    Notes
    -----
    Accuracy: by the dated instants themselves.

    Source: DEVELOPERS.md (As of).
    """
    kept = []
    for episode in record.episodes:
        cut = replace(
            episode,
            onset=_if_past(episode.onset, as_of),
            maximum=_if_past(episode.maximum, as_of),
            end=_if_past(episode.end, as_of),
        )
        if cut.onset or cut.maximum or cut.end:
            kept.append(cut)
    return replace(record, episodes=tuple(kept)) if kept or record.episodes else record


def _if_past(dated: DatedEpisodeEvent | None, as_of: float) -> DatedEpisodeEvent | None:
    return dated if dated is not None and dated.moment.bmjd_tdb <= as_of else None


def _speakers(record: SystemRecord, mode: str) -> list[tuple[tuple[Solution | None, ...], tuple[float, ...]]]:
    """Groups of solutions that are forecast together, with their weights."""
    adopted = [s for s in record.solutions if s.adopted]
    weighted = [s for s in adopted if s.weight is not None]
    groups: list[tuple[tuple[Solution | None, ...], tuple[float, ...]]] = []
    if len(weighted) > 1:
        total = sum(s.weight or 0.0 for s in weighted)
        groups.append((tuple(weighted), tuple((s.weight or 0.0) / total for s in weighted)))
    if mode == "each" and record.solutions:
        singles = sorted(record.solutions, key=lambda s: not s.adopted)
        return groups + [((s,), (1.0,)) for s in singles]
    return groups or [((adopted[0] if adopted else None,), (1.0,))]


def _add_row(prepared: Prepared, record: SystemRecord, solution: Solution | None) -> int:
    row = build_row(record, solution)
    position = len(prepared.rows)
    has_dates = "epoch" in row.values and "period_d" in row.values
    rule_learns = row.rule is not None and row.rule.kind == "learned"
    if (rule_learns or not has_dates) and record.episodes:
        learned = learn(row, episodes_with_cycles(row))
        if learned is not None:
            prepared.learned[position] = learned
            for event in learned.events():
                row.events[event] = ()
            row.notes.extend(learned.notes)
            if row.rule is None or row.rule.kind != "learned":
                row.rule = DustRule(id=0, system_id=record.system.id, kind="learned")
                row.notes = [n for n in row.notes if not n.startswith(NO_RULE)]
            if learned.predict(learned.events()[0], 0).prior_used:
                row.assumptions.append(
                    "few well dated episodes: cycle-to-cycle scatter from the stated prior, 1 % of the "
                    "period within a factor of e"
                )
    prepared.rows.append(row)
    return position


def episodes_with_cycles(row: ForecastRow) -> tuple[Episode, ...]:
    """Confirmed episodes of a row's system, each with the cycle it belongs to by the row's solution.

    Parameters
    ----------
    row : ForecastRow
        A system with one solution, or none.

    Returns
    -------
    tuple of Episode
        Oldest first; cycles are dimensionless counts.

    Notes
    -----
    Accuracy: see ``campaign.studies.cycles.with_cycles``. Source: project convention.
    """
    period = nominal_period_d(row.solution) if row.solution is not None else None
    predicted = []
    if row.solution is not None and "epoch" in row.values and period is not None:
        predicted.append((row.epoch_cycle, row.values["epoch"][0] + _onset_shift_d(row, period)))
    return with_cycles(row.record, predicted, period)


def _onset_shift_d(row: ForecastRow, period_d: float) -> float:
    """Nominal onset relative to periastron, only to count cycles with."""
    rule = row.rule
    if rule is None or rule.onset is None:
        return 0.0
    return rule.onset.value * (period_d if rule.kind == "phase" else 1.0)
