"""Kept forecasts come back to the last bit, belong to one operation, and go and return with it."""

from __future__ import annotations

import pytest
from catalogue_examples import FIRST, full_episode, full_rule, full_solution, full_system, later

from campaign.catalogue import episodes, keepings, rules, solutions, store, systems
from campaign.errors import Conflict, DatabaseUnusable, NotFound
from campaign.model.forecasts import EventForecast, Quantiles
from campaign.model.verification import (
    ForecastInputs,
    Keeping,
    KeptForecast,
    UsedEpisode,
    UsedPhotometry,
    UsedRule,
    UsedSolution,
)


def keeping(label=None):
    return Keeping(0, label, 60_000.1, 60_000.1, 61_826.35, FIRST, later(3), 20_000, 7, "0.1")


def forecast(system_id, event="onset", **fields):
    told = EventForecast(
        system="Lantern 3", event=event, cycle=4, basis="orbit", solution="Orrery 2029 + Sextant 2030",
        rule="lag", bmjd_tdb=Quantiles(61_234.1, 0.1 + 0.2, 61_233.0, 61_235.0, 61_232.0, 61_236.0), utc=None,
        status="expected", probability=2.0 / 3.0, probability_in_window=None, notes=("a note",),
        disagreement_sigma=-1.5,
    )  # fmt: skip
    inputs = ForecastInputs(
        (
            UsedSolution(3, "Orrery 2029", 0.7, None, FIRST),
            UsedSolution(4, "Sextant 2030", 0.3, 59_000.25, None),
        ),
        UsedRule(5, "lag", FIRST),
        (UsedEpisode(6, 2, 55_000.0, None, 55_100.0, later(1)),),
        UsedPhotometry(3, 59_999.9, later(2)),
    )
    values = dict(
        id=0, keeping_id=0, system_id=system_id, event=told,
        quantiles_bmjd_tdb=tuple(61_234.0 + 0.1 * n / 3.0 for n in range(101)),
        reference_bmjd_tdb=61_111.0 + 1.0 / 3.0, reference_sigma_d=4.0, inputs=inputs,
    )  # fmt: skip
    return KeptForecast(**(values | fields))


@pytest.fixture
def system_id(write):
    with write() as writing:
        return systems.add_system(writing, full_system("Lantern 3"))


def test_a_kept_forecast_comes_back_to_the_last_bit(database, write, system_id):
    empty = KeptForecast(
        0, 0, system_id,
        EventForecast("Lantern 3", "end", None, "episodes", None, None, None, None, "phase lost", None, 0.2,
                      phase_lost=True, probability_per_yr=0.1, observed=True),
        (), None, None, ForecastInputs(),
    )  # fmt: skip
    with write(later(3)) as writing:
        number = keepings.add_keeping(writing, keeping("spring  2031"), [forecast(system_id), empty])
    with store.reading(database) as connection:
        (one,) = keepings.list_keepings(connection)
        found = keepings.load_kept(connection, [number])
        counts = keepings.count_kept(connection)
    assert (one.id, one.label) == (number, "spring 2031")
    assert one.known_at == FIRST and one.kept_at == later(3)
    assert (one.as_of_bmjd_tdb, one.until_bmjd_tdb, one.draws, one.seed) == (60_000.1, 61_826.35, 20_000, 7)
    assert counts == {number: (2, 1, 1)}
    for made, kept in zip([forecast(system_id), empty], found, strict=True):
        assert kept.event == made.event
        assert kept.quantiles_bmjd_tdb == made.quantiles_bmjd_tdb
        assert kept.inputs == made.inputs
        assert (kept.reference_bmjd_tdb, kept.reference_sigma_d) == (
            made.reference_bmjd_tdb, made.reference_sigma_d,
        )  # fmt: skip
        assert (kept.keeping_id, kept.system_id) == (number, system_id)


def test_a_label_stands_for_one_keeping(database, write, system_id):
    with write() as writing:
        first = keepings.add_keeping(writing, keeping("Spring 2031"), [forecast(system_id)])
        keepings.add_keeping(writing, keeping(), [forecast(system_id)])
        keepings.add_keeping(writing, keeping(), [forecast(system_id)])
    with write() as writing, pytest.raises(Conflict) as refused:
        keepings.add_keeping(writing, keeping("spring2031"), [forecast(system_id)])
    assert refused.value.code == "label-taken"
    assert "Spring 2031" in str(refused.value)
    with store.reading(database) as connection:
        assert keepings.find_keeping(connection, "SPRING 2031").id == first
        assert keepings.find_keeping(connection, str(first)).id == first
        with pytest.raises(NotFound) as missing:
            keepings.find_keeping(connection, "Spring 2030")
        assert missing.value.details["nearest"] == ["Spring 2031"]


def test_times_of_entry_are_those_of_the_entries(database, write, system_id):
    with write(later(1)) as writing:
        solution = solutions.add_solution(writing, full_solution(system_id))
        rule = rules.set_rule(writing, full_rule(system_id))
    with write(later(2)) as writing:
        episode = episodes.add_episode(writing, full_episode(system_id))
    with store.reading(database) as connection:
        assert keepings.entry_times(connection, [solution], [rule, 999], [episode]) == (
            {solution: later(1)}, {rule: later(1)}, {episode: later(2)},
        )  # fmt: skip


def test_what_cannot_be_read_back_is_said_to_be_unreadable(database, write, system_id):
    import sqlite3

    with write() as writing:
        keepings.add_keeping(writing, keeping(), [forecast(system_id)])
    raw = sqlite3.connect(database)
    raw.execute("UPDATE kept_forecasts SET inputs = '{\"rule\": 3}'")
    raw.commit()
    raw.close()
    with store.reading(database) as connection, pytest.raises(DatabaseUnusable):
        keepings.load_kept(connection)
