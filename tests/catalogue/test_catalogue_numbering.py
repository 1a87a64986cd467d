"""A row's number is never given to another row, so that the journal speaks of one entry only.

That a key of SQLite may be given again once the newest row is gone: its manual, "ROWIDs and the INTEGER
PRIMARY KEY", memory.
"""

from __future__ import annotations

from campaign.catalogue import lifecycle, systems
from campaign.catalogue.tables import changes, metadata, operations, stars
from campaign.model.systems import Star, System


def test_the_number_of_a_row_that_is_gone_is_not_given_again(write):
    with write() as writing:
        system_id = systems.add_system(writing, System(0, "Dim", 10.0, 20.0, star_a=Star("A", "WC7")))
        first = writing.insert(stars, {"system_id": system_id, "star": "B"})
        writing.delete(stars, first)
        assert writing.insert(stars, {"system_id": system_id, "star": "B"}) == first + 1
        writing.delete(stars, first + 1)
    with write() as writing:
        assert writing.insert(stars, {"system_id": system_id, "star": "B"}) == first + 2


def test_a_number_that_was_asked_for_is_given(write):
    with write() as writing:
        system_id = systems.add_system(writing, System(0, "Dim", 10.0, 20.0, star_a=Star("A", "WC7")))
        writing.delete(stars, 1)
        assert writing.insert(stars, {"id": 1, "system_id": system_id, "star": "A"}) == 1
        assert writing.insert(stars, {"system_id": system_id, "star": "B"}) == 2


def test_every_table_that_may_lose_a_row_is_known():
    """What is neither marked as out of use nor lasting is removed when it is taken back."""
    kept = lifecycle.MARKER_OF.keys() | lifecycle.LASTING | {operations.name, changes.name}
    assert metadata.tables.keys() - kept <= lifecycle.LOSING_ROWS
    referred = {
        target.name for table in metadata.tables.values() for _, target in lifecycle.references(table)
    }
    assert not referred & lifecycle.LOSING_ROWS
