"""Dated shells on the screen: table, diagram, fitted quantities, tensions and what was assumed."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from itertools import groupby
from math import isnan

from campaign.model.measured import Measured
from campaign.model.shells import (
    DatedShell,
    ShellAssignment,
    ShellDatingResult,
    ShellMotion,
    ShellQuantity,
    ShellTension,
)
from campaign.output.console import Screen
from campaign.output.shells_diagram import render_diagram
from campaign.output.tables import Cell, Column, Row, fits, print_table
from campaign.output.values import calendar_day, number
from campaign.output.wording import minus_signs

# A residual or tension from this many sigma on is pointed at.
HIGH_SIGMA = 3.0
_UNITS = {
    "spacing_arcsec": ("spacing", "arcsec"),
    "proper_motion_mas_yr": ("motion", "mas/yr"),
    "speed_kms": ("speed", "km/s"),
    "period_yr": ("period", "yr"),
    "distance_pc": ("distance", "pc"),
}
_FULL = (
    Column("image"),
    Column("feature", shrinks=True),
    Column("index", align="right"),
    Column("radius, arcsec", align="right"),
    Column("age, yr", align="right"),
    Column("launched"),
    Column("cycle", align="right"),
    Column("phase"),
    Column("window, sigma", align="right"),
    Column("residual, sigma", align="right"),
)
_COMPACT = (
    Column("image"),
    Column("feature", shrinks=True, drop=6),
    Column("index", align="right"),
    Column("radius, arcsec", align="right"),
    Column("age, yr", align="right"),
    Column("launched"),
    Column("cycle", align="right", drop=2),
    Column("phase", align="right", drop=3),
    Column("window", align="right", drop=7, name="launch against the window"),
    Column("resid.", align="right", drop=1, name="residual in sigma"),
)
_IMAGE, _FEATURE = 0, 1
_NEVER_DROPPED = {2, 3, 4}


def render_dating(screen: Screen, result: ShellDatingResult) -> None:
    """Write everything that dating came to."""
    screen.heading("Shells" + (f" of {result.system}" if result.system else ""))
    if result.shells:
        screen.wrapped(_counted(result))
        screen.line("")
        render_shells(screen, result.shells)
        for line in _under_the_table(result):
            screen.wrapped(line)
        screen.line("")
        render_diagram(screen, result)
    screen.line("")
    render_quantities(screen, result.quantities)
    render_motions(screen, result.motions)
    render_tensions(screen, result.tensions)
    _render_counting(screen, result)
    _render_acceleration(screen, result)
    screen.line("")
    screen.heading("Notes")
    for warning in result.warnings:
        screen.wrapped(minus_signs(warning), label="- Warning: ", hang=2, style="bold yellow")
    for line in (*result.not_told, *result.assumptions):
        screen.wrapped(minus_signs(line), label="- ", hang=2)


def render_shells(screen: Screen, shells: Sequence[DatedShell]) -> None:
    """Write the table of shells; columns that no shell fills are left away."""
    full = [_row(shell, compact=False) for shell in shells]
    several = len({shell.image_bmjd_tdb for shell in shells}) > 1
    filled = [i for i in range(len(_FULL)) if i in _NEVER_DROPPED or any(str(_text(row[i])) for row in full)]
    if not several:
        filled = [i for i in filled if i != _IMAGE]
    if len({shell.feature for shell in shells}) < 2:
        filled = [i for i in filled if i != _FEATURE]
    columns, rows = [_FULL[i] for i in filled], [[row[i] for i in filled] for row in full]
    if fits(screen, columns, rows):
        print_table(screen, columns, rows)
        return
    # In a small window the images stand under one another.
    kept = [i for i in filled if i != _IMAGE]
    for place, (image, group) in enumerate(groupby(shells, key=lambda shell: shell.image_bmjd_tdb)):
        if several:
            if place:
                screen.line("")
            screen.wrapped(f"Image of {calendar_day(image)}" if image is not None else "Image without date")
        compact = [_row(shell, compact=True) for shell in group]
        print_table(screen, [_COMPACT[i] for i in kept], [[row[i] for i in kept] for row in compact])


def render_quantities(screen: Screen, quantities: Sequence[ShellQuantity]) -> None:
    """Write spacing, motion, speed, period and distance as far as they are known."""
    columns = (
        Column("quantity"),
        Column("value"),
        Column("68 %", drop=2, name="68 % interval"),
        Column("from", shrinks=True, drop=1, min_width=16),
    )
    print_table(screen, columns, [_quantity_row(each) for each in quantities])


def render_tensions(screen: Screen, tensions: Sequence[ShellTension]) -> None:
    """Write what does, and does not, agree."""
    if not tensions:
        return
    screen.line("")
    columns = (
        Column("tension"),
        Column("sigma", align="right"),
        Column("from", shrinks=True, min_width=14),
        Column("against", shrinks=True, min_width=14),
    )
    print_table(screen, columns, [_tension_row(each) for each in _strongest(tensions)])
    _render_reasons(screen, tensions)


def _render_reasons(screen: Screen, tensions: Sequence[ShellTension]) -> None:
    """What would explain the high tensions, each reason once."""
    about: dict[str, list[str]] = {}
    for each in tensions:
        for reason in each.reasons:
            words = about.setdefault(reason, [])
            word = _UNITS.get(each.quantity, (each.quantity, ""))[0]
            if word not in words:
                words.append(word)
    if not about:
        return
    screen.wrapped("What would explain the tensions above 2 sigma:")
    for reason, words in about.items():
        screen.wrapped(f"{reason} ({', '.join(words)})", label="- ", hang=2)


def render_motions(screen: Screen, motions: Sequence[ShellMotion]) -> None:
    """Write how each shell moves, and all of them together."""
    if not motions:
        return
    screen.line("")
    columns = (
        Column("motion of", shrinks=True, min_width=16),
        Column("images", align="right", drop=1),
        Column("mas/yr", align="right"),
        Column("launched", drop=2),
        Column("chi2/dof", align="right", drop=3),
    )
    rows = [
        (
            minus_signs(each.label),
            str(each.epochs),
            _plain(each.proper_motion_mas_yr, None if isnan(each.sigma_mas_yr) else each.sigma_mas_yr),
            _launched(each.launched_bmjd_tdb, each.launched_sigma_d),
            ""
            if each.chi2 is None or not each.degrees_of_freedom
            else f"{each.chi2:.1f}/{each.degrees_of_freedom}",
        )
        for each in motions
    ]
    print_table(screen, columns, rows)


def _strongest(tensions: Sequence[ShellTension]) -> list[ShellTension]:
    """One line for each pair of quantity and what it stands against: that of the most telling way."""
    kept: dict[tuple[str, str], ShellTension] = {}
    for each in tensions:
        known = kept.get((each.quantity, each.against))
        if known is None or abs(each.sigma or 0.0) > abs(known.sigma or 0.0):
            kept[each.quantity, each.against] = each
    return list(kept.values())


def _counted(result: ShellDatingResult) -> str:
    images = sorted({shell.image_bmjd_tdb for shell in result.shells if shell.image_bmjd_tdb is not None})
    radii = f"{len(result.shells)} {'radius' if len(result.shells) == 1 else 'radii'}"
    if not images:
        return f"{radii} of one image, whose date was not given."
    if len(images) == 1:
        return f"{radii} of one image, {calendar_day(images[0])}."
    return f"{radii} of {len(images)} images, {calendar_day(images[0])} to {calendar_day(images[-1])}."


def _under_the_table(result: ShellDatingResult) -> list[str]:
    lines = []
    if result.span_yr is not None and len(result.shells) > 1:
        span = number(Measured(result.span_yr, result.span_sigma_yr, result.span_sigma_yr), "yr")
        lines.append(f"The oldest was launched {span} before the youngest.")
    if result.chi2 is not None and result.degrees_of_freedom:
        lines.append(
            f"Chi-square of the fit {result.chi2:.1f} with {result.degrees_of_freedom} degrees of freedom."
        )
    return lines


def _row(shell: DatedShell, *, compact: bool) -> Row:
    residual = _signed(shell.residual_sigma)
    loud = shell.residual_sigma is not None and abs(shell.residual_sigma) >= HIGH_SIGMA
    far = shell.window_sigma is not None and abs(shell.window_sigma) >= HIGH_SIGMA
    return (
        "" if shell.image_bmjd_tdb is None else calendar_day(shell.image_bmjd_tdb),
        shell.feature or "",
        f"{shell.index:g}",
        _plain(shell.radius_arcsec, shell.sigma_arcsec),
        _age(shell),
        _launched(shell.launched_bmjd_tdb, shell.launched_sigma_d),
        "" if shell.cycle is None else minus_signs(str(shell.cycle)),
        _phase(shell, compact=compact),
        Cell(_signed(shell.window_sigma), "bold yellow" if far else ""),
        Cell(residual, "bold yellow" if loud else ""),
    )


def _text(cell: str | Cell) -> str:
    return cell.text if isinstance(cell, Cell) else cell


def _plain(value: float | None, sigma: float | None) -> str:
    """A value with its error and no words, for a column that says the rest."""
    if value is None:
        return ""
    if sigma is None:
        return f"{value:.4g} ± ?"
    return number(Measured(value, sigma, sigma)) if sigma > 0.0 else f"{value:.6g}"


def _age(shell: DatedShell) -> str:
    if shell.age_yr is not None:
        return _plain(shell.age_yr, shell.age_sigma_yr)
    if shell.age_periods is not None:
        return f"{_plain(shell.age_periods, shell.age_periods_sigma)} periods"
    return ""


def _launched(bmjd_tdb: float | None, sigma: float | None) -> str:
    if bmjd_tdb is None:
        return ""
    day = minus_signs(calendar_day(bmjd_tdb))
    if sigma is None:
        return f"{day} ± ?"
    if sigma >= 1000.0:
        return f"{day} ± {sigma / 365.25:.1f} yr"
    return f"{day} ± {sigma:.0f} d" if sigma >= 9.5 else f"{day} ± {sigma:.2g} d"


def _phase(shell: DatedShell, *, compact: bool) -> str:
    if shell.phase is None:
        return ""
    if compact:
        return f"{shell.phase:+.3f}".replace("-", "−")
    return _plain(shell.phase, shell.phase_sigma).replace("-", "−")


def _signed(sigma: float | None) -> str:
    if sigma is None:
        return ""
    text = f"{sigma:+.1f}".replace("-", "−")
    return "0.0" if text[1:] == "0.0" else text


def _chance(probability: float) -> str:
    return ">99 %" if 0.995 < probability < 1.0 else f"{100.0 * probability:.0f} %"


def _quantity_row(quantity: ShellQuantity) -> Row:
    word, unit = _UNITS[quantity.name]
    sigma = quantity.sigma
    value = number(Measured(quantity.value, sigma, sigma), unit)
    bounds = ""
    if quantity.lo68 is not None and quantity.hi68 is not None and sigma:
        places = _places(sigma)
        bounds = f"{quantity.lo68:.{places}f} to {quantity.hi68:.{places}f}"
    origin = quantity.source or ("follows from " + _listed(quantity.basis) if quantity.basis else "")
    return (word, value, bounds, origin)


def _places(sigma: float) -> int:
    digits = f"{sigma:.1e}".partition("e")[2]
    return max(0, 1 - int(digits))


def _listed(words: Iterable[str]) -> str:
    *first, last = list(words)
    return f"{', '.join(first)} and {last}" if first else last


def _tension_row(tension: ShellTension) -> Row:
    word, unit = _UNITS.get(tension.quantity, (tension.quantity, ""))
    high = tension.sigma is not None and abs(tension.sigma) >= HIGH_SIGMA
    shown = _signed(tension.sigma) or "error unknown"
    return (
        word,
        Cell(shown, "bold yellow" if high else ""),
        f"{_sized(tension.value, unit)}, {minus_signs(tension.determined_from)}",
        f"{_sized(tension.against_value, unit)}, {minus_signs(tension.against)}",
    )


def _sized(value: float, unit: str) -> str:
    if not unit:
        return calendar_day(value) if abs(value) > 10_000.0 else f"{value:.4g}"
    return f"{value:.5g} {unit}"


def _render_counting(screen: Screen, result: ShellDatingResult) -> None:
    if not result.assignments:
        return
    screen.line("")
    screen.heading("Which shell is which")
    several = len({each.image_bmjd_tdb for each in result.assignments}) > 1
    columns = (
        *((Column("image", drop=2),) if several else ()),
        Column("chance", align="right"),
        Column("indices", shrinks=True, min_width=12),
        Column("spacing, arcsec", align="right", drop=1),
        Column("meaning", shrinks=True, min_width=16),
    )
    rows = [
        (
            *((calendar_day(each.image_bmjd_tdb or 0.0),) if several else ()),
            _chance(each.probability) if each.probability >= 0.005 else "<1 %",
            _indices(each.indices),
            f"{each.spacing_arcsec:.4g}",
            each.meaning,
        )
        for each in _worth_showing(result.assignments)
    ]
    print_table(screen, columns, rows)


def _worth_showing(assignments: Sequence[ShellAssignment]) -> list[ShellAssignment]:
    """Of each image the likeliest way to count, the next, and whatever else is not all but excluded."""
    shown: dict[float | None, int] = {}
    kept = []
    for each in assignments:
        place = shown.get(each.image_bmjd_tdb, 0)
        shown[each.image_bmjd_tdb] = place + 1
        if place < 2 or each.probability >= 0.005:
            kept.append(each)
    return kept


def _indices(indices: Sequence[float]) -> str:
    """Runs of whole indices shortened: ``1-3 5``."""
    pieces: list[list[float]] = []
    for index in indices:
        whole = float(index).is_integer()
        if pieces and whole and pieces[-1][-1] == index - 1.0 and float(pieces[-1][-1]).is_integer():
            pieces[-1].append(index)
        else:
            pieces.append([index])
    return " ".join(f"{run[0]:g}" if len(run) == 1 else f"{run[0]:g}-{run[-1]:g}" for run in pieces)


def _render_acceleration(screen: Screen, result: ShellDatingResult) -> None:
    found = result.acceleration
    if found is None:
        return
    screen.line("")
    screen.heading("Acceleration")
    screen.wrapped(minus_signs(found.statement))
    ages = [
        f"{_plain(age, sigma)} yr {how}"
        for age, sigma, how in (
            (found.age_constant_yr, found.age_constant_sigma_yr, "at constant speed"),
            (found.age_accelerated_yr, found.age_accelerated_sigma_yr, "with acceleration"),
        )
        if age is not None
    ]
    if ages:
        screen.wrapped(f"Age of the oldest shell: {'; '.join(ages)}.")
    if found.verdict != "constant" and found.terminal_motion_mas_yr is not None:
        parts = [
            f"{label} {_plain(value, sigma)} {unit}"
            for label, value, sigma, unit in (
                ("launch radius", found.launch_radius_arcsec, found.launch_radius_sigma_arcsec, "arcsec"),
                ("at launch", found.launch_motion_mas_yr, found.launch_motion_sigma_mas_yr, "mas/yr"),
                ("at the end", found.terminal_motion_mas_yr, found.terminal_motion_sigma_mas_yr, "mas/yr"),
            )
            if value is not None
        ]
        screen.wrapped(f"{'; '.join(parts)}.")
