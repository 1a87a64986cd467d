"""Dust of a system on the screen and as a JSON document."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import replace
from typing import Any

from campaign.model.dust import (
    BandExcess,
    CondensationAt,
    DustPhysics,
    DustResult,
    DustThrough,
    DustVerdict,
    GrainAt,
    MeasuredDust,
    PairColour,
)
from campaign.model.propagated import Propagated
from campaign.output.console import Screen
from campaign.output.documents import document, plain
from campaign.output.dust_picture import amount_bar, render_zones, share_bar
from campaign.output.propagated import mostly, told
from campaign.output.tables import Cell, Column, print_table
from campaign.output.values import number
from campaign.output.wording import UTC_NOTE, day

_QUANTITIES = (
    Column("quantity"),
    Column("median, 68 %"),
    Column("95 %", drop=2),
    Column("mostly from", shrinks=True, min_width=30, drop=1),
)
_INPUTS = (
    Column("what went in", shrinks=True, min_width=16),
    Column("value"),
    Column("from"),
    Column("note", shrinks=True, min_width=10, drop=1),
)


def render_dust(screen: Screen, result: DustResult) -> None:
    """Write grains in starlight, or what the photometry shows at a date or through an episode."""
    when = ""
    if result.measured is not None:
        when = f" near {day(result.measured.utc, result.measured.bmjd_tdb)}"
        if result.measured.within_d is not None:
            when += f" (± {result.measured.within_d:.4g} d)"
    elif result.through is not None:
        when = " through an episode" if result.through.cycle is None else f" in cycle {result.through.cycle}"
    screen.heading(f"Dust of {result.system}{when}")
    for line in result.warnings:
        screen.wrapped(line, label="- Warning: ", hang=2, style="bold yellow")
    screen.line("")
    if result.physics is not None:
        _render_physics(screen, result.physics)
    if result.measured is not None:
        _render_measured(screen, result.measured)
    if result.through is not None:
        _render_through(screen, result.through)
    if result.inputs:
        screen.line("")
        rows = [(one.name, number(one.value, one.unit), one.origin, one.note) for one in result.inputs]
        print_table(screen, _INPUTS, rows)
    screen.line("")
    dated = [UTC_NOTE] if result.measured is not None or result.through is not None else []
    for line in (*result.assumptions, *dated):
        screen.wrapped(line, label="- ", hang=2)


def dust_json(result: DustResult) -> str:
    """The whole document ``campaign/dust/1``."""
    data: dict[str, Any] = plain(result)
    for name in ("as_of_utc", "warnings"):
        del data[name]
    for epoch in [data["measured"], *(data["through"] or {}).get("epochs", [])]:
        if epoch is not None:
            epoch["is_meaningless"] = any(verdict["meaningless"] for verdict in epoch["verdicts"])
    if data["measured"] is not None or data["through"] is not None:
        data["assumptions"].append(UTC_NOTE)
    return document("dust", data, as_of=result.as_of_utc, warnings=result.warnings)


# --------------------------------------------------------------------------------------------- starlight

_GRAINS = (
    Column("au", align="right", name="distance"),
    Column("grains, K", align="right"),
    Column("95 %", align="right", drop=2),
    Column("mostly from", shrinks=True, min_width=12, drop=1),
)
_CONDENSATION = (
    Column("at K", align="right"),
    Column("condenses at, au", align="right"),
    Column("after, d", align="right", name="delay"),
    Column("mostly from", shrinks=True, min_width=12, drop=1),
    Column("UV power law, au", align="right", drop=2, name="radius by a power law continued into the UV"),
)


def _render_physics(screen: Screen, physics: DustPhysics) -> None:
    render_zones(screen, physics)
    screen.line("")
    print_table(screen, _GRAINS, [_grain(each) for each in physics.grains])
    screen.line("")
    print_table(screen, _CONDENSATION, [_condensation(each) for each in physics.condensation])
    screen.line("")
    print_table(screen, _QUANTITIES, _physics_rows(physics))
    if physics.rule_line is not None:
        screen.line("")
        screen.wrapped("To give the system this delay, type:")
        _typed(screen, physics.rule_line)


def _grain(each: GrainAt) -> tuple[str, ...]:
    t = each.temperature_k
    return (f"{each.distance_au:.4g}", _told(t), _wide(t), mostly(t))


def _condensation(each: CondensationAt) -> tuple[str, ...]:
    far = "" if each.power_law_radius_au is None else f"{each.power_law_radius_au:.3g}"
    source = each.delay_d if each.delay_d is not None else each.radius_au
    return (f"{each.temperature_k:.4g}", _told(each.radius_au), _told(each.delay_d), mostly(source), far)


def _physics_rows(physics: DustPhysics) -> list[tuple[str, str, str, str]]:
    rows: list[tuple[str, Propagated | None]] = [
        ("light of the stars, Lsun", physics.luminosity_lsun),
        ("condensation radius, au", physics.condensation_radius_au),
        ("stagnation from A, au", physics.stagnation_from_a_au),
        ("way of the gas, au", physics.travel_au),
        ("onset delay, d", physics.delay_d),
        ("launch speed, km/s", physics.launch_speed_kms),
    ]
    for push in physics.pushes:
        rows += [
            (f"{_PUSHED[push.kind]}: cm2/g", push.opacity_cm2_g),
            ("  light over gravity", push.beta),
            ("  terminal speed, km/s", push.terminal_speed_kms),
        ]
    return _told_rows(rows)


_PUSHED = {"free grains": "free grains", "grains with their gas": "with their gas"}


def _told_rows(rows: Sequence[tuple[str, Propagated | None]]) -> list[tuple[str, str, str, str]]:
    return [(name, _told(value), _wide(value), mostly(value)) for name, value in rows if value is not None]


def _wide(value: Propagated) -> str:
    """The 95 % interval."""
    if value.lo95 is None or value.hi95 is None or value.lo95 == value.hi95:
        return ""
    return f"{_short(value.lo95)} … {_short(value.hi95)}"


def _short(value: float) -> str:
    """Three digits, with a power of ten only where zeros would fill the line."""
    rounded = float(f"{value:.3g}")
    if 1000.0 <= abs(rounded) < 1e6:
        return f"{rounded:.0f}".replace("-", "−")
    return _plain(rounded, ".3g")


# From this ratio of its ends on, an interval is told by them; below this size a power of ten stands apart.
_SKEWED, _TINY = 6.0, 1e-3


def _told(value: Propagated | None) -> str:
    """As ``told``, with no more digits before the point than the error deserves."""
    if value is None or value.median is None or value.lo68 is None or value.hi68 is None:
        return told(value)
    if 0.0 < _SKEWED * value.lo68 < value.hi68:
        # Known to within a factor only: errors below and above would mislead.
        return f"{_short(value.median)}, {_short(value.lo68)} … {_short(value.hi68)}"
    below, above = value.median - value.lo68, value.hi68 - value.median
    if 0.0 < max(abs(value.median), below, above) < _TINY:
        power = math.floor(math.log10(max(abs(value.median), below, above)))
        scaled = [10.0**-power * x for x in (value.median, value.lo68, value.hi68)]
        inner = told(replace(value, median=scaled[0], lo68=scaled[1], hi68=scaled[2]))
        return f"({inner})e{power}".replace("(-", "(−")
    least = min(below, above)
    step = 10.0 ** (math.floor(math.log10(least)) - 1) if least > 0.0 else 0.0
    if step <= 1.0:
        return told(value)
    median, lo68, hi68 = (step * round(x / step) for x in (value.median, value.lo68, value.hi68))
    return told(replace(value, median=median, lo68=lo68, hi68=hi68))


def _typed(screen: Screen, line: str) -> None:
    """A command over several lines as a shell reads it; broken only before an option."""
    words = line.split(" --")
    lines, current = [], words[0]
    for word in words[1:]:
        if screen.width is not None and len(f"  {current} --{word} \\") > screen.width:
            lines.append(f"{current} \\")
            current = f"  --{word}"
        else:
            current += f" --{word}"
    for each in (*lines, current):
        screen.wrapped(f"  {each}", hang=4)


# --------------------------------------------------------------------------------------------- photometry

_BANDS = (
    Column("band"),
    Column("um", align="right", drop=4),
    Column("stars, Jy", align="right", drop=3),
    Column("dust, Jy", align="right"),
    Column("sigma", align="right", drop=2),
    Column("", name="share of dust", drop=5),
    Column("", shrinks=True, min_width=14, name="remarks", drop=1),
)
_PAIRS = (Column("colour"), Column("temperature, K", align="right"), Column("", shrinks=True, drop=1))
_OTHERS = (
    Column("with the opacity"),
    Column("K", align="right"),
    Column("dust, Msun", align="right"),
    Column("chi2", align="right", drop=1),
)


def _render_measured(screen: Screen, dust: MeasuredDust) -> None:
    _render_verdicts(screen, dust.verdicts)
    print_table(screen, _BANDS, [_band(each, dust.bands) for each in dust.bands])
    rows = _measured_rows(dust)
    if rows:
        screen.line("")
        print_table(screen, _QUANTITIES, rows)
    if dust.mass_upper_msun is not None:
        screen.wrapped(f"Less than {dust.mass_upper_msun:.2g} Msun of dust at that temperature, at 3 sigma.")
    for line in _fit_lines(dust):
        screen.wrapped(line)
    if dust.pairs:
        screen.line("")
        print_table(screen, _PAIRS, [_pair(each) for each in dust.pairs])
    if dust.other_opacities:
        screen.line("")
        others = [
            (o.name, _plain(o.temperature_k, ".0f"), _plain(o.mass_msun, ".2g"), f"{o.chi2:.2f}")
            for o in dust.other_opacities
        ]
        print_table(screen, _OTHERS, others)


def _render_verdicts(screen: Screen, verdicts: Sequence[DustVerdict]) -> None:
    for verdict in verdicts:
        label, style = ("No mass: ", "bold red") if verdict.meaningless else ("Mind: ", "bold yellow")
        screen.wrapped(verdict.text, label=label, hang=2, style=style)
    if verdicts:
        screen.line("")


def _band(each: BandExcess, among: Sequence[BandExcess]) -> tuple[str | Cell, ...]:
    twice = sum(other.band == each.band for other in among) > 1
    name = f"{each.band} {each.photometric_system}" if twice else each.band
    bar = ""
    if each.dust_jy is not None and each.star_jy is not None and each.use == "measured":
        bar = share_bar(each.dust_jy, each.star_jy)
    remark = each.reason if each.fitted or not each.reason else f"left out: {each.reason}"
    return (
        name,
        _plain(each.wavelength_um, ".3g"),
        _plain(each.star_jy, ".3g"),
        _dust_flux(each),
        _plain(each.excess_sigma, ".1f"),
        Cell(bar, "yellow"),
        remark,
    )


def _dust_flux(each: BandExcess) -> str:
    if each.dust_jy is None or each.sigma_jy is None:
        return ""
    if each.use == "measured":
        # What is nothing beside its error is told as nothing, not as the rounding that it is.
        dust = each.dust_jy if abs(each.dust_jy) > 1e-6 * each.sigma_jy else 0.0
        return f"{_plain(dust, '.3g')} ± {_plain(each.sigma_jy, '.2g')}"
    return f"{'<' if each.use == 'fainter than' else '>'} {_plain(each.dust_jy, '.3g')}"


def _measured_rows(dust: MeasuredDust) -> list[tuple[str, str, str, str]]:
    word = "temperature, K" if dust.temperature_origin == "fitted" else "temperature given, K"
    return _told_rows(
        [
            (word, dust.temperature_k),
            ("dust, no gas, Msun", dust.mass_msun),
            ("  the same in g", dust.mass_g),
            ("light of the dust, Lsun", dust.luminosity_lsun),
        ]
    )


def _fit_lines(dust: MeasuredDust) -> list[str]:
    lines = []
    if dust.chi2 is not None and dust.chi2_probability is not None:
        lines.append(
            f"chi2 {dust.chi2:.2f} for {dust.degrees} degree{'' if dust.degrees == 1 else 's'} of freedom: "
            f"as bad by chance in {100.0 * dust.chi2_probability:.2g} % of cases."
        )
    if dust.blackbody_radius_au is not None and dust.grain_distance_au is not None:
        lines.append(
            f"A black disc of that temperature needs {dust.blackbody_radius_au:.3g} au; grains are that hot "
            f"{dust.grain_distance_au:.3g} au from the stars: optical depth {dust.optical_depth:.2g}."
        )
    return lines


def _pair(each: PairColour) -> tuple[str, str, str]:
    return (f"{each.first}/{each.second}", _told(each.temperature_k), each.reason)


def _plain(value: float | None, form: str) -> str:
    """A number with a minus sign of its own, and a power of ten without zeros before it."""
    if value is None:
        return ""
    # The "z" of a format: no minus sign before what rounds to nothing.
    digits, mark, power = format(value, f"z{form}").replace("e+", "e").partition("e")
    return digits.replace("-", "−") + (f"e{int(power)}" if mark else "")


# --------------------------------------------------------------------------------------------- an episode

_EPOCHS = (
    Column("date"),
    Column("bands", drop=3),
    Column("K", align="right"),
    Column("dust, Msun", align="right"),
    Column("", name="bars", drop=2),
    Column("", shrinks=True, min_width=24, name="remarks", drop=1),
)
# What a line of an episode has room for; the date alone tells the rest.
_SHORT_VERDICTS = {
    "negative-excess": "fainter than the stars",
    "saturated": "saturated",
    "star-dominated": "star-dominated",
    "nothing-usable": "no band can be used",
    "one-band": "one band only",
    "temperature-unbounded": "temperature not bounded",
    "optically-thick": "optically thick",
    "not-thin": "not thin: a lower limit",
    "more-light-than-the-stars": "more light than the stars",
    "much-light": "shades itself",
    "one-temperature-does-not-fit": "one temperature does not fit",
    "limit-crossed": "a limit is crossed",
    "band-star-dominated": "a band is star-dominated",
    "band-negative": "a band is left out",
}
# True of every date or of none: told once.
_EVERYWHERE = "thickness-unknown"
_RATES = (
    Column("from"),
    Column("until"),
    Column("dust, Msun/yr", align="right"),
    Column("95 %", align="right", drop=2),
    Column("mostly from", shrinks=True, min_width=12, drop=1),
)


def _render_through(screen: Screen, through: DustThrough) -> None:
    masses = [e.mass_msun.median for e in through.epochs if e.mass_msun is not None and e.mass_msun.median]
    largest = max(masses, default=0.0)
    print_table(screen, _EPOCHS, [_epoch(each, largest) for each in through.epochs])
    everywhere = [v.text for each in through.epochs for v in each.verdicts if v.code == _EVERYWHERE]
    for text in dict.fromkeys(everywhere):
        screen.wrapped(text, label="Mind: ", hang=2, style="bold yellow")
    if any(each.verdicts for each in through.epochs):
        screen.wrapped("What is wrong with a date is told in full by --on DATE.", style="dim")
    screen.line("")
    if not through.rates:
        screen.wrapped("No production rate: it needs the mass at two dates.")
        return
    rows = [
        (
            day(each.start_utc, each.start_bmjd_tdb),
            day(each.end_utc, each.end_bmjd_tdb),
            _told(each.rate_msun_yr),
            _wide(each.rate_msun_yr),
            mostly(each.rate_msun_yr),
        )
        for each in through.rates
    ]
    print_table(screen, _RATES, rows)
    if any((each.rate_msun_yr.median or 0.0) < 0.0 for each in through.rates):
        screen.wrapped(
            "A negative rate is dust destroyed, or grown too cool for these bands, faster than it is made."
        )


def _epoch(each: MeasuredDust, largest: float) -> tuple[str | Cell, ...]:
    mass = each.mass_msun.median if each.mass_msun is not None else None
    bands = " ".join(dict.fromkeys(one.band for one in each.bands))
    known = [_SHORT_VERDICTS.get(v.code, v.code) for v in each.verdicts if v.code != _EVERYWHERE]
    remark = ", ".join(dict.fromkeys(known))
    return (
        day(each.utc, each.bmjd_tdb),
        bands,
        _told(each.temperature_k),
        _told(each.mass_msun),
        Cell(amount_bar(mass or 0.0, largest), "yellow"),
        remark,
    )
