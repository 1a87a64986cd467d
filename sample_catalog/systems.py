"""Sixteen invented systems. Nothing here is real: not a name, not a position, not an element.

Positions are at odd places, several degrees from every dust-making binary that we know. Dates of the
cases that are about today (under way, late, unseen, suspected, open) are set relative to the sample's
own date, so that each status holds by construction.
"""

from __future__ import annotations

from .instants import AS_OF_BMJD_TDB, year_to_bmjd
from .spec import DustSpec, RuleSpec, SolutionSpec, StarSpec, SystemSpec, WatchSpec

_A = AS_OF_BMJD_TDB
_REPORT = "Cold Mesa report"
_CIRCULAR = "Harrow Pass circular"
_RIDGE = "Lamplight Ridge note"


def _wr(spectral_type: str, mass: float, speed: float, mass_loss: float = 2.0e-5) -> StarSpec:
    return StarSpec(spectral_type, mass, speed, mass_loss, 2.4e5, 62000.0, 4.2)


def _o(spectral_type: str, mass: float, speed: float, mass_loss: float = 6.0e-7) -> StarSpec:
    return StarSpec(spectral_type, mass, speed, mass_loss, 2.9e5, 37000.0, 12.8)


KETTLE = SystemSpec(
    name="Kettle 7",
    aliases=("Cold Mesa II-07", "Long Kettle"),
    story="A very eccentric, well measured orbit: dust is made for some months around each periastron only.",
    cases=("high e", "separation rule", "several solutions"),
    ra_deg=190.3718, dec_deg=-41.8342, distance_pc=1900.0, distance_error=80.0,
    star_a=_wr("WC7", 13.0, 2550.0), star_b=_o("O5.5 III", 31.0, 2900.0, 1.4e-6),
    period_yr=11.3, reference_cycle=1, reference_bmjd_tdb=year_to_bmjd(2028.95),
    eccentricity=0.86, omega_b_deg=35.0, inclination_deg=58.0, node_deg=117.0, gamma_kms=-14.0,
    k_mag=5.62, colours=(0.55, 0.25, 0.30, 0.40),
    dust=DustSpec(
        "separation", critical_separation_au=6.1, critical_scatter_au=0.05, condensation_distance_au=95.0,
        flow_speed_kms=2200.0, scatter_onset_d=2.0, scatter_maximum_d=4.0, scatter_end_d=6.0,
        rise="fast", contrast_k=2.2, decay_k_d=130.0,
    ),
    watch=WatchSpec((1, 2, 3, 4, 5), start_yr=1993.1),
    solutions=(
        SolutionSpec(
            "orbit 2024", f"{_REPORT} 31", 2024.4, 0,
            {
                "period_d": 2.5, "epoch": 1.5, "eccentricity": 0.006, "omega_deg": 1.5,
                "inclination_deg": 2.0, "node_deg": 2.0, "k_a_kms": 2.2, "k_b_kms": 1.4, "gamma_kms": 2.0,
                "a_arcsec": 0.00015,
            },
            correlated=("period_d", "epoch", -0.62), published_cycle_offset=4,
        ),
        SolutionSpec(
            "orbit 2009", f"{_CIRCULAR} 12", 2009.1, -1,
            {"period_d": 21.0, "epoch": 4.0, "eccentricity": 0.02, "omega_deg": 4.0, "k_a_kms": 5.0},
            adopted=False, note="Superseded: velocities of star A only.",
        ),
    ),
    rule=RuleSpec(
        "separation",
        {"critical_separation_au": 0.35, "condensation_distance_au": 12.0, "flow_speed_kms": 120.0},
        scatter_onset_d=4.0, scatter_maximum_d=6.0, scatter_end_d=8.0,
    ),
    confirmed=(-2, -1, 0), dating_d=(4.0, 8.0, 15.0), priority=1, stars_known=True,
    velocities=64, positions=16, shell_epochs_yr=(2019.42, 2022.61, 2025.74), shells_seen=5,
    dust_speed_kms=2080.0,
)  # fmt: skip

THISTLE = SystemSpec(
    name="Thistle 2",
    aliases=("Cold Mesa II-02",),
    story="A nearly circular orbit whose dust comes at the same phase each cycle, long before periastron.",
    cases=("low e", "phase rule"),
    ra_deg=342.1137, dec_deg=43.5719, distance_pc=3300.0, distance_error=400.0,
    star_a=_wr("WC9", 16.0, 1550.0, 3.0e-5), star_b=_o("O8 V", 24.0, 2200.0),
    period_yr=6.23, reference_cycle=1, reference_bmjd_tdb=year_to_bmjd(2028.21),
    eccentricity=0.11, omega_b_deg=212.0, inclination_deg=49.0, node_deg=61.0, gamma_kms=22.0,
    k_mag=7.48, colours=(1.35, 0.60, 0.55, 0.75),
    dust=DustSpec(
        "phase", -0.07, 0.04, 0.17, 12.0, 15.0, 30.0, rise="linear", contrast_k=1.1, decay_k_d=160.0,
    ),
    watch=WatchSpec((0, 1, 2, 3, 4)),
    solutions=(
        SolutionSpec(
            "velocities 2025", f"{_CIRCULAR} 44", 2025.0, 0,
            {
                "period_d": 5.0, "epoch": 24.0, "eccentricity": 0.02, "omega_deg": 4.0,
                "k_a_kms": 0.9, "k_b_kms": 0.7, "gamma_kms": 0.8, "inclination_deg": 6.0,
            },
            omega_of="B", correlated=("epoch", "omega_deg", 0.9),
        ),
    ),
    rule=RuleSpec(
        "phase", {"onset": 0.006, "maximum": 0.008, "end": 0.015},
        scatter_onset_d=15.0, scatter_maximum_d=18.0, scatter_end_d=30.0,
    ),
    confirmed=(-5, -4, -2, -1, 0), dating_d=(9.0, 14.0, 25.0), priority=2, stars_known=True, velocities=56,
)  # fmt: skip

BELLOWS = SystemSpec(
    name="Bellows 5",
    aliases=("Cold Mesa II-05",),
    story="An episode under way: its onset was confirmed in February 2027 and no end is in sight.",
    cases=("lag rule", "under way"),
    ra_deg=123.0672, dec_deg=12.3391, distance_pc=2400.0, distance_error=250.0,
    star_a=_wr("WC8", 11.0, 1900.0), star_b=_o("O7 V", 27.0, 2500.0),
    period_yr=14.7, reference_cycle=1, reference_bmjd_tdb=_A + 50.0,
    eccentricity=0.45, omega_b_deg=301.0, inclination_deg=66.0, node_deg=20.0, gamma_kms=5.0,
    k_mag=6.91, colours=(0.80, 0.35, 0.40, 0.50),
    dust=DustSpec(
        "lag", -75.0, 60.0, 240.0, 14.0, 16.0, 30.0, rise="linear", contrast_k=1.9, decay_k_d=210.0,
        onset_shift_d={1: 0.0},
    ),
    watch=WatchSpec((0, 1, 2, 3, 5), visits_before_d=(62.0, 48.0, 36.0, 29.0, 18.0, 11.0, 4.0)),
    solutions=(
        SolutionSpec(
            "dust dates 2014", f"{_REPORT} 22", 2014.3, 0,
            {"period_d": 14.0, "epoch": 6.0, "eccentricity": 0.05, "omega_deg": 7.0},
        ),
    ),
    rule=RuleSpec(
        "lag", {"onset": 14.0, "maximum": 18.0, "end": 40.0},
        scatter_onset_d=12.0, scatter_maximum_d=15.0, scatter_end_d=30.0,
    ),
    confirmed=(-1, 0, 1), dating_d=(5.0, 12.0, 25.0), priority=1, stars_known=True,
)  # fmt: skip

QUILL = SystemSpec(
    name="Quill 9",
    aliases=("Cold Mesa II-09", "Quill"),
    story="Four dated episodes teach the rule, and an orbit from one star's velocities counts the cycles.",
    cases=("learned rule with orbit",),
    ra_deg=285.6129, dec_deg=-38.6431, distance_pc=2600.0, distance_error=0.060,
    star_a=_wr("WC8", 12.0, 2050.0), star_b=_o("O8.5 III", 28.0, 2300.0),
    period_yr=9.38, reference_cycle=2, reference_bmjd_tdb=year_to_bmjd(2030.66),
    eccentricity=0.62, omega_b_deg=148.0, inclination_deg=71.0, node_deg=205.0, gamma_kms=-41.0,
    k_mag=8.02, colours=(1.10, 0.48, 0.50, 0.66),
    dust=DustSpec(
        "lag", 40.0, 125.0, 265.0, 22.0, 24.0, 35.0, rise="saturating", contrast_k=0.9, decay_k_d=140.0,
        brief={0: ((430.0, 28.0, 0.35),), 1: ((520.0, 22.0, 0.30),)},
    ),
    watch=WatchSpec((1, 3, 4, 5), start_yr=1992.0),
    solutions=(
        SolutionSpec(
            "velocities 2016", f"{_RIDGE} 6", 2016.5, 0,
            {"period_d": 20.0, "epoch": 11.0, "eccentricity": 0.04, "omega_deg": 5.0, "k_a_kms": 2.0},
        ),
    ),
    rule=RuleSpec("learned"),
    confirmed=(-2, -1, 0, 1), dating_d=(8.0, 12.0, 25.0), by_parallax=True,
)  # fmt: skip

TALLOW = SystemSpec(
    name="Tallow 8",
    aliases=("Cold Mesa II-08",),
    story="No orbit at all: four dated episodes, one of five missed, and nested shells of the same clock.",
    cases=("learned rule with episodes only", "unrecorded episode"),
    ra_deg=58.8314, dec_deg=28.7093, distance_pc=1500.0, distance_error=(110.0, 140.0),
    star_a=_wr("WC9", 10.0, 1500.0), star_b=_o("O9 V", 21.0, 2100.0),
    period_yr=7.31, reference_cycle=5, reference_bmjd_tdb=year_to_bmjd(2029.52),
    eccentricity=0.55, omega_b_deg=77.0, inclination_deg=35.0, node_deg=9.0, gamma_kms=11.0,
    k_mag=6.85, colours=(1.60, 0.70, 0.70, 0.95),
    dust=DustSpec(
        "lag", 30.0, 130.0, 300.0, 18.0, 20.0, 35.0, rise="linear", contrast_k=1.4, decay_k_d=170.0,
    ),
    watch=WatchSpec((0, 1, 2, 3, 4), skip_yr=((2000.2, 2002.2),)),
    rule=RuleSpec("learned"),
    confirmed=(0, 2, 3, 4), dating_d=(9.0, 14.0, 25.0), priority=2, shell_epochs_yr=(2016.88, 2024.93),
    shells_seen=5, dust_speed_kms=1390.0,
)  # fmt: skip

ANVIL = SystemSpec(
    name="Anvil 4",
    aliases=("Cold Mesa II-04",),
    story="An old note gives a period and a date of maximum without any error, so no interval can be given.",
    cases=("period only", "missing error"),
    ra_deg=80.3279, dec_deg=57.4183, distance_pc=2900.0, distance_error=None,
    star_a=_wr("WC8", 12.0, 1800.0), star_b=_o("O9 III", 25.0, 2000.0),
    period_yr=17.6, reference_cycle=0, reference_bmjd_tdb=year_to_bmjd(2012.95),
    eccentricity=0.40, omega_b_deg=12.0, inclination_deg=52.0, node_deg=140.0, gamma_kms=-3.0,
    k_mag=7.15, colours=(0.70, 0.32, 0.35, 0.45),
    dust=DustSpec(
        "lag", -60.0, 80.0, 260.0, 20.0, 25.0, 40.0, rise="fast", contrast_k=0.8, decay_k_d=200.0,
    ),
    watch=WatchSpec((0, 2, 3), thinning=0.7),
    solutions=(
        SolutionSpec(
            "note 1998", "Ninefold Flat leaflet 3", 1998.2, 0, {"period_d": None, "epoch": None},
            epoch_marks="maximum", unstated={"period_d": 60.0, "epoch": 25.0},
            note="Neither period nor date carries an error.",
        ),
    ),
    confirmed=(0,), dating_d=(12.0, 18.0, 35.0), priority=4,
)  # fmt: skip

CINDER = SystemSpec(
    name="Cinder 1",
    aliases=("Cold Mesa II-01",),
    story="One episode in 1994 and more than thirty quiet years since: the period is only a lower limit.",
    cases=("period is a lower limit", "one episode only"),
    ra_deg=9.2833, dec_deg=-47.1527, distance_pc=3800.0, distance_error=500.0,
    star_a=_wr("WC7", 10.0, 2300.0), star_b=_o("O8 V", 21.0, 2500.0, 4.0e-7),
    period_yr=43.5, reference_cycle=0, reference_bmjd_tdb=year_to_bmjd(1994.3),
    eccentricity=0.70, omega_b_deg=255.0, inclination_deg=60.0, node_deg=300.0, gamma_kms=30.0,
    k_mag=8.74, colours=(0.90, 0.40, 0.45, 0.60),
    dust=DustSpec(
        "lag", -20.0, 110.0, 330.0, 20.0, 20.0, 40.0, rise="linear", contrast_k=1.7, decay_k_d=240.0,
    ),
    watch=WatchSpec((1, 3, 4), thinning=0.6),
    solutions=(
        SolutionSpec(
            "single episode", f"{_REPORT} 29", 2026.4, 0, {"epoch": 14.0}, epoch_marks="onset",
            period_limit_yr=32.0, note="No repeat in 32 years of survey and patrol.",
        ),
    ),
    confirmed=(0,), dating_d=(14.0, 16.0, 30.0), priority=4,
)  # fmt: skip

BRAZIER = SystemSpec(
    name="Brazier 6",
    aliases=("Cold Mesa II-06",),
    story="Dust dates and velocities give periods that disagree by several sigma; the forecast weighs both.",
    cases=("conflicting solutions", "phase rule"),
    ra_deg=217.4176, dec_deg=-33.8714, distance_pc=2200.0, distance_error=180.0,
    star_a=_wr("WC8", 14.0, 2000.0), star_b=_o("O7.5 V", 26.0, 2400.0),
    period_yr=8.85, reference_cycle=1, reference_bmjd_tdb=year_to_bmjd(2029.25),
    eccentricity=0.58, omega_b_deg=96.0, inclination_deg=44.0, node_deg=80.0, gamma_kms=-8.0,
    k_mag=7.33, colours=(0.95, 0.42, 0.45, 0.60),
    dust=DustSpec(
        "phase", -0.02, 0.03, 0.09, 9.0, 12.0, 22.0, rise="saturating", contrast_k=1.2, decay_k_d=120.0,
    ),
    watch=WatchSpec((1, 2, 3, 5), start_yr=1994.0),
    solutions=(
        SolutionSpec(
            "dust dates", f"{_REPORT} 27", 2021.9, 0,
            {"period_d": 9.0, "epoch": 11.0, "eccentricity": 0.05},
            weight=0.6, pull={"period_d": 0.9},
        ),
        SolutionSpec(
            "velocities", f"{_RIDGE} 3", 2013.6, -1,
            {"period_d": 26.0, "epoch": 14.0, "eccentricity": 0.03, "omega_deg": 5.0, "k_a_kms": 2.0},
            weight=0.4, pull={"period_d": -4.0}, calm=1.0, published_cycle_offset=5,
            note="Its error of the period is optimistic.",
        ),
    ),
    rule=RuleSpec(
        "phase", {"onset": 0.004, "maximum": 0.005, "end": 0.010},
        scatter_onset_d=10.0, scatter_maximum_d=12.0, scatter_end_d=20.0,
    ),
    confirmed=(-2, 0), dating_d=(7.0, 11.0, 20.0),
)  # fmt: skip

FLINT = SystemSpec(
    name="Flint 10",
    aliases=("Cold Mesa II-10",),
    story="Nobody has looked since 2002 and the period was rough: by now the phase is lost.",
    cases=("phase lost", "period only"),
    ra_deg=101.1738, dec_deg=-33.2417, distance_pc=4300.0, distance_error=800.0,
    star_a=_wr("WC9", 11.5, 1600.0), star_b=_o("O9.5 V", 22.0, 1900.0),
    period_yr=4.13, reference_cycle=0, reference_bmjd_tdb=year_to_bmjd(1997.3),
    eccentricity=0.35, omega_b_deg=188.0, inclination_deg=40.0, node_deg=10.0, gamma_kms=50.0,
    k_mag=9.36, colours=(1.70, 0.75, 0.75, 1.00),
    dust=DustSpec(
        "lag", -30.0, 40.0, 130.0, 14.0, 15.0, 20.0, rise="linear", contrast_k=0.9, decay_k_d=90.0,
    ),
    watch=WatchSpec((0, 1), stop_before_d=9050.0),
    solutions=(
        SolutionSpec(
            "survey 2002", f"{_REPORT} 9", 2002.3, 0, {"period_d": 42.0, "epoch": 20.0}, calm=1.0,
        ),
    ),
    rule=RuleSpec(
        "lag", {"onset": 15.0, "maximum": 15.0, "end": 25.0},
        scatter_onset_d=15.0, scatter_maximum_d=15.0, scatter_end_d=20.0,
    ),
    confirmed=(0, 1), dating_d=(14.0, 15.0, 25.0), priority=4,
)  # fmt: skip

SOOTFALL = SystemSpec(
    name="Sootfall 3",
    aliases=("Cold Mesa II-03",),
    story="The period's error has a long tail to late dates: the window opened last year and is still open.",
    cases=("asymmetric errors", "open now"),
    ra_deg=144.3927, dec_deg=-27.4618, distance_pc=2700.0, distance_error=(260.0, 340.0),
    star_a=_wr("WC8", 13.0, 1850.0), star_b=_o("O8 III", 29.0, 2200.0),
    period_yr=21.6, reference_cycle=1, reference_bmjd_tdb=_A + 155.0,
    eccentricity=0.33, omega_b_deg=330.0, inclination_deg=63.0, node_deg=170.0, gamma_kms=17.0,
    k_mag=7.79, colours=(0.85, 0.38, 0.42, 0.55),
    dust=DustSpec(
        "phase", -0.012, 0.025, 0.08, 12.0, 20.0, 40.0, rise="linear", contrast_k=1.0, decay_k_d=260.0,
        onset_shift_d={1: 0.0},
    ),
    watch=WatchSpec(
        (0, 1, 3, 5), start_yr=1988.0,
        visits_before_d=(96.0, 80.0, 66.0, 51.0, 37.0, 22.0, 8.0),
    ),
    solutions=(
        SolutionSpec(
            "orbit 2018", f"{_RIDGE} 9", 2018.2, 0,
            {
                "period_d": (90.0, 160.0), "epoch": (26.0, 34.0), "eccentricity": (0.04, 0.06),
                "omega_deg": 12.0,
            },
            calm=0.3,
        ),
    ),
    rule=RuleSpec(
        "phase", {"onset": 0.003, "maximum": (0.003, 0.005), "end": (0.008, 0.012)},
        scatter_onset_d=20.0, scatter_maximum_d=25.0, scatter_end_d=40.0,
    ),
    confirmed=(0,), dating_d=(10.0, 15.0, 30.0), priority=1,
)  # fmt: skip

TINDER = SystemSpec(
    name="Tinder 12",
    aliases=("Cold Mesa II-12",),
    story="Late: the forecast window closed in December, yet monthly photometry shows the star quiet.",
    cases=("late", "lag rule"),
    ra_deg=130.2618, dec_deg=-66.3147, distance_pc=3100.0, distance_error=350.0,
    star_a=_wr("WC7", 14.0, 2400.0), star_b=_o("O7 III", 30.0, 2600.0),
    period_yr=13.2, reference_cycle=1, reference_bmjd_tdb=_A + 20.0,
    eccentricity=0.52, omega_b_deg=64.0, inclination_deg=55.0, node_deg=230.0, gamma_kms=-22.0,
    k_mag=7.94, colours=(0.75, 0.34, 0.36, 0.48),
    dust=DustSpec(
        "lag", -40.0, 70.0, 220.0, 22.0, 20.0, 30.0, rise="fast", contrast_k=1.3, decay_k_d=150.0,
        onset_shift_d={1: 60.0},
    ),
    watch=WatchSpec(
        (1, 3, 5), start_yr=1996.0,
        visits_before_d=(310.0, 283.0, 255.0, 227.0, 199.0, 171.0, 143.0, 116.0, 88.0, 60.0, 33.0, 5.0),
    ),
    solutions=(
        SolutionSpec(
            "orbit 2015", f"{_REPORT} 24", 2015.1, 0,
            {"period_d": 34.0, "epoch": 12.0, "eccentricity": 0.04, "omega_deg": 6.0},
            pull={"period_d": -3.6}, calm=0.4, note="From one cycle: the error of the period is optimistic.",
        ),
    ),
    rule=RuleSpec(
        "lag", {"onset": 10.0, "maximum": 12.0, "end": 25.0},
        scatter_onset_d=20.0, scatter_maximum_d=20.0, scatter_end_d=30.0,
    ),
    confirmed=(-1, 0), dating_d=(8.0, 12.0, 25.0), priority=1,
)  # fmt: skip

HOLLOW = SystemSpec(
    name="Hollow 2",
    aliases=("Cold Mesa II-13", "Hollow"),
    story="Unseen: the episode was due around New Year behind the Sun, and nobody has looked since October.",
    cases=("unseen", "lag rule"),
    ra_deg=237.9342, dec_deg=-14.2716, distance_pc=4800.0, distance_error=900.0,
    star_a=_wr("WC6", 12.0, 2700.0), star_b=_o("O6.5 V", 32.0, 2800.0),
    period_yr=10.4, reference_cycle=1, reference_bmjd_tdb=_A - 68.0,
    eccentricity=0.72, omega_b_deg=20.0, inclination_deg=47.0, node_deg=55.0, gamma_kms=-60.0,
    k_mag=10.21, colours=(4.20, 1.70, 0.80, 1.10),
    dust=DustSpec(
        "lag", -18.0, 15.0, 48.0, 5.0, 5.0, 8.0, rise="fast", contrast_k=2.4, decay_k_d=60.0,
        onset_shift_d={1: 0.0},
    ),
    watch=WatchSpec((1, 3, 5), start_yr=1994.0, stop_before_d=140.0),
    solutions=(
        SolutionSpec(
            "orbit 2020", f"{_CIRCULAR} 39", 2020.1, 0,
            {"period_d": 9.0, "epoch": 5.0, "eccentricity": 0.02, "omega_deg": 3.0}, calm=0.6,
        ),
    ),
    rule=RuleSpec(
        "lag", {"onset": 5.0, "maximum": 5.0, "end": 9.0},
        scatter_onset_d=5.0, scatter_maximum_d=5.0, scatter_end_d=8.0,
    ),
    confirmed=(-2, -1, 0), dating_d=(4.0, 5.0, 10.0), priority=2,
)  # fmt: skip

CANDLEWOOD = SystemSpec(
    name="Candlewood 5",
    aliases=("Cold Mesa II-11",),
    story="Suspected: the last two points, two weeks apart, are both too bright and nobody has said why.",
    cases=("suspected", "lag rule"),
    ra_deg=158.7693, dec_deg=8.1874, distance_pc=2050.0, distance_error=170.0,
    star_a=_wr("WC8", 12.0, 1950.0), star_b=_o("O8 V", 24.0, 2300.0),
    period_yr=12.1, reference_cycle=1, reference_bmjd_tdb=_A - 10.0,
    eccentricity=0.50, omega_b_deg=132.0, inclination_deg=38.0, node_deg=88.0, gamma_kms=3.0,
    k_mag=7.02, colours=(0.78, 0.35, 0.38, 0.50),
    dust=DustSpec(
        "lag", -30.0, 120.0, 270.0, 12.0, 16.0, 30.0, rise="linear", contrast_k=1.6, decay_k_d=180.0,
        onset_shift_d={1: 0.0},
    ),
    watch=WatchSpec((0, 1, 3, 5), start_yr=1989.0, stop_before_d=55.0, visits_before_d=(52.0, 21.0, 6.0)),
    solutions=(
        SolutionSpec(
            "dust dates 2016", f"{_REPORT} 25", 2016.7, 0,
            {"period_d": 38.0, "epoch": 14.0, "eccentricity": 0.08, "omega_deg": 10.0}, calm=1.0,
        ),
    ),
    rule=RuleSpec(
        "lag", {"onset": 18.0, "maximum": 20.0, "end": 40.0},
        scatter_onset_d=15.0, scatter_maximum_d=15.0, scatter_end_d=30.0,
    ),
    confirmed=(-1, 0), dating_d=(7.0, 12.0, 25.0), priority=1,
)  # fmt: skip

MARROW = SystemSpec(
    name="Marrow 4",
    aliases=("Cold Mesa II-14",),
    story="Retired: the one brightening turned out to be a neighbour in the beam; the star makes no dust.",
    cases=("retired",),
    ra_deg=15.2714, dec_deg=27.4139, distance_pc=1800.0, distance_error=150.0,
    star_a=_wr("WN6", 18.0, 1700.0), star_b=_o("O9 V", 22.0, 2000.0),
    period_yr=5.2, reference_cycle=0, reference_bmjd_tdb=year_to_bmjd(1999.4),
    eccentricity=0.22, omega_b_deg=10.0, inclination_deg=70.0, node_deg=15.0, gamma_kms=-10.0,
    k_mag=6.44, colours=(0.30, 0.15, 0.22, 0.30),
    dust=DustSpec("none"),
    watch=WatchSpec((0, 1), stop_before_d=6500.0, thinning=0.5),
    solutions=(
        SolutionSpec(
            "velocities 2001", "Ninefold Flat leaflet 5", 2001.0, 0,
            {"period_d": 30.0, "epoch": 25.0, "eccentricity": 0.06, "omega_deg": 15.0, "k_a_kms": 3.0},
        ),
    ),
    rejected=(0,), state="retired", priority=5,
    notes="Retired in 2009: the brightening of 1999 came from a neighbour 6 arcsec away.",
)  # fmt: skip

HEARTH = SystemSpec(
    name="Hearth 9",
    aliases=("Cold Mesa II-15",),
    story="A candidate: one brightening proposed, no elements, no spectrum of the second star.",
    cases=("candidate without elements",),
    ra_deg=314.2683, dec_deg=-21.3759, distance_pc=3600.0, distance_error=None,
    star_a=_wr("WC9", 10.0, 1500.0), star_b=_o("O9.5 V", 20.0, 1900.0),
    period_yr=19.3, reference_cycle=0, reference_bmjd_tdb=year_to_bmjd(2018.7),
    eccentricity=0.60, omega_b_deg=140.0, inclination_deg=30.0, node_deg=0.0, gamma_kms=0.0,
    k_mag=9.88, colours=(2.10, 0.90, 0.85, 1.15),
    dust=DustSpec(
        "lag", 0.0, 90.0, 200.0, 10.0, 10.0, 20.0, rise="saturating", contrast_k=0.5, decay_k_d=120.0,
    ),
    watch=WatchSpec((3, 4), start_yr=2014.0, thinning=0.7),
    proposed=(0,), dating_d=(15.0, 20.0, 35.0), state="candidate", priority=5,
)  # fmt: skip

BRINK = SystemSpec(
    name="Brink 2",
    aliases=("Cold Mesa II-16",),
    story="Periastron only just reaches the separation at which dust forms: some cycles pass without any.",
    cases=("critical separation near periastron distance", "separation rule"),
    ra_deg=350.3129, dec_deg=8.5736, distance_pc=1400.0, distance_error=60.0,
    star_a=_wr("WC7", 12.0, 2200.0), star_b=_o("O7 V", 24.0, 2500.0),
    period_yr=6.9, reference_cycle=1, reference_bmjd_tdb=year_to_bmjd(2029.5),
    eccentricity=0.52, omega_b_deg=285.0, inclination_deg=41.0, node_deg=33.0, gamma_kms=8.0,
    k_mag=6.27, colours=(0.62, 0.28, 0.33, 0.43),
    dust=DustSpec(
        "separation", critical_separation_au=5.80, critical_scatter_au=0.12, condensation_distance_au=60.0,
        flow_speed_kms=1800.0, scatter_onset_d=4.0, scatter_maximum_d=6.0, scatter_end_d=8.0,
        rise="linear", contrast_k=0.7, decay_k_d=80.0,
    ),
    watch=WatchSpec((0, 1, 2, 3), start_yr=1988.0),
    solutions=(
        SolutionSpec(
            "visual orbit 2023", f"{_RIDGE} 14", 2023.8, 0,
            {
                "period_d": 8.0, "epoch": 9.0, "eccentricity": 0.018, "omega_deg": 4.0,
                "inclination_deg": 3.0, "node_deg": 3.0, "a_au": 0.25, "a_arcsec": 0.00012,
            },
            omega_of="B", calm=0.8,
        ),
    ),
    rule=RuleSpec(
        "separation",
        {"critical_separation_au": 0.30, "condensation_distance_au": 10.0, "flow_speed_kms": 150.0},
        scatter_onset_d=6.0, scatter_maximum_d=8.0, scatter_end_d=10.0,
    ),
    confirmed=(-5, -4, -3, -2, -1, 0), dating_d=(7.0, 10.0, 18.0), stars_known=True, positions=14,
)  # fmt: skip

SYSTEMS: tuple[SystemSpec, ...] = (
    KETTLE, THISTLE, BELLOWS, QUILL, TALLOW, ANVIL, CINDER, BRAZIER,
    FLINT, SOOTFALL, TINDER, HOLLOW, CANDLEWOOD, MARROW, HEARTH, BRINK,
)  # fmt: skip

# Every case that the sample promises, each held by at least one system.
CASES: tuple[str, ...] = (
    "high e", "low e", "separation rule", "phase rule", "lag rule", "learned rule with orbit",
    "learned rule with episodes only", "period only", "period is a lower limit", "one episode only",
    "conflicting solutions", "phase lost", "asymmetric errors", "under way", "late", "unseen", "suspected",
    "open now", "retired", "candidate without elements", "missing error",
    "critical separation near periastron distance",
)  # fmt: skip
