"""Invented systems and observations that the tests of the catalogue share."""

from __future__ import annotations

from datetime import UTC, datetime, timedelta

from campaign.model.instants import Moment
from campaign.model.measured import Covariance, Limit, Measured, Range
from campaign.model.observations import Observation
from campaign.model.systems import DatedEvent, DustRule, Episode, Site, Solution, Star, System

FIRST = datetime(2031, 4, 7, 3, 12, 10, 123456, tzinfo=UTC)


def later(days: float) -> datetime:
    return FIRST + timedelta(days=days)


def moment(bmjd_tdb: float = 61234.123456789, error_d: float | None = 0.5) -> Moment:
    return Moment(bmjd_tdb, error_d, error_d, "BJD 2461234.62±0.5", "tdb", "barycentre")


def star(name: str) -> Star:
    return Star(
        name,  # type: ignore[arg-type]
        spectral_type="WC7" if name == "A" else "O5 V",
        mass_msun=Measured(13.1, 0.7, 1.1),
        luminosity_lsun=Measured(3.3e5),
        temperature_k=Measured(60_000.0, 5_000.0, 5_000.0),
        radius_rsun=Measured(6.0, 0.0, 0.0),
        mass_loss_msun_yr=Measured(1.7e-5, 3e-6, None),
        wind_speed_kms=Measured(2_860.0, 60.0, 60.0),
    )


def full_system(name: str = "Lantern 3") -> System:
    return System(
        id=0,
        name=name,
        ra_deg=270.63125,
        dec_deg=-45.20833333333333,
        position_epoch_jyr=2016.0,
        pm_ra_cosdec_mas_yr=-4.7,
        pm_dec_mas_yr=1.25,
        distance_pc=Measured(2_100.0, 180.0, 220.0),
        parallax_mas=Measured(-0.02, 0.04, 0.04),
        state="candidate",
        priority=2,
        notes="first line\nsecond line",
        aliases=(f"{name} of the Net", f"{name} Åse"),
        star_a=star("A"),
        star_b=star("B"),
    )


def bare_system(name: str) -> System:
    return System(id=0, name=name, ra_deg=10.0, dec_deg=20.0)


def full_solution(system_id: int, label: str = "Orrery 2029") -> Solution:
    return Solution(
        id=0,
        system_id=system_id,
        label=label,
        period_d=Measured(3127.5, 0.3, 0.4),
        epoch=moment(),
        epoch_marks="A in front",
        eccentricity=Measured(0.71, 0.02, 0.02),
        omega_deg=Measured(143.0, 2.0, 2.0),
        omega_of="B",
        inclination_deg=Measured(119.0),
        node_deg=Measured(-12.0, 1.0, 1.0),
        k_a_kms=Measured(30.5, 1.5, 1.5),
        k_b_kms=Measured(75.25, 1.0, 1.0),
        gamma_kms=Measured(-8.0, 0.5, 0.5),
        a_au=Measured(14.0, 0.5, 0.5),
        a_arcsec=Measured(0.0067, 0.0003, 0.0003),
        covariance=Covariance(("period_d", "epoch"), ((0.09, -0.05), (-0.05, 0.25))),
        source="Orrery & Quill 2029",
        data_until_bmjd_tdb=61000.25,
        epoch_cycle=3,
        published_cycle_offset=-2,
        note="one line",
    )


def limit_solution(system_id: int) -> Solution:
    return Solution(0, system_id, "limit", period_d=Limit(11_688.0, "above", 2.0), epoch=moment())


def range_solution(system_id: int) -> Solution:
    return Solution(0, system_id, "range", period_d=Range(9_000.0, 12_000.0))


def full_rule(system_id: int) -> DustRule:
    return DustRule(
        id=0,
        system_id=system_id,
        kind="separation",
        onset=Measured(-40.0, 10.0, 12.0),
        maximum=Measured(20.0, 5.0, 5.0),
        end=Measured(120.0),
        critical_separation_au=Measured(6.4, 0.8, 0.8),
        condensation_distance_au=Measured(100.0, 20.0, 20.0),
        flow_speed_kms=Measured(2_000.0, 200.0, 200.0),
        maximum_lag_d=Measured(33.0, 3.0, 3.0),
        scatter_onset_d=4.0,
        scatter_maximum_d=5.0,
        scatter_end_d=0.0,
        note="invented",
    )


def full_episode(system_id: int) -> Episode:
    return Episode(
        id=0,
        system_id=system_id,
        cycle=-1,
        state="confirmed",
        onset=DatedEvent(moment(58107.0, 3.0), "K", "broken line"),
        maximum=DatedEvent(moment(58180.5, None), "L", None),
        end=DatedEvent(moment(58300.0, 20.0)),
        source="Orrery & Quill 2029",
        note="seen through cloud",
    )


def full_site(name: str = "Cold Mesa") -> Site:
    return Site(
        id=0,
        name=name,
        kind="ground",
        latitude_deg=-31.25,
        longitude_deg_east=-70.75,
        height_m=2_450.0,
        horizon_deg=20.0,
        time_zone="America/Santiago",
        notes="two domes",
    )


def space_site() -> Site:
    return Site(id=0, name="High Kite", kind="space", elongation_min_deg=85.0, elongation_max_deg=135.0)


def photometry(system_id: int, bmjd_tdb: float = 61500.1, **changes: object) -> Observation:
    values: dict[str, object] = {
        "id": 0,
        "uid": "",
        "system_id": system_id,
        "kind": "photometry",
        "moment": Moment(bmjd_tdb, 0.001, 0.001, "2027-04-17T02:24:00Z", "utc", "observatory"),
        "value": Measured(7.31, 0.03, 0.03),
        "unit": "mag",
        "band": "K",
        "photometric_system": "Vega",
    }
    return Observation(**(values | changes))  # type: ignore[arg-type]


def every_kind(system_id: int, site_id: int) -> list[Observation]:
    """One observation of each kind, every field of the model used at least once."""
    when = Moment(61500.1, None, None, "2027-04-17/18", "utc", "geocentre")
    common = {"id": 0, "uid": "", "system_id": system_id, "moment": when}
    return [
        photometry(
            system_id,
            limit_side="above",
            limit_sigma=3.0,
            value=Measured(12.1),
            site_id=site_id,
            observer="Ida Vik",
            instrument="cam 2",
            comparison_star="C 17",
            source="Night book 12",
            quality="doubtful",
            text="thin cloud\nmoon",
        ),
        Observation(**common, kind="flux", value=Measured(0.012, 0.001, 0.002), unit="jy", frequency_ghz=8.6),
        Observation(
            **common,
            kind="flux",
            value=Measured(1.5e-6),
            unit="jy",
            energy_low_kev=0.5,
            energy_high_kev=10.0,
        ),
        Observation(**common, kind="velocity", value=Measured(-33.0, 2.0, 2.0), unit="kms", star="A"),
        Observation(**common, kind="line", value=Measured(-21.0, 1.0, 1.0), unit="angstrom", species="He I"),
        Observation(
            **common,
            kind="position",
            value=Measured(13.0, 0.1, 0.1),
            unit="mas",
            position_angle_deg=Measured(152.0, 0.5, 0.5),
            correlation=-0.3,
        ),
        Observation(
            **common,
            kind="shell",
            value=Measured(1.2, 0.05, 0.05),
            unit="arcsec",
            position_angle_deg=Measured(90.0),
            feature="ring",
            measured_at="edge",
            plate_scale_error=0.002,
            shell_index=2,
        ),
        Observation(**common, kind="attempt", text="wind above limit"),
        Observation(**common, kind="remark", text="looks redder"),
    ]
