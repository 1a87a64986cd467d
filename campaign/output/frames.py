"""Tables as DataFrames, with the units of their columns. pandas is imported only here, and only when used."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from campaign.model.exported import OutgoingTable

if TYPE_CHECKING:
    import pandas as pd

_DTYPES = {"text": "str", "word": "str", "number": "float64", "whole": "Int64", "truth": "boolean"}


def frame_of(table: OutgoingTable) -> pd.DataFrame:
    """All rows of a table as a DataFrame.

    Numbers are float64 with NaN for unknown, whole numbers Int64 and truths boolean with NA, texts ``str``
    with NaN. ``attrs`` holds ``kind``, ``units`` and ``descriptions`` by column, and ``time``: the scale
    and place of the instants.
    """
    import pandas as pd

    columns: list[tuple[Any, ...]] = list(zip(*table.rows, strict=True)) or [() for _ in table.columns]
    frame = pd.DataFrame(
        {
            column.name: _array(cells, column.type)
            for column, cells in zip(table.columns, columns, strict=True)
        }
    )
    frame.attrs["kind"] = table.kind
    units = {column.name: table.unit_of(column) for column in table.columns}
    frame.attrs["units"] = {name: unit for name, unit in units.items() if unit is not None}
    frame.attrs["descriptions"] = {column.name: column.text for column in table.columns}
    frame.attrs["time"] = {
        "scale": "TDB",
        "place": "barycentre",
        "origin": "MJD",
        "columns": table.axis_columns,
    }
    return frame


def _array(cells: tuple[Any, ...], kind: str) -> Any:
    """One column; an empty text is as unknown as one that was never given."""
    import pandas as pd

    if kind == "number":
        return pd.Series(cells, dtype="float64").to_numpy()
    if cells and not any(cells) and set(cells) <= {None, ""}:
        # Most columns of a light curve are empty from end to end.
        return pd.array([None], dtype=_DTYPES[kind]).repeat(len(cells))
    return pd.array([None if cell == "" else cell for cell in cells], dtype=_DTYPES[kind])
