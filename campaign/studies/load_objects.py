"""Observations as dataclasses, turned into columns."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from typing import Any

import numpy as np
from numpy.typing import NDArray

from campaign.model.columns import ObservationColumns, Words
from campaign.model.observations import Observation
from campaign.studies.load_rows import CheckedRows

_NUMBERS: dict[str, Callable[[Observation], float | None]] = {
    "time_minus_d": lambda each: each.moment.minus_d,
    "time_plus_d": lambda each: each.moment.plus_d,
    "value_minus": lambda each: None if each.value is None else each.value.minus,
    "value_plus": lambda each: None if each.value is None else each.value.plus,
    "limit_sigma": lambda each: each.limit_sigma,
    "frequency_ghz": lambda each: each.frequency_ghz,
    "energy_low_kev": lambda each: each.energy_low_kev,
    "energy_high_kev": lambda each: each.energy_high_kev,
    "position_angle_deg": lambda each: None if (pa := each.position_angle_deg) is None else pa.value,
    "position_angle_deg_minus": lambda each: None if (pa := each.position_angle_deg) is None else pa.minus,
    "position_angle_deg_plus": lambda each: None if (pa := each.position_angle_deg) is None else pa.plus,
    "correlation": lambda each: each.correlation,
    "plate_scale_error": lambda each: each.plate_scale_error,
}
_WORDS = (
    "limit_side", "band", "photometric_system", "star", "species", "feature", "measured_at", "observer",
    "instrument", "comparison_star", "source", "quality", "text",
)  # fmt: skip


def columns_of_objects(observations: Sequence[Observation]) -> ObservationColumns:
    """Observations with a value, all of one kind and unit, as columns.

    Parameters
    ----------
    observations : sequence of Observation
        With ``system_id`` and ``site_id``; instants ``bmjd_tdb`` in days.

    Returns
    -------
    ObservationColumns
        Row by row the same, to the last bit.

    Notes
    -----
    Accuracy: exact. Source: project convention.
    """
    first = observations[0]
    numbers = {
        "bmjd_tdb": np.array([each.moment.bmjd_tdb for each in observations], dtype=np.float64),
        "value": np.array([each.value and each.value.value for each in observations], dtype=np.float64),
    }
    for name, take in _NUMBERS.items():
        values = [take(each) for each in observations]
        if any(value is not None for value in values):
            numbers[name] = np.array(values, dtype=np.float64)
    words = {
        "time_scale": _words([each.moment.scale for each in observations]),
        "time_place": _words([each.moment.place for each in observations]),
    }
    for name in _WORDS:
        values_of = [getattr(each, name) for each in observations]
        if any(value is not None for value in values_of):
            words[name] = _words(values_of)
    return ObservationColumns(
        len(observations),
        {"kind": first.kind, "unit": first.unit},
        numbers,
        {
            "system_id": np.array([each.system_id for each in observations], dtype=np.int64),
            "site_id": _wholes([each.site_id for each in observations]),
            "shell_index": _wholes([each.shell_index for each in observations]),
        },
        words,
        {
            "time_text": [each.moment.text for each in observations],
            "uid": [each.uid for each in observations],
        },
    )


def _words(values: Sequence[str | None]) -> Words:
    place_of: dict[str, int] = {}
    codes = [-1 if value is None else place_of.setdefault(value, len(place_of)) for value in values]
    return Words(list(place_of), np.array(codes, dtype=np.int32))


def _wholes(values: Sequence[int | None]) -> NDArray[np.int64]:
    return np.array([-1 if value is None else value for value in values], dtype=np.int64)


def checked_objects(lines: Sequence[int], system_places: Sequence[int], same: dict[str, Any]) -> CheckedRows:
    """Rows that need no reading of columns: only where they stood and which systems they are of.

    Parameters
    ----------
    lines, system_places : sequence of int
        Line, and place of the system among those of the catalogue (dimensionless).
    same : dict
        What is alike in all rows.

    Returns
    -------
    CheckedRows
        Without instants (days) of their own.

    Notes
    -----
    Accuracy: exact. Source: project convention.
    """
    size = len(lines)
    nothing, small = np.zeros(size), np.zeros(size, dtype=np.int8)
    return CheckedRows(
        size,
        line=np.array(lines, dtype=np.int64),
        system=np.array(system_places, dtype=np.int32),
        site=np.full(size, -1, dtype=np.int32),
        day=nothing,
        fraction=nothing,
        scale=small,
        place=small,
        side=small,
        same=same,
        numbers={},
        words={},
        texts={},
    )
