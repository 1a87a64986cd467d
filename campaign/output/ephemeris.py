"""The dated table of one system, on the screen and as a JSON document."""

from __future__ import annotations

from campaign.model.forecasts import EphemerisResult, EphemerisRow
from campaign.output.console import Screen
from campaign.output.documents import document, plain
from campaign.output.tables import Column, print_table
from campaign.output.wording import UTC_NOTE

_COLUMNS = (
    Column("UTC"),
    Column("MJD TDB", align="right", drop=9),
    Column("cycle", align="right", drop=7),
    Column("phase", align="right"),
    Column("anomaly°", align="right", drop=5, name="true anomaly"),
    Column("r au", align="right", drop=3, name="separation in au"),
    Column("r mas", align="right", drop=4, name="separation in mas"),
    Column("sky mas", align="right", drop=1, name="projected separation"),
    Column("PA°", align="right", drop=2, name="position angle"),
    Column("vA km/s", align="right", drop=6, name="velocity of A"),
    Column("vB km/s", align="right", drop=6, name="velocity of B"),
)


def render_ephemeris(screen: Screen, result: EphemerisResult) -> None:
    """Write the table with its notes."""
    screen.heading(f"Ephemeris of {result.system} from {result.solution}")
    screen.line("")
    empty = [
        i for i in range(len(_COLUMNS)) if result.rows and all(not _cells(row)[i] for row in result.rows)
    ]
    kept = [i for i in range(len(_COLUMNS)) if i not in empty]
    rows = [[cells[i] for i in kept] for cells in map(_cells, result.rows)]
    print_table(screen, [_COLUMNS[i] for i in kept], rows)
    if empty:
        names = ", ".join(_COLUMNS[i].name or _COLUMNS[i].heading for i in empty)
        screen.wrapped(f"Not given by the elements: {names}.", style="dim")
    screen.line("")
    for warning in result.warnings:
        screen.wrapped(warning, label="- Warning: ", hang=2, style="bold yellow")
    for line in (*result.assumptions, UTC_NOTE):
        screen.wrapped(line, label="- ", hang=2)


def _cells(row: EphemerisRow) -> tuple[str, ...]:
    return (
        _instant(row),
        f"{row.bmjd_tdb:.4f}",
        str(row.cycle),
        f"{row.phase:.5f}",
        _number(row.true_anomaly_deg, 2),
        _number(row.separation_au, 3),
        _number(row.separation_mas, 2),
        _number(row.projected_separation_mas, 2),
        _number(row.position_angle_deg, 1),
        _number(row.velocity_a_kms, 2),
        _number(row.velocity_b_kms, 2),
    )


def _instant(row: EphemerisRow) -> str:
    if row.utc is None:
        return f"MJD {row.bmjd_tdb:.2f}"
    date, _, clock = row.utc.partition("T")
    return f"{date} {clock[:5]}".rstrip()


def _number(value: float | None, places: int) -> str:
    return "" if value is None else f"{value:.{places}f}".replace("-", "−")


def ephemeris_json(result: EphemerisResult) -> str:
    """The whole document ``campaign/ephemeris/1``."""
    data = {
        "system": result.system,
        "solution": result.solution,
        "rows": plain(result.rows),
        "assumptions": [*result.assumptions, UTC_NOTE],
    }
    return document("ephemeris", data, as_of=result.as_of_utc, warnings=result.warnings)
