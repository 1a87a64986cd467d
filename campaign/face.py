"""The catalogue for Python: ``campaign.open(path)``.

Every call opens the database, reads and closes it; nothing has to be closed. Tables come as pandas
DataFrames, forecasts as the dataclasses that the terminal shows too.
"""

from __future__ import annotations

import os
from collections.abc import Iterable
from datetime import UTC, datetime
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    import pandas as pd

    from campaign.model.exchange_columns import ExchangeKind
    from campaign.model.forecasts import UpcomingResult
    from campaign.model.found import EpisodesFound
    from campaign.model.instants import TypedInstant
    from campaign.model.refined import Refinement
    from campaign.model.verification import ForecastScores

Several = str | Iterable[str] | None
When = str | datetime | None


class Campaign:
    """One catalogue, read when it is asked.

    Parameters
    ----------
    path : str, path or None
        A file or an SQLAlchemy URL; None for ``$CAMPAIGN_DB``, else the user's data folder.

    Raises
    ------
    DatabaseUnusable
        When there is no catalogue that can be read.
    """

    def __init__(self, path: str | os.PathLike[str] | None = None) -> None:
        from campaign import settings
        from campaign.studies.opening import require_catalogue

        self._db = settings.database_location(None if path is None else os.fspath(path), os.environ)
        require_catalogue(self._db)

    def __repr__(self) -> str:
        shown = "an SQLAlchemy URL" if "://" in self._db else repr(self._db)
        return f"<campaign in {shown}>"

    def observations(
        self,
        system: Several = None,
        *,
        kind: Several = None,
        band: Several = None,
        start: When = None,
        end: When = None,
        site: str | None = None,
        source: str | None = None,
        quality: Several = None,
        also_withdrawn: bool = False,
    ) -> pd.DataFrame:
        """Observations by system, time and ``uid``.

        Parameters
        ----------
        system, kind, band, quality : str, iterable of str or None
            Only these; None for all. Systems by name or alias, whatever their case and spaces.
        start, end : str, datetime or None
            Only what was observed from then until then: an instant as on the command line (a day counts
            whole), or an aware datetime.
        site : str or None
            Only what was observed there.
        source : str or None
            Only where the source holds this text.
        also_withdrawn : bool
            Also what was superseded or withdrawn, told in ``out_of_use``.

        Returns
        -------
        DataFrame
            One row an observation, with the columns of ``campaign export observations``. ``bmjd_tdb`` is
            MJD in TDB at the barycentre (d); ``value``, ``value_minus`` and ``value_plus`` are in the unit
            that ``unit`` names row by row. ``attrs["units"]`` holds the unit of every column that has one
            (that of ``value`` where all rows share it), ``attrs["descriptions"]`` what each column means.
            NaN and NA are unknown.

        Raises
        ------
        NotFound
            Unknown system or site; the nearest names are in ``details``.
        InputRefused
            An instant, kind or quality that cannot be read.
        """
        from campaign.model.observations import OBSERVATION_KINDS
        from campaign.studies.observations import Wanted

        wanted = Wanted(
            kinds=_words(kind, OBSERVATION_KINDS, "kind"),
            bands=_several(band) or None,
            since=_instant(start, "start"),
            until=_instant(end, "end"),
            site=site,
            source=source or None,
            qualities=_words(quality, ("good", "doubtful", "bad"), "quality"),
        )
        return self._table(
            "observations", systems=_several(system), wanted=wanted, also_out_of_use=also_withdrawn
        )

    def systems(self) -> pd.DataFrame:
        """Systems with their stars and the dust rule in force, by name.

        Returns
        -------
        DataFrame
            One row a system, retired ones too, with the columns of ``campaign export systems``;
            ``attrs["units"]`` holds their units (deg, mas/yr, pc, solMass, km/s, d, ...).
        """
        return self._table("systems")

    def solutions(self, system: Several = None) -> pd.DataFrame:
        """Sets of orbital elements, by system and label.

        Parameters
        ----------
        system : str, iterable of str or None
            Only of these, by name or alias; None for all.

        Returns
        -------
        DataFrame
            One row a solution, with the columns of ``campaign export solutions``; ``attrs["units"]``
            holds their units (d, deg, km/s, au, arcsec). ``adopted`` and ``weight`` say what the forecast
            rests on.

        Raises
        ------
        NotFound
            Unknown system.
        """
        return self._table("solutions", systems=_several(system))

    def episodes(self, system: Several = None, *, also_withdrawn: bool = False) -> pd.DataFrame:
        """Dated bursts of dust production, by system and date.

        Parameters
        ----------
        system : str, iterable of str or None
            Only of these, by name or alias; None for all.
        also_withdrawn : bool
            Also those out of use, told in ``out_of_use``.

        Returns
        -------
        DataFrame
            One row an episode, with the columns of ``campaign export episodes``; instants are MJD in TDB
            at the barycentre, their errors in days.

        Raises
        ------
        NotFound
            Unknown system.
        """
        return self._table("episodes", systems=_several(system), also_out_of_use=also_withdrawn)

    def upcoming(
        self,
        within_d: float | None = None,
        as_of: When = None,
        *,
        system: Several = None,
        min_probability: float = 0.0,
        draws: int | None = None,
        seed: int | None = None,
        resolution_arcsec: float | None = None,
    ) -> UpcomingResult:
        """The events to come, as ``campaign upcoming`` shows them.

        Parameters
        ----------
        within_d : float or None
            Length of the period from now on, d; None for five Julian years.
        as_of : str, datetime or None
            In place of now; observations made after it are not looked at.
        system : str, iterable of str or None
            Only these, by name or alias; None for all that are not retired.
        min_probability : float
            Only events with at least this probability (dimensionless) inside the period.
        draws, seed : int or None
            Of the random draws; None for 20,000 draws and seed 1.
        resolution_arcsec : float or None
            What an image resolves, arcsec: then also when shells become resolvable.

        Returns
        -------
        UpcomingResult
            ``events`` with medians and intervals as ``bmjd_tdb`` (d) and UTC text.

        Raises
        ------
        NotFound
            Unknown system.
        InputRefused
            An instant or a length that cannot be used.
        """
        from campaign.studies import watch

        asked = _instant(as_of, "as_of")
        loaded = watch.load_campaign(
            self._db, _several(system) or None, None, asked, with_shells=resolution_arcsec is not None
        )
        question = watch.ask(
            loaded,
            now=datetime.now(UTC),
            as_of=asked,
            start=None,
            end=None,
            within_d=within_d,
            events=(),
            min_probability=min_probability,
            draws=draws,
            seed=seed,
            solutions="adopted",
            resolution_arcsec=resolution_arcsec,
        )
        return watch.upcoming(loaded, question)

    def find_episodes(self, system: str, band: Several = None, as_of: When = None) -> EpisodesFound:
        """The episodes in a light curve, as ``campaign episodes find`` shows them; nothing is written.

        Parameters
        ----------
        system : str
            Name or alias.
        band : str, iterable of str or None
            Only these, as they are written; None for all.
        as_of : str, datetime or None
            Nothing observed after it is looked at.

        Returns
        -------
        EpisodesFound
            ``episodes`` with onset, maxima, end and half-decay as ``bmjd_tdb`` (d) and UTC text, lengths in
            d, excess in units of the stars' flux (dimensionless), levels in mag.

        Raises
        ------
        NotFound
            Unknown system.
        InputRefused
            A band without magnitudes, or too few of them.
        """
        from campaign.studies import find_episodes

        return find_episodes.find_episodes(self._db, system, _several(band) or None, _instant(as_of, "as_of"))

    def refine(self, system: str, *, event: str | None = None, as_of: When = None) -> Refinement:
        """Period and epoch from dated episodes, as ``campaign refine`` shows them; nothing is written.

        Parameters
        ----------
        system : str
            Name or alias.
        event : str or None
            'onset', 'maximum' or 'both' with their offset; None for what most episodes have.
        as_of : str, datetime or None
            Later episodes and observations are hidden; None for now.

        Returns
        -------
        Refinement
            ``ephemeris``, ``dates`` with O-C, ``counts``, ``next_event``: ``bmjd_tdb``, lengths in d.

        Raises
        ------
        NotFound
            Unknown system.
        InputRefused, Conflict
            No dated episode; an event of another name; confirmed episodes that lie over each other.
        """
        from campaign.errors import InputRefused
        from campaign.studies import refine, watch

        if event not in (None, "onset", "maximum", "both"):
            raise InputRefused(
                f"event {event!r} is not understood.",
                why="It is one of: onset, maximum, both.",
                hint='For example event="both".',
                code="choice-refused",
            )
        asked = _instant(as_of, "as_of")
        loaded = watch.load_campaign(self._db, [system], None, asked)
        now = refine.asked_at(loaded, datetime.now(UTC), asked)
        return refine.refine(loaded, refine.RefineQuestion(now, event=event)).result

    def score_forecasts(
        self, system: Several = None, *, keeping: str | None = None, as_of: When = None
    ) -> ForecastScores:
        """How well kept forecasts did, as ``campaign forecast score`` shows it.

        Parameters
        ----------
        system : str, iterable of str or None
            Names or aliases; None for all.
        keeping : str or None
            Number or label of what ``campaign forecast keep`` kept; None for all.
        as_of : str, datetime or None
            Outcomes dated later are hidden; None for now.

        Returns
        -------
        ForecastScores
            ``scored`` one by one and ``groups`` by event and lead time, in d; what was refused, and why.

        Raises
        ------
        NotFound
            Unknown system or keeping.
        """
        from campaign.studies import score_forecasts, watch

        today = watch.today_of(self._db, datetime.now(UTC), _instant(as_of, "as_of"))
        names = _several(system) or None
        return score_forecasts.score_forecasts(self._db, today, names=names, keeping=keeping)

    def rehearse(
        self,
        system: str,
        leads_d: Iterable[float] = (365.25,),
        *,
        event: Several = "onset",
        entered_any_time: bool = False,
        as_of: When = None,
    ) -> ForecastScores:
        """Past episodes forecast from what was known before, as ``campaign forecast rehearse`` shows it.

        Parameters
        ----------
        system : str
            Name or alias.
        leads_d : iterable of float
            How long before each episode, d.
        event : str or iterable of str
            Of onset, maximum and end.
        entered_any_time : bool
            Let in entries of any date, for a catalogue that was filled after the fact.
        as_of : str, datetime or None
            Episodes dated later are hidden; None for now.

        Returns
        -------
        ForecastScores
            As ``score_forecasts``, in d.

        Raises
        ------
        NotFound, Conflict, InputRefused
            Unknown system; no past episode; a lead out of range.
        """
        from campaign.studies import rehearse, watch

        today = watch.today_of(self._db, datetime.now(UTC), _instant(as_of, "as_of"))
        events = _words(event, ("onset", "maximum", "end"), "event") or ("onset",)
        return rehearse.rehearse(
            self._db, system, today, tuple(leads_d), events, entered_any_time=entered_any_time
        )

    def _table(self, kind: ExchangeKind, **asked: Any) -> pd.DataFrame:
        from campaign.output.frames import frame_of
        from campaign.studies.export import Asked, outgoing_table

        with outgoing_table(self._db, Asked(kind, **asked)) as table:
            return frame_of(table)


def _several(given: Several) -> tuple[str, ...]:
    if given is None:
        return ()
    return (given,) if isinstance(given, str) else tuple(given)


def _words(given: Several, accepted: tuple[str, ...], name: str) -> tuple[Any, ...] | None:
    from campaign.errors import InputRefused

    words = _several(given)
    for word in words:
        if word not in accepted:
            raise InputRefused(
                f"{name} {word!r} is not understood.",
                why=f"It is one of: {', '.join(accepted)}.",
                hint=f"For example {name}={accepted[0]!r}.",
                code="choice-refused",
                details={"accepted": list(accepted)},
            )
    return words or None


def _instant(given: When, name: str) -> TypedInstant | None:
    from campaign.errors import InputRefused
    from campaign.reading.instants import read_instant

    if given is None:
        return None
    if isinstance(given, datetime):
        if given.utcoffset() is None:
            raise InputRefused(
                f"{name}: the time {given.isoformat()} has no time zone.",
                why="Without its offset from UTC it could be any of 26 instants.",
                hint="Give an aware datetime, for example datetime.now(UTC), or text.",
                code="instant-unreadable",
            )
        given = given.astimezone(UTC).isoformat().replace("+00:00", "Z")
    return read_instant(given, default_scale="utc", default_place="geocentre", name=name)
