"""An invented forecast, built by hand, that holds every case a screen has to show."""

from __future__ import annotations

import datetime

from campaign.model.forecasts import (
    DustWindow,
    EventForecast,
    ExplainedEvent,
    ExplainedSystem,
    Quantiles,
    SystemBasis,
    UpcomingResult,
    UtcQuantiles,
    VarianceTerm,
)

HOSTILE_NAME = "[red]Rook[/red] :bomb: \x1b]0;owned\x07\u202e\x9b31m\nline"


def utc_of(bmjd_tdb: float) -> str:
    """A calendar instant that is good enough for a picture (no leap seconds)."""
    instant = datetime.datetime(1858, 11, 17) + datetime.timedelta(days=bmjd_tdb)
    return instant.strftime("%Y-%m-%dT%H:%M:%SZ")


def dated(
    system: str,
    event: str,
    cycle: int,
    median: float,
    below_d: float | None = 12.0,
    above_d: float | None = None,
    status: str = "expected",
    probability: float | None = 1.0,
    solution: str = "Orrel fit",
    rule: str | None = "separation",
    **more,
) -> EventForecast:
    """One event with a normal (or two-piece) interval about its median."""
    if below_d is None:
        quantiles, utc = Quantiles(median), UtcQuantiles(utc_of(median))
    else:
        above_d = below_d if above_d is None else above_d
        edges = (median - below_d, median + above_d, median - 1.96 * below_d, median + 1.96 * above_d)
        quantiles = Quantiles(median, (below_d + above_d) / 2, *edges)
        utc = UtcQuantiles(utc_of(median), *(utc_of(edge) for edge in edges))
    return EventForecast(
        system,
        event,
        cycle,
        "orbit",
        solution,
        rule,
        quantiles,
        utc,
        status,
        probability,
        probability,
        **more,
    )


def lost(system: str) -> EventForecast:
    return EventForecast(
        system, "onset", None, "orbit", "Orrel fit", "phase", None, None, "phase lost", 1.0, 0.31,
        phase_lost=True, probability_per_yr=0.083, notes=("3 sigma reach half a period: the phase is lost",),
    )  # fmt: skip


def window(system: str, cycle: int, centre: float, half_d: float, peak: float = 1.0) -> DustWindow:
    steps = [i / 20 for i in range(-20, 21)]
    return DustWindow(
        system,
        cycle,
        tuple(centre + half_d * step for step in steps),
        tuple(peak * min(1.0, 2.0 * (1.0 - abs(step))) for step in steps),
    )


START = 62964.0  # 2031-04-08


def forecast(extra_name: str | None = None, years: float = 5.0) -> UpcomingResult:
    """The whole campaign; ``extra_name`` adds a system of that name."""
    events = [
        dated("Lantern 3", "onset", 7, START + 812.0, 12.0),
        dated("Lantern 3", "periastron", 7, START + 840.4, 3.1, rule="separation"),
        dated("Lantern 3", "maximum", 7, START + 931.0, 14.0),
        dated("Lantern 3", "end", 7, START + 1120.0, 25.0, 41.0),
        dated("Lantern 3", "A in front", 7, START + 851.0, 4.0),
        dated("Old Ferry West", "onset", 3, START + 120.0, 2.4, 31.0, probability=0.83),
        dated("Old Ferry West", "end", 3, START + 211.0, 9.0, probability=0.9996),
        dated("Gannet", "onset", 12, START - 61.0, 1.0, status="under way", observed=True),
        dated("Gannet", "end", 12, START + 30.0, 9.0, status="expected"),
        dated("Saltmarsh", "onset", 1, START - 10.0, 70.0, status="open", rule="phase"),
        dated(
            "Tarn Hollow", "onset", 2, START - 200.0, 20.0, status="late", notes=("quiet in K since 2030",)
        ),
        dated("Quill", "periastron", 4, START + 1500.0, None, rule=None, probability=None),
        dated("Brae", "periastron", 9, START + 400.0, 60.0, rule=None),
        dated("Long Wall", "onset", 1, START + 1700.0, 1400.0, 2100.0),
        lost("Drift"),
    ]
    windows = [
        window("Lantern 3", 7, START + 965.0, 180.0),
        window("Old Ferry West", 3, START + 165.0, 60.0, 0.83),
        window("Gannet", 12, START - 10.0, 50.0),
        window("Saltmarsh", 1, START + 60.0, 200.0, 0.6),
    ]
    bases = [
        SystemBasis(
            "Lantern 3", "orbit of Orrel fit (P 3127.5 d), rule separation, cycle 6 seen in 2023", True
        ),
        SystemBasis(
            "Old Ferry West", "orbit of Orrel fit, rule separation near the periastron distance", True
        ),
        SystemBasis("Wren", "no solution and no confirmed episode", False),
    ]
    if extra_name is not None:
        events.append(dated(extra_name, "onset", 5, START + 300.0, 8.0, notes=(f"watch {extra_name}",)))
        windows.append(window(extra_name, 5, START + 330.0, 40.0))
        bases.append(SystemBasis(extra_name, f"orbit of {extra_name}", True))
    until = START + 365.25 * years
    return UpcomingResult(
        as_of_bmjd_tdb=START,
        as_of_utc=utc_of(START),
        from_bmjd_tdb=START,
        until_bmjd_tdb=until,
        from_utc=utc_of(START),
        until_utc=utc_of(until),
        events=tuple(events),
        dust_windows=tuple(windows),
        bases=tuple(bases),
        draws=20_000,
        seed=1,
        assumptions=("Errors of different elements are independent where no covariance is stored.",),
        warnings=("Quill has no error of its period.",),
    )


def explained() -> ExplainedSystem:
    whole = forecast()
    events = tuple(e for e in whole.events if e.system == "Lantern 3")
    upcoming = UpcomingResult(
        **{
            **{name: getattr(whole, name) for name in UpcomingResult.__dataclass_fields__},
            "events": events,
            "dust_windows": whole.dust_windows[:1],
            "bases": whole.bases[:1],
            "warnings": (),
        }
    )
    terms = (
        VarianceTerm("epoch", 0.5, "T0 as published"),
        VarianceTerm("period, 7 cycles on", 2.1),
        VarianceTerm("covariance of epoch and period", -0.4),
        VarianceTerm("critical separation", 11.2),
    )
    return ExplainedSystem(
        "Lantern 3",
        (("period", "3127.5 ± 0.3 d", "Orrel fit"), ("eccentricity", "0.71 ± 0.02", "Orrel fit")),
        ("Cycle 0 is anchored at MJD 41072.0; the next periastron is cycle 7.",),
        (ExplainedEvent(events[0], "T7 = T0 + 7 P = 41072.0 + 7 x 3127.5\nonset = T7 - 28.4 d", terms),),
        upcoming,
        ("Onset may precede periastron.",),
    )
