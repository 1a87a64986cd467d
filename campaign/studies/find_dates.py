"""From the numbers of a dated span to dates, intervals and sizes with their names."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from campaign.errors import InputRefused
from campaign.model.forecasts import Quantiles, UtcQuantiles
from campaign.model.found import FoundBrightening, FoundDate, FoundEpisode, FoundMaximum, RiseCover
from campaign.model.measured import Measured
from campaign.physics.brightspans import JudgedCurve
from campaign.physics.episodedating import BandTop, DatedSpan
from campaign.physics.hinge import fit_hinge
from campaign.physics.timescales import utc_iso

FloatArray = NDArray[np.float64]

# With fewer nights on the rise the onset is a bracket.
COVERING_NIGHTS = 2
_HINGE_BACK_D = 500.0


def found_episode(number: int, dated: DatedSpan, curve: JudgedCurve, bands: Sequence[str]) -> FoundEpisode:
    """One dated span in the words of the result.

    Parameters
    ----------
    number : int
        Its number in the light curve, from 1.
    dated : DatedSpan
        The dates; days, units of the stars' flux.
    curve : JudgedCurve
        The light curve that it is of; days, mag.
    bands : sequence of str
        Names of the bands by number.

    Returns
    -------
    FoundEpisode
        Without notes and without what is known of it; ``bmjd_tdb``, days.

    Notes
    -----
    Accuracy: that of the dates; UTC to the second.

    Source: DEVELOPERS.md (how an episode is dated).
    """
    main = bands[dated.span.band]
    rise = _cover(dated)
    # One band's light curve dates that band's onset; several together date production's.
    onset_band = main if len(dated.tops) == 1 else None
    decline = dated.decline
    half_seen = decline is not None and decline.half_is_seen
    return FoundEpisode(
        number=number,
        # What is still under way may last as long as any other.
        kind="brief" if dated.span.brief and dated.top_is_reached and half_seen else "episode",
        rise=rise,
        onset=None
        if dated.onset_bmjd_tdb is None
        else found_date(dated.onset_bmjd_tdb, onset_band, rise == "covered"),
        maxima=tuple(_maximum(top, bands[top.band], dated) for top in dated.tops),
        end=None
        if decline is None or not half_seen
        else found_date(decline.end_bmjd_tdb, main, decline.end_is_told),
        half=None if decline is None or not half_seen else found_date(decline.half_bmjd_tdb, main, True),
        rise_d=None if dated.rise_d is None else quantiles_of(dated.rise_d),
        decay_d=None if decline is None or not half_seen else quantiles_of(decline.decay_d),
        last_quiet_bmjd_tdb=dated.last_quiet_bmjd_tdb,
        first_bright_bmjd_tdb=dated.first_bright_bmjd_tdb,
        last_bright_bmjd_tdb=dated.span.stop_bmjd_tdb,
        rise_nights=dated.rise_nights,
        chi2=dated.chi2,
        dof=dated.dof,
        hinge_magnitudes=_hinge(dated, curve) if rise == "covered" else None,
        brightenings=tuple(
            FoundBrightening(b.bmjd_tdb, _utc(b.bmjd_tdb), b.lasts_d, b.excess, b.points)
            for b in dated.brightenings
        ),
    )


def quantiles_of(summary: FloatArray) -> Quantiles:
    """A summary (median, 16, 84, 2.5, 97.5 %, standard deviation) as quantiles.

    Parameters
    ----------
    summary : ndarray, shape (6,)
        Days.

    Returns
    -------
    Quantiles
        Days.

    Notes
    -----
    Accuracy: exact. Source: project convention.
    """
    median, low68, high68, low95, high95, sigma = (float(value) for value in summary)
    return Quantiles(median, sigma, low68, high68, low95, high95)


def found_date(summary: FloatArray, band: str | None, told: bool) -> FoundDate:
    """A date with its interval, also in UTC.

    Parameters
    ----------
    summary : ndarray, shape (6,)
        As for :func:`quantiles_of`, ``bmjd_tdb``, days.
    band : str or None
        The band that it is dated in; None for production itself.
    told : bool
        Whether the points bound it.

    Returns
    -------
    FoundDate
        ``bmjd_tdb``, days; UTC to the second.

    Notes
    -----
    Accuracy: UTC at the barycentre, without light time.

    Source: as ``campaign.physics.timescales.utc_iso``.
    """
    iso = utc_iso(np.asarray(summary[:5]))
    return FoundDate(quantiles_of(summary), UtcQuantiles(iso[0], iso[1], iso[2], iso[3], iso[4]), band, told)


def _utc(bmjd_tdb: float) -> str | None:
    return utc_iso(np.array([bmjd_tdb]))[0]


def _cover(dated: DatedSpan) -> RiseCover:
    if dated.onset_bmjd_tdb is None:
        return "before the curve"
    return "covered" if dated.rise_nights >= COVERING_NIGHTS else "not covered"


def _maximum(top: BandTop, band: str, dated: DatedSpan) -> FoundMaximum:
    amplitude = max(top.amplitude, 0.0)
    return FoundMaximum(
        date=found_date(top.top_bmjd_tdb, band, _top_is_told(top, dated)),
        excess=Measured(amplitude, top.amplitude_minus, top.amplitude_plus),
        excess_mag=float(2.5 * np.log10(1.0 + amplitude)),
        points=top.points,
        reached=dated.top_is_reached,
    )


def _top_is_told(top: BandTop, dated: DatedSpan) -> bool:
    """Whether the top may not as well have been before the first point."""
    return dated.onset_bmjd_tdb is not None or bool(top.top_bmjd_tdb[3] > dated.first_bright_bmjd_tdb)


def _hinge(dated: DatedSpan, curve: JudgedCurve) -> Quantiles | None:
    """The onset by a broken line in magnitudes of the best band, for comparison."""
    columns = curve.columns
    t = columns.bmjd_tdb
    until = float(dated.tops[0].top_bmjd_tdb[0])
    chosen = (
        columns.measured
        & (columns.band == dated.span.band)
        & (t >= dated.first_bright_bmjd_tdb - _HINGE_BACK_D)
        & (t <= until)
        & np.isfinite(curve.ln_excess)
    )
    try:
        fit = fit_hinge(t[chosen], -curve.ln_excess[chosen], curve.sigma_ln[chosen])
    except InputRefused:
        return None
    return Quantiles(fit.bend, None, fit.low, fit.high)
