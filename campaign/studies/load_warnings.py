"""What an observer would want to know of a table before it goes in."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray
from sqlalchemy import Connection

from campaign.catalogue.observations import band_uses
from campaign.model.bands import BandUse
from campaign.model.columns import ObservationColumns
from campaign.model.loading import LoadWarning
from campaign.model.systems import Site, System
from campaign.physics.lighttime import heliocentric_light_time_d
from campaign.physics.sun import sun_altitude_deg
from campaign.reading.columntimes import PLACES
from campaign.studies.bands import band_warnings, mixed_bands
from campaign.studies.load_alike import differing_in_value
from campaign.studies.load_known import LIGHT_TIME_D, KnownCheck
from campaign.studies.load_names import NameIndex, alias_warnings, comment_warning
from campaign.studies.load_outliers import outlying
from campaign.studies.load_rows import CheckedRows

Mask = NDArray[np.bool_]

_MOST_LINES = 5
_MOST_MIXED = 5
_MOST_NAMES = 5
# A time is known well enough to ask where the Sun was.
_SHARP_D = 0.02
_SOON_D = 0.02
# 1900-01-01: counts of days from another origin than was understood mostly fall before it.
_LONG_AGO_MJD = 15_020.0
# Light time moves an instant by up to 8.3 min, in which the Sun moves 2 deg.
_MOVED_DEG = 2.5
_FEWEST_SHIFTED = 5
# Above these an error says nothing, or is in another unit (common practice, no source).
_LARGEST_ERROR = {"photometry": 1.0, "velocity": 500.0, "line": 1000.0}
_SMALLEST_ERROR = {"photometry": 2e-4}
_RELATIVE = ("flux", "position", "shell")


def load_warnings(
    connection: Connection,
    rows: CheckedRows,
    columns: ObservationColumns,
    check: KnownCheck,
    systems: Sequence[System],
    sites: Sequence[Site],
    names: NameIndex,
    now_mjd: float,
) -> tuple[LoadWarning, ...]:
    """What is unlikely, unusual or missing in good rows; rows that are known already do not count.

    Parameters
    ----------
    connection
        To the catalogue.
    rows, columns
        The same rows twice: as checked, and as columns (``bmjd_tdb`` in days, values in their unit).
    check
        What the catalogue says to them.
    systems, sites
        Those that the rows refer to by place; deg and m.
    names
        Which systems were called by an alias.
    now_mjd
        The present, MJD in UTC.

    Returns
    -------
    tuple of LoadWarning
        With the numbers of rows and the first lines.

    Notes
    -----
    Accuracy: the height of the Sun within 3 deg for times that are not counted on the Earth; neighbours as
    in ``campaign.studies.load_outliers``.

    Source: project convention.
    """
    fresh = ~(check.known | check.repeated)
    told = _Told(rows, fresh)
    told.found += comment_warning(rows.passed_over)
    told.add(
        "repeated",
        check.repeated,
        "{rows} stand{s} more than once in the table; each goes in once",
        fresh_only=False,
    )
    withdrawn = np.zeros(rows.size, dtype=np.bool_)
    withdrawn[check.withdrawn] = True
    told.add("withdrawn-before", withdrawn, "{rows} {are} the same as what was withdrawn before")
    told.add(
        "differing-in-table",
        differing_in_value(rows, columns),
        "{rows} {are} of the same system, time, band and site as another of the table, with another value",
    )
    told.add("future", _future(columns, now_mjd), "{rows} {are} dated in the future")
    told.add("long-ago", columns.numbers["bmjd_tdb"] < _LONG_AGO_MJD, "{rows} {are} dated before 1900")
    told.add("daylight", _daylight(rows, columns, sites), "at {rows} the Sun was up at the site")
    told.add(
        "no-site",
        _without_site(rows, columns),
        "{rows} name{s} no site: the light time is that of the geocentre, within 0.021 s",
    )
    told.add(
        "implausible-error",
        _implausible(columns),
        "the error{plural} of {rows} {are} implausible (zero, or too large or small for {kind})",
    )
    if columns.same["kind"] == "photometry":
        far = outlying(rows, columns, check)
        told.add(
            "outlier", far, "the magnitude{plural} of {rows} {are} 5 sigma and more from {their} neighbours"
        )
        told.found += _bands(connection, rows, columns, fresh, systems)
    told.found += _shifted(rows, columns, check, systems)
    told.found += alias_warnings(names, systems)
    return tuple(told.found)


class _Told:
    """Warnings as they are found."""

    def __init__(self, rows: CheckedRows, fresh: Mask) -> None:
        self.found: list[LoadWarning] = []
        self._rows = rows
        self._fresh = fresh

    def add(self, code: str, concerned: Mask, text: str, *, fresh_only: bool = True) -> None:
        """Warn of the rows concerned, if there are any."""
        places = np.flatnonzero(concerned & self._fresh if fresh_only else concerned)
        if not places.size:
            return
        one = places.size == 1
        said = text.format(
            rows="1 row" if one else f"{places.size:,} rows",
            are="is" if one else "are",
            s="s" if one else "",
            plural="" if one else "s",
            their="its" if one else "their",
            kind=self._rows.same["kind"],
        )
        lines = np.unique(self._rows.line[places])
        first = tuple(lines[:_MOST_LINES].tolist())
        self.found.append(LoadWarning(code, said, int(places.size), first, len(lines) > _MOST_LINES))


def _future(columns: ObservationColumns, now_mjd: float) -> Mask:
    room = np.full(columns.size, _SOON_D)
    if "time_minus_d" in columns.numbers:
        room = np.fmax(room, 2.0 * columns.numbers["time_minus_d"])
    late: Mask = columns.numbers["bmjd_tdb"] - room > now_mjd
    return late


def _daylight(rows: CheckedRows, columns: ObservationColumns, sites: Sequence[Site]) -> Mask:
    grounds = [site.latitude_deg is not None and site.kind == "ground" for site in sites]
    on_ground: Mask = np.array([*grounds, False])[rows.site]
    if "time_minus_d" in columns.numbers:
        on_ground &= ~(columns.numbers["time_minus_d"] > _SHARP_D)
    if not on_ground.any():
        return on_ground
    some = np.flatnonzero(on_ground)
    at = rows.site[some]
    longitude = np.array([site.longitude_deg_east or 0.0 for site in sites])[at]
    latitude = np.array([site.latitude_deg or 0.0 for site in sites])[at]
    on_earth = np.isin(rows.place[some], [PLACES.index("observatory"), PLACES.index("geocentre")])
    time = np.where(on_earth, rows.day[some] + rows.fraction[some], columns.numbers["bmjd_tdb"][some])
    room = np.where(on_earth, 0.0, _MOVED_DEG)
    up: Mask = np.zeros(rows.size, dtype=np.bool_)
    up[some] = sun_altitude_deg(time, longitude, latitude) > room
    return up


def _without_site(rows: CheckedRows, columns: ObservationColumns) -> Mask:
    """Rows as observed from the Earth whose site would matter; a day or a night is wider than that."""
    without: Mask = (rows.place == PLACES.index("observatory")) & (rows.site < 0)
    if "time_minus_d" in columns.numbers:
        without &= ~(columns.numbers["time_minus_d"] > _SHARP_D)
    return without


def _implausible(columns: ObservationColumns) -> Mask:
    kind = str(columns.same["kind"])
    odd: Mask = np.zeros(columns.size, dtype=np.bool_)
    for side in ("value_minus", "value_plus"):
        error = columns.numbers.get(side)
        if error is None:
            continue
        odd |= error == 0.0
        odd |= error > _LARGEST_ERROR.get(kind, np.inf)
        odd |= error < _SMALLEST_ERROR.get(kind, 0.0)
        if kind in _RELATIVE:
            odd |= 0.5 * error > np.abs(columns.numbers["value"])
    return odd


def _bands(
    connection: Connection,
    rows: CheckedRows,
    columns: ObservationColumns,
    fresh: Mask,
    systems: Sequence[System],
) -> list[LoadWarning]:
    """Bands whose photometric system is not said, and those in which systems would be mixed."""
    uses = _uses(rows, columns, fresh, systems)
    found = []
    silent = sum(use.points for use in uses if use.photometric_system is None)
    if silent:
        bands = sorted({use.band for use in uses if use.photometric_system is None})
        shown = ", ".join(bands[:_MOST_NAMES]) + (", ..." if len(bands) > _MOST_NAMES else "")
        magnitudes = "1 magnitude" if silent == 1 else f"{silent:,} magnitudes"
        text = f"the photometric system of {magnitudes} in {shown} is not known"
        said = "; --constant photometric_system=... says it"
        found.append(LoadWarning("photometric-system-unknown", text + said, silent))
    ids = sorted({systems[place].id for place in np.unique(rows.system[fresh]).tolist()})
    together = [*band_uses(connection, ids), *uses]
    mixed = [each for each in mixed_bands(together) if len(each.photometric_systems) > 1]
    found += [LoadWarning("photometric-systems-mixed", text) for text in band_warnings(mixed, _MOST_MIXED)]
    return found


def _uses(
    rows: CheckedRows, columns: ObservationColumns, fresh: Mask, systems: Sequence[System]
) -> list[BandUse]:
    bands, band = _codes(columns, "band")
    own_systems, own = _codes(columns, "photometric_system")
    if not fresh.any():
        return []
    width = len(own_systems) + 1
    number = (rows.system.astype(np.int64) * (len(bands) + 1) + band + 1) * width + own + 1
    different, points = np.unique(number[fresh], return_counts=True)
    uses = []
    for code, count in zip(different.tolist(), points.tolist(), strict=True):
        (system, in_band), of_system = divmod(code // width, len(bands) + 1), code % width
        uses.append(
            BandUse(
                systems[system].name,
                bands[in_band - 1] if in_band else "",
                own_systems[of_system - 1] if of_system else None,
                count,
            )
        )
    return uses


def _codes(columns: ObservationColumns, name: str) -> tuple[Sequence[str], NDArray[np.int32]]:
    if name in columns.words:
        return columns.words[name].words, columns.words[name].codes
    word = columns.same.get(name)
    return ([] if word is None else [word]), np.full(columns.size, -1 if word is None else 0, dtype=np.int32)


def _shifted(
    rows: CheckedRows, columns: ObservationColumns, check: KnownCheck, systems: Sequence[System]
) -> list[LoadWarning]:
    """Whether rows are known ones with the light time to the Sun put in once more, or left out."""
    if len(check.shifted) < _FEWEST_SHIFTED:
        return []
    row = np.array([place for place, _ in check.shifted])
    later_d = np.array([shift for _, shift in check.shifted])
    direction = [systems[place] for place in rows.system[row].tolist()]
    light_d = heliocentric_light_time_d(
        columns.numbers["bmjd_tdb"][row],
        np.array([system.ra_deg for system in direction]),
        np.array([system.dec_deg for system in direction]),
    )
    spread = float(np.sqrt(np.mean(later_d**2)))
    told = {
        1.0: "they seem to be heliocentric already, though they are taken as observed from the Earth",
        -1.0: "they seem to be as observed from the Earth, though they are taken as heliocentric",
    }
    for sign, text in told.items():
        rest = float(np.sqrt(np.mean((later_d - sign * light_d) ** 2)))
        if rest < 0.2 * spread and spread < LIGHT_TIME_D:
            lines = sorted({int(rows.line[place]) for place in row.tolist()})
            said = (
                f"{len(row):,} rows are known observations but for a shift of their times that follows the "
                f"seasons as the light time to the Sun does (rms {spread * 86400.0:.0f} s, without it "
                f"{rest * 86400.0:.1f} s): {text}"
            )
            first, more = tuple(lines[:_MOST_LINES]), len(lines) > _MOST_LINES
            return [LoadWarning("light-time-seasonal", said, len(row), first, more)]
    return []
