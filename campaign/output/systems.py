"""What the catalogue holds, on the screen and as JSON: systems, solutions, rules, sites, episodes."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from campaign.model.measured import Measured
from campaign.model.records import SystemRecord
from campaign.model.shown import DerivedValue, ShownSystem
from campaign.model.systems import DatedEvent, DustRule, Episode, Site, Solution, Star
from campaign.output.console import Screen
from campaign.output.documents import document, plain
from campaign.output.tables import Column, print_table
from campaign.output.values import calendar_day, dated, epoch, number, period_in_years, sexagesimal

_SYSTEMS = (
    Column("system", shrinks=True, min_width=12),
    Column("state"),
    Column("priority", align="right", drop=5),
    Column("RA"),
    Column("Dec"),
    Column("period", shrinks=True, drop=1, min_width=12),
    Column("rule", drop=2),
    Column("episodes", align="right", drop=3),
    Column("adopted solution", shrinks=True, drop=4, min_width=10),
)
_SOLUTIONS = (
    Column("solution", shrinks=True, min_width=10),
    Column("adopted"),
    Column("period", shrinks=True, min_width=14),
    Column("epoch", shrinks=True, drop=1, min_width=14),
    Column("marks", drop=4),
    Column("e", drop=2),
    Column("omega", drop=3),
    Column("source", shrinks=True, drop=5, min_width=10),
)
_ELEMENTS = (
    Column("element"),
    Column("value", shrinks=True, min_width=16),
    Column("note", shrinks=True, drop=1),
)
_DERIVED = (
    Column("follows"),
    Column("value", shrinks=True, min_width=16),
    Column("from", shrinks=True, drop=1),
)
_SITES = (
    Column("site", shrinks=True, min_width=10),
    Column("kind"),
    Column("latitude", align="right"),
    Column("longitude E", align="right"),
    Column("height m", align="right", drop=1),
    Column("horizon", align="right", drop=3),
    Column("from the Sun", drop=2),
    Column("time zone", drop=4),
)
_EPISODES = (
    Column("N", align="right", drop=4),
    Column("system", shrinks=True, min_width=10),
    Column("cycle", align="right"),
    Column("state", drop=3),
    Column("onset", shrinks=True, min_width=12),
    Column("maximum", shrinks=True, min_width=12, drop=1),
    Column("end", shrinks=True, min_width=12, drop=2),
    Column("source", shrinks=True, drop=5, min_width=10),
)


# ------------------------------------------------------------------------------------------ systems


def render_systems(screen: Screen, records: Sequence[SystemRecord]) -> None:
    """One line a system."""
    if not records:
        screen.wrapped(
            'No system is under watch yet. Add one with: campaign system add "NAME" --ra ... --dec ...'
        )
        return
    print_table(screen, _SYSTEMS, [_system_row(record) for record in records])


def _system_row(record: SystemRecord) -> tuple[str, ...]:
    system = record.system
    adopted = [s for s in record.solutions if s.adopted]
    confirmed = sum(1 for e in record.episodes if e.state == "confirmed")
    return (
        system.name,
        system.state,
        str(system.priority),
        sexagesimal(system.ra_deg, hours=True),
        sexagesimal(system.dec_deg, hours=False),
        period_in_years(adopted[0].period_d) if adopted else "",
        record.rule.kind if record.rule is not None else "",
        str(confirmed or ""),
        " + ".join(s.label for s in adopted),
    )


def systems_json(records: Sequence[SystemRecord], as_of: str) -> str:
    """Document ``system-list``."""
    return document("system-list", {"systems": [_record(r) for r in records]}, as_of=as_of)


def _record(record: SystemRecord) -> dict[str, Any]:
    data: dict[str, Any] = plain(record)
    for key in ("id", "cycle_anchor_period_d"):
        data["system"].pop(key, None)
    return data


def render_system(screen: Screen, shown: ShownSystem) -> None:
    """Everything known of one system."""
    record = shown.record
    system = record.system
    screen.heading(system.name)
    where = f"{sexagesimal(system.ra_deg, hours=True)} {sexagesimal(system.dec_deg, hours=False)}"
    lines = [f"{system.state}, priority {system.priority}; {where} ICRS, epoch {system.position_epoch_jyr:g}"]
    if system.pm_ra_cosdec_mas_yr is not None or system.pm_dec_mas_yr is not None:
        ra, dec = (
            "unknown" if pm is None else f"{pm:+g}".replace("-", "−")
            for pm in (system.pm_ra_cosdec_mas_yr, system.pm_dec_mas_yr)
        )
        lines.append(f"proper motion {ra} mas/yr in RA times cos(dec), {dec} mas/yr in declination")
    if system.aliases:
        lines.append(f"also known as: {', '.join(system.aliases)}")
    if system.distance_pc is not None:
        lines.append(f"distance {number(system.distance_pc, 'pc')}")
    if system.parallax_mas is not None:
        lines.append(f"parallax {number(system.parallax_mas, 'mas')}")
    if system.notes:
        lines.append(system.notes)
    for line in lines:
        screen.wrapped(line)
    _render_stars(screen, (system.star_a, system.star_b))
    if record.solutions:
        screen.line("")
        screen.heading("Solutions")
        print_table(screen, _SOLUTIONS, [_solution_row(s) for s in record.solutions])
    screen.line("")
    if not record.solutions and not record.episodes:
        screen.wrapped(
            "No solution and no episode: nothing is forecast yet. "
            f'Add one with: campaign solution add "{system.name}" --period ... --epoch ... --adopt'
        )
    _render_rule_lines(screen, record.rule)
    if record.episodes:
        screen.line("")
        screen.heading("Episodes")
        print_table(screen, _EPISODES, [_episode_row(system.name, e) for e in record.episodes])
    if shown.derived:
        screen.line("")
        _render_derived(screen, shown.derived)
    screen.line("")
    counts = ", ".join(_counted(n, kind) for kind, n in sorted(shown.observation_counts.items()))
    screen.wrapped(f"Logged: {counts or 'nothing yet'}.")


def _counted(count: int, kind: str) -> str:
    """So many of a kind, in words."""
    if kind == "photometry":
        return f"{count} magnitude" + ("s" if count != 1 else "")
    plural = {"velocity": "velocities", "flux": "fluxes"}.get(kind, kind + "s")
    return f"{count} {kind if count == 1 else plural}"


def _render_stars(screen: Screen, stars: Sequence[Star]) -> None:
    for star in stars:
        parts = [
            star.spectral_type or "",
            number(star.mass_msun, "Msun"),
            number(star.luminosity_lsun, "Lsun"),
            number(star.temperature_k, "K"),
            number(star.radius_rsun, "Rsun"),
            f"{number(star.mass_loss_msun_yr, 'Msun/yr')} lost" if star.mass_loss_msun_yr else "",
            f"wind {number(star.wind_speed_kms, 'km/s')}" if star.wind_speed_kms else "",
        ]
        known = ", ".join(part for part in parts if part)
        if known:
            screen.wrapped(f"star {star.star}: {known}", hang=8)


def system_json(shown: ShownSystem, as_of: str) -> str:
    """Document ``system``."""
    data = _record(shown.record)
    data["derived"] = plain(shown.derived)
    data["observation_counts"] = dict(shown.observation_counts)
    return document("system", data, as_of=as_of)


# ---------------------------------------------------------------------------------------- solutions


def render_solutions(screen: Screen, record: SystemRecord) -> None:
    """The solutions of a system side by side."""
    if not record.solutions:
        name = record.system.name
        screen.wrapped(
            f"{name} has no solution yet. Add one with: "
            f'campaign solution add "{name}" --period ... --epoch ... --adopt'
        )
        return
    print_table(screen, _SOLUTIONS, [_solution_row(s) for s in record.solutions])


def _solution_row(solution: Solution) -> tuple[str, ...]:
    adopted = (
        "" if not solution.adopted else ("yes" if solution.weight is None else f"weight {solution.weight:g}")
    )
    omega = number(solution.omega_deg)
    return (
        solution.label,
        adopted,
        number(solution.period_d, "d"),
        epoch(solution.epoch),
        solution.epoch_marks if solution.epoch is not None else "",
        number(solution.eccentricity),
        f"{omega} of {solution.omega_of}" if omega else "",
        solution.source,
    )


def solutions_json(record: SystemRecord, as_of: str) -> str:
    """Document ``solution-list``."""
    data = {"system": record.system.name, "solutions": plain(record.solutions)}
    return document("solution-list", data, as_of=as_of)


def render_solution(
    screen: Screen, record: SystemRecord, solution: Solution, derived: Sequence[DerivedValue]
) -> None:
    """One solution, element by element, and what follows from it."""
    screen.heading(f"{record.system.name}, {solution.label}")
    if solution.source:
        screen.wrapped(solution.source)
    rows = [row for row in _element_rows(solution) if row[1]]
    print_table(screen, _ELEMENTS, rows)
    if solution.covariance is not None:
        names = ", ".join(solution.covariance.names)
        screen.wrapped(f"Correlated errors are kept for: {names}.")
    if derived:
        screen.line("")
        _render_derived(screen, derived)


def _element_rows(solution: Solution) -> list[tuple[str, str, str]]:
    counts = []
    if solution.epoch_cycle is not None:
        counts.append(f"cycle {solution.epoch_cycle} of the system")
    if solution.published_cycle_offset is not None:
        counts.append(f"cycle {(solution.epoch_cycle or 0) + solution.published_cycle_offset} of the source")
    cycle = ", ".join(counts)
    typed = f"typed as {solution.epoch.text}" if solution.epoch is not None and solution.epoch.text else ""
    return [
        ("period", number(solution.period_d, "d"), period_in_years(solution.period_d)),
        (f"epoch ({solution.epoch_marks})", epoch(solution.epoch), "; ".join(x for x in (cycle, typed) if x)),
        ("eccentricity", number(solution.eccentricity), ""),
        ("omega", number(solution.omega_deg, "deg"), f"of star {solution.omega_of}"),
        ("inclination", number(solution.inclination_deg, "deg"), ""),
        ("node", number(solution.node_deg, "deg"), "where B recedes from A"),
        ("K of star A", number(solution.k_a_kms, "km/s"), ""),
        ("K of star B", number(solution.k_b_kms, "km/s"), ""),
        ("systemic velocity", number(solution.gamma_kms, "km/s"), ""),
        ("semi-major axis", number(solution.a_au, "au"), ""),
        ("semi-major axis", number(*_small_angle(solution.a_arcsec)), ""),
        ("data until", _until(solution), ""),
        ("note", solution.note, ""),
    ]


def _small_angle(angle: Measured | None) -> tuple[Measured | None, str]:
    """An angle and its unit: below a tenth of an arcsec in mas, as it is published."""
    if angle is None or angle.value >= 0.1:
        return angle, "arcsec"
    return angle.scaled(1000.0), "mas"


def _until(solution: Solution) -> str:
    until = solution.data_until_bmjd_tdb
    return "" if until is None else calendar_day(until)


def _render_derived(screen: Screen, derived: Sequence[DerivedValue]) -> None:
    print_table(screen, _DERIVED, [(d.quantity, number(d.value, d.unit), d.how) for d in derived])


def solution_json(
    record: SystemRecord, solution: Solution, derived: Sequence[DerivedValue], as_of: str
) -> str:
    """Document ``solution``."""
    data = {"system": record.system.name, "solution": plain(solution), "derived": plain(tuple(derived))}
    return document("solution", data, as_of=as_of)


# -------------------------------------------------------------------------------------------- rules


def render_rule(screen: Screen, name: str, rule: DustRule | None) -> None:
    """A system's dust rule."""
    screen.heading(name)
    _render_rule_lines(screen, rule)


def _render_rule_lines(screen: Screen, rule: DustRule | None) -> None:
    if rule is None:
        screen.wrapped("No dust rule: no onset, maximum or end is forecast from the orbit.")
        return
    unit = "P" if rule.kind == "phase" else "d"
    rows = [
        ("rule", rule.kind, rule.note),
        ("onset", _offset(rule.onset, unit), "from periastron"),
        ("maximum", _offset(rule.maximum, unit), "from periastron"),
        ("end", _offset(rule.end, unit), "from periastron"),
        ("critical separation", number(rule.critical_separation_au, "au"), "dust is made while nearer"),
        ("condensation distance", number(rule.condensation_distance_au, "au"), "from the collision"),
        ("flow speed", number(rule.flow_speed_kms, "km/s"), ""),
        ("lag of the maximum", number(rule.maximum_lag_d, "d"), "from periastron"),
        ("scatter of the onset", _scatter(rule.scatter_onset_d), "cycle to cycle"),
        ("scatter of the maximum", _scatter(rule.scatter_maximum_d), "cycle to cycle"),
        ("scatter of the end", _scatter(rule.scatter_end_d), "cycle to cycle"),
    ]
    print_table(screen, (Column("dust rule"), *_ELEMENTS[1:]), [row for row in rows if row[1]])


def _offset(value: Measured | None, unit: str) -> str:
    return number(value, unit)


def _scatter(days: float | None) -> str:
    return "" if days is None else f"{days:g} d"


def rule_json(name: str, rule: DustRule | None, as_of: str) -> str:
    """Document ``rule``."""
    return document("rule", {"system": name, "rule": plain(rule)}, as_of=as_of)


# -------------------------------------------------------------------------------- sites and episodes


def render_sites(screen: Screen, sites: Sequence[Site]) -> None:
    """One line a site."""
    if not sites:
        screen.wrapped('No site yet. Add one with: campaign site add "NAME" --latitude ... --longitude ...')
        return
    rows = [
        (
            site.name,
            site.kind,
            "" if site.latitude_deg is None else f"{site.latitude_deg:+.4f}",
            "" if site.longitude_deg_east is None else f"{site.longitude_deg_east:+.4f}",
            "" if site.height_m is None else f"{site.height_m:g}",
            "" if site.horizon_deg is None else f"{site.horizon_deg:g}",
            ""
            if site.elongation_min_deg is None
            else f"{site.elongation_min_deg:g} to {site.elongation_max_deg:g} deg",
            site.time_zone or "",
        )
        for site in sites
    ]
    print_table(screen, _SITES, rows)


def sites_json(sites: Sequence[Site], as_of: str) -> str:
    """Document ``site-list``."""
    return document("site-list", {"sites": plain(list(sites))}, as_of=as_of)


def render_episodes(screen: Screen, found: Sequence[tuple[str, Episode]]) -> None:
    """One line an episode."""
    if not found:
        screen.wrapped('No episode yet. Add one with: campaign episodes add "SYSTEM" --onset 2019-03-14±5')
        return
    print_table(screen, _EPISODES, [_episode_row(name, episode) for name, episode in found])


def _episode_row(name: str, episode: Episode) -> tuple[str, ...]:
    return (
        str(episode.id),
        name,
        "" if episode.cycle is None else str(episode.cycle),
        episode.state,
        _dated(episode.onset),
        _dated(episode.maximum),
        _dated(episode.end),
        episode.source,
    )


def _dated(event: DatedEvent | None) -> str:
    if event is None:
        return ""
    return dated(event.moment) + (f" in {event.band}" if event.band else "")


def episodes_json(found: Sequence[tuple[str, Episode]], as_of: str) -> str:
    """Document ``episode-list``."""
    return document("episode-list", {"episodes": [{"system": n} | plain(e) for n, e in found]}, as_of=as_of)
