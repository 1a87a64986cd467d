"""Source of the expectation: numpy's own order by several keys, which is stable."""

from __future__ import annotations

import numpy as np
from hypothesis import given
from hypothesis import strategies as st

from campaign.model.ordering import by_group_and_time

groups = st.sampled_from([-1, 0, 1, 7, 70_000])
times = st.sampled_from([-1.5, 0.0, 60_000.25, 60_000.5, 1e9]) | st.floats(0.0, 1e5)


@given(st.lists(st.tuples(groups, times), max_size=40))
def test_rows_stand_group_by_group_in_order_of_time_and_else_as_given(rows):
    group = np.array([group for group, _ in rows], dtype=np.int64)
    time = np.array([time for _, time in rows], dtype=np.float64)
    assert by_group_and_time(group, time).tolist() == np.lexsort((time, group)).tolist()
