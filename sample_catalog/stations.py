"""The invented network: five stations and the series of photometry that came out of them."""

from __future__ import annotations

from dataclasses import dataclass

from campaign.model.systems import Site

SITES: tuple[Site, ...] = (
    Site(
        1, "Cold Mesa", "ground", -18.437, 13.724, 1640.0, 20.0, time_zone="Africa/Windhoek",
        notes="Invented. Two small reflectors; infrared photometer since the start of Survey list II.",
    ),
    Site(
        2, "Ninefold Flat", "ground", 39.023, -117.616, 2210.0, 22.0, time_zone="America/Los_Angeles",
        notes="Invented. Closed; its notebooks were typed in by hand, most with the day only.",
    ),
    Site(
        3, "Harrow Pass", "ground", 41.871, 74.908, 2930.0, 25.0, time_zone="Asia/Bishkek",
        notes="Invented. Snowed in from December to February in many years.",
    ),
    Site(
        4, "Lamplight Ridge", "ground", -27.862, -66.214, 3120.0, 18.0,
        time_zone="America/Argentina/Catamarca",
        notes="Invented. Robotic patrol; bright stars saturate.",
    ),
    Site(
        5, "Farwatch", "space", elongation_min_deg=78.0, elongation_max_deg=142.0,
        notes="Invented space platform: can point between 78 and 142 degrees from the Sun.",
    ),
)  # fmt: skip
SITE_NAMES = {site.id: site.name for site in SITES}


@dataclass(frozen=True, slots=True)
class BandLimits:
    """What a series reaches in one band: error, share of visits, faintest and brightest magnitude."""

    error_mag: float
    share: float
    faintest_mag: float
    brightest_mag: float


@dataclass(frozen=True, slots=True)
class Series:
    """One stream of photometry from one instrument; ``day_only`` keeps the UTC day and no time."""

    source: str
    site_id: int
    instrument: str
    photometric_system: str
    observers: tuple[str, ...]
    start_yr: float
    end_yr: float
    cadence_d: float
    bands: dict[str, BandLimits]
    day_only: bool = False


SERIES: tuple[Series, ...] = (
    Series(
        "Ninefold Flat notebooks", 2, "single-channel photometer", "Ninefold JHKL",
        ("Oona Draskell", "Bram Tellivo"), 1987.4, 2002.9, 44.0,
        {
            "K": BandLimits(0.050, 1.0, 11.0, 1.5),
            "J": BandLimits(0.060, 0.35, 12.5, 2.5),
            "H": BandLimits(0.050, 0.40, 12.0, 2.0),
            "L": BandLimits(0.090, 0.25, 7.4, 0.5),
        },
        day_only=True,
    ),
    Series(
        "Survey list II of the Cold Mesa group", 1, "Mesa photometer 2", "Cold Mesa JHKLM",
        ("Ysolde Kharne", "Ivo Marrenby", "Tamsin Oquell"), 1993.1, 2012.6, 44.0,
        {
            "K": BandLimits(0.025, 1.0, 12.0, 3.6),
            "J": BandLimits(0.030, 0.40, 13.6, 4.2),
            "H": BandLimits(0.025, 0.40, 13.0, 4.0),
            "L": BandLimits(0.045, 0.45, 8.6, 2.4),
            "M": BandLimits(0.080, 0.15, 7.2, 1.0),
        },
    ),
    Series(
        "Harrow Pass circulars", 3, "Pass camera", "Harrow HK",
        ("Anselm Vorgrave", "Dilnara Osk"), 2001.2, 2020.4, 58.0,
        {"K": BandLimits(0.040, 1.0, 12.4, 4.4), "H": BandLimits(0.040, 0.6, 13.2, 4.9)},
    ),
    Series(
        "Lamplight Ridge patrol", 4, "patrol array", "Lamplight JHKL",
        ("patrol",), 2009.3, 2030.0, 36.0,
        {
            "K": BandLimits(0.020, 1.0, 13.4, 5.1),
            "J": BandLimits(0.025, 0.35, 14.8, 6.0),
            "H": BandLimits(0.020, 0.35, 14.2, 5.6),
            "L": BandLimits(0.035, 0.30, 9.6, 3.4),
        },
    ),
    Series(
        "Farwatch release 3", 5, "Farwatch imager", "Farwatch LM",
        ("pipeline",), 2018.6, 2030.0, 75.0,
        {"L": BandLimits(0.012, 1.0, 14.0, 3.0), "M": BandLimits(0.015, 1.0, 13.0, 2.6)},
    ),
    Series(
        "Cold Mesa watch sheets", 1, "Mesa photometer 3", "Cold Mesa JHKLM",
        ("Tamsin Oquell", "Rufin Adeyle"), 2019.1, 2030.0, 30.0,
        {"K": BandLimits(0.020, 1.0, 12.6, 4.0), "L": BandLimits(0.035, 0.35, 9.0, 2.6)},
    ),
)  # fmt: skip
WATCH_SHEETS = 5  # the series that follows systems on request

ATTEMPT_REASONS = (
    "cloud",
    "wind above the limit",
    "snow on the road",
    "seeing too poor",
    "photometer down",
    "not reached in the queue",
)


def reaches(site_id: int, dec_deg: float) -> bool:
    """Whether a station ever sees a declination well; the platform sees all."""
    latitude = SITES[site_id - 1].latitude_deg
    return latitude is None or abs(dec_deg - latitude) < 62.0
