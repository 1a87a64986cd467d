"""From an instant as typed to the catalogue's axis: MJD in TDB at the solar-system barycentre."""

from __future__ import annotations

from datetime import datetime

import numpy as np

from campaign.errors import InputRefused
from campaign.model.instants import Moment, TypedInstant
from campaign.model.systems import Site, System
from campaign.physics.lighttime import to_barycentre
from campaign.physics.timescales import to_tdb, utc_iso


def moment_of(typed: TypedInstant, system: System, site: Site | None = None) -> Moment:
    """Put an instant on the catalogue's axis, with light time from where it was seen.

    Parameters
    ----------
    typed : TypedInstant
        Instant in its own scale and at its own place.
    system : System
        Direction, ICRS deg.
    site : Site, optional
        Where it was observed; the geocentre stands in for an unknown site (at most 21 ms).

    Returns
    -------
    Moment
        ``bmjd_tdb`` with the errors as typed, days.

    Notes
    -----
    Accuracy: 0.02 s between 1900 and 2100 with the site known; proper motion is left out (under 1 s for
    any system here).

    Source: Eastman, Siverd & Gaudi 2010, PASP 122, 935; erfa.epv00.
    """
    place = typed.place
    geodetic = None
    if place == "observatory":
        if site is not None and site.kind == "ground" and site.latitude_deg is not None:
            geodetic = (site.longitude_deg_east or 0.0, site.latitude_deg, site.height_m or 0.0)
        else:
            place = "geocentre"
    bmjd = to_barycentre(
        typed.mjd_day, typed.mjd_fraction, typed.scale, place, system.ra_deg, system.dec_deg, geodetic
    )
    return Moment(float(bmjd), typed.minus_d, typed.plus_d, typed.text, typed.scale, typed.place)


_MINUTE_D = 1.0 / 1440.0
_TENTH_OF_A_SECOND_D = 0.1 / 86_400.0
_MJD_OF_UNIX_EPOCH = 40_587.0


def mjd_of_clock(at: datetime) -> float:
    """A clock reading as MJD, to tell what lies in the future.

    Parameters
    ----------
    at : datetime
        Aware datetime.

    Returns
    -------
    float
        MJD in UTC.

    Notes
    -----
    Accuracy: 1 s, without the leap seconds of the time scales. Source: definition of the MJD.
    """
    return _MJD_OF_UNIX_EPOCH + at.timestamp() / 86_400.0


def axis_instant(typed: TypedInstant) -> float:
    """An instant that belongs to no system (``--as-of``, ``--from``) on the TDB axis, no light time.

    Parameters
    ----------
    typed : TypedInstant
        Instant in its own scale.

    Returns
    -------
    float
        MJD in TDB.

    Notes
    -----
    Accuracy: up to 8.4 min from the barycentric instant of any one system.

    Source: time scales of IAU, through erfa.
    """
    day, fraction = to_tdb(typed.mjd_day, typed.mjd_fraction, typed.scale)
    return float(day) + float(fraction)


def refuse_reversed(since: TypedInstant | None, until: TypedInstant | None) -> None:
    """Refuse dates between which nothing can lie; a day, month or year counts from its start to its end.

    Parameters
    ----------
    since, until : TypedInstant or None
        As asked; None is open.

    Raises
    ------
    InputRefused
        ``span-refused``.

    Notes
    -----
    Accuracy: 0.1 s. Source: project convention.
    """
    if since is None or until is None:
        return
    first = axis_instant(since) - 0.5 * since.width_d
    last = axis_instant(until) + 0.5 * until.width_d
    # A year and the one before it share an instant, though no time.
    shared_d = _TENTH_OF_A_SECOND_D if since.width_d or until.width_d else 0.0
    if last < first + shared_d:
        raise InputRefused(
            "The dates end before they begin.",
            why="--until lies before --from, so that nothing can be in between.",
            hint="For example --from 2030 --until 2031-06.",
            code="span-refused",
        )


def spoken_moment(moment: Moment) -> str:
    """The catalogue's instant for an echo: ``BMJD_TDB 65121.133900 ± 5 d (2037-03-04T03:12:10Z ...)``.

    Parameters
    ----------
    moment : Moment
        ``bmjd_tdb``, days.

    Returns
    -------
    str
        One phrase.

    Notes
    -----
    Accuracy: printed to 0.1 s.

    Source: project convention.
    """
    iso = utc_iso(np.array([moment.bmjd_tdb]))[0]
    minus, plus = moment.minus_d or 0.0, moment.plus_d or 0.0
    error = ""
    if max(minus, plus) > _MINUTE_D:
        below, above = (f"{size:.2g}" if size < 99.5 else f"{size:.0f}" for size in (minus, plus))
        error = f" ± {above} d" if minus == plus else f" +{above} −{below} d"
    return f"BMJD_TDB {moment.bmjd_tdb:.6f}{error}" + (f" ({iso} at the barycentre)" if iso else "")
