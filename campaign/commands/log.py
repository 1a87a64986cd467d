"""``campaign log``: one observation from the terminal."""

from __future__ import annotations

from collections.abc import Callable
from typing import Annotated, Any

import typer

from campaign.commands import common
from campaign.commands.common import DbOption, JsonOption, ObserverOption, QuietOption, option
from campaign.commands.parsing import limited, measured, one_of, plain, plain_number, shell_index
from campaign.errors import InputRefused, UsageRefused

Text = str | None
System = Annotated[str | None, typer.Argument(metavar="SYSTEM", help="Name or alias.", show_default=False)]
At = Annotated[Text, option("--at", "INSTANT", "When: 2031-04-07T03:12:10Z, or the night 2031-04-07/08.")]
SiteOption = Annotated[Text, option("--site", "SITE", "Where.")]
Instrument = Annotated[Text, option("--instrument", "TEXT", "With what.")]
Source = Annotated[Text, option("--source", "TEXT", "Where it was published.")]
Quality = Annotated[Text, option("--quality", "WORD", "good, doubtful or bad; else good.")]
Note = Annotated[Text, option("--note", "TEXT", "Anything worth knowing.")]
LimitSigma = Annotated[Text, option("--limit-sigma", "N", "Level of a limit; else 3.")]


def photometry(
    system: System = None,
    values: Annotated[
        list[str] | None,
        typer.Argument(metavar="[BAND=MAG]...", help='Several bands at once: J=8.91±0.03 L=">5.0".'),
    ] = None,
    band: Annotated[Text, option("--band", "BAND", "One band.")] = None,
    mag: Annotated[Text, option("--mag", "VALUE", '7.31±0.03; ">12.1" too faint; "<6.0" saturated.')] = None,
    magnitudes: Annotated[
        Text, option("--magnitudes", "SYSTEM", "Photometric system of the magnitudes.")
    ] = None,
    comparison: Annotated[Text, option("--comparison", "STAR", "Comparison star.")] = None,
    limit_sigma: LimitSigma = None,
    at: At = None,
    site: SiteOption = None,
    instrument: Instrument = None,
    source: Source = None,
    quality: Quality = None,
    note: Note = None,
    db: DbOption = None,
    observer: ObserverOption = None,
    json: JsonOption = False,
    quiet: QuietOption = False,
) -> None:
    """Log magnitudes, in one band or in several.

    \b
    For example:
      campaign log photometry "Lantern 3" K=7.31±0.03 --at 2031-04-07T03:12:10Z
      campaign log photometry "Lantern 3" J=8.91±0.03 L=">5.0" \\
        --at 2031-04-07/08 --site "Cold Mesa"
    """
    from campaign.reading.values import read_assignment

    shared = _shared(system, at, site, instrument, source, quality, note, observer)

    def magnitude(text: str, name: str = "--mag") -> dict[str, Any]:
        return limited(text, "mag", name, limit_sigma, low=-30.0, high=40.0)

    pairs = [read_assignment(text) for text in values or []]
    if band is not None or mag is not None or not pairs:
        asked = _ask(band, "--band", "Band", "K", lambda text: plain(text, "--band", 24))
        pairs.insert(0, (asked, _ask(mag, "--mag", "Magnitude", "7.31±0.03", magnitude)))
    _each_band_once([name for name, _ in pairs])
    drafts = [
        magnitude(text, f"{name} magnitude")
        | {
            "kind": "photometry",
            "band": plain(name, "--band", 24),
            "photometric_system": plain(magnitudes, "--magnitudes", 40),
            "comparison_star": plain(comparison, "--comparison", 120),
        }
        for name, text in pairs
    ]
    _log(shared, drafts, db, json, quiet)


def flux(
    system: System = None,
    value: Annotated[
        Text, option("--value", "VALUE", '"2.3±0.2 mJy", or "(4.1±0.3)e-12 erg/s/cm2" in X-rays.')
    ] = None,
    band: Annotated[Text, option("--band", "BAND", "Name of the band, if it has one.")] = None,
    frequency: Annotated[Text, option("--frequency", "VALUE", 'Radio: "8.4 GHz".')] = None,
    energy: Annotated[Text, option("--energy", "LOW..HIGH", 'X-rays: "0.5..10 keV".')] = None,
    limit_sigma: LimitSigma = None,
    at: At = None,
    site: SiteOption = None,
    instrument: Instrument = None,
    source: Source = None,
    quality: Quality = None,
    note: Note = None,
    db: DbOption = None,
    observer: ObserverOption = None,
    json: JsonOption = False,
    quiet: QuietOption = False,
) -> None:
    """Log a flux: infrared, radio or X-ray.

    \b
    For example:
      campaign log flux "Lantern 3" --value "2.3±0.2 mJy" \\
        --frequency "8.4 GHz" --at 2031-04-07
    """
    from campaign.model.measured import Range
    from campaign.reading.values import read_measured_or_bound

    shared = _shared(system, at, site, instrument, source, quality, note, observer)
    band, frequency, energy = _where_in_the_spectrum(band, frequency, energy)
    unit = "erg/s/cm2" if energy is not None else "jy"
    example = "(4.1±0.3)e-12 erg/s/cm2" if energy is not None else "2.3±0.2 mJy"
    text = _ask(
        value, "--value", "Flux with its unit", example, lambda t: limited(t, unit, "--value", limit_sigma)
    )
    wave = plain_number(frequency, "ghz", "--frequency", low=0.0, low_open=True)
    span = read_measured_or_bound(energy, "kev", "--energy", low=0.0, low_open=True) if energy else None
    if energy is not None and not isinstance(span, Range):
        raise InputRefused(
            f"The energy range '{energy}' is not a range.",
            why="An X-ray flux belongs to a range of energies.",
            hint='For example --energy "0.5..10 keV".',
            code="energy-refused",
        )
    if band is None and frequency is None and energy is None:
        raise UsageRefused(
            "Which band is the flux in?",
            why="A flux without its band, frequency or energy range cannot be used.",
            hint='Add --band N, --frequency "8.4 GHz" or --energy "0.5..10 keV".',
        )
    draft = limited(text, unit, "--value", limit_sigma) | {
        "kind": "flux",
        "band": plain(band, "--band", 24),
        "frequency_ghz": wave,
        "energy_low_kev": span.low if isinstance(span, Range) else None,
        "energy_high_kev": span.high if isinstance(span, Range) else None,
    }
    _log(shared, [draft], db, json, quiet)


def velocity(
    system: System = None,
    star: Annotated[Text, option("--star", "A|B", "Which star.")] = None,
    value: Annotated[
        Text, option("--velocity", "VALUE", 'Heliocentric, positive receding: "-45.2±3.1 km/s".')
    ] = None,
    species: Annotated[Text, option("--species", "TEXT", "The line it was measured in.")] = None,
    at: At = None,
    site: SiteOption = None,
    instrument: Instrument = None,
    source: Source = None,
    quality: Quality = None,
    note: Note = None,
    db: DbOption = None,
    observer: ObserverOption = None,
    json: JsonOption = False,
    quiet: QuietOption = False,
) -> None:
    """Log a radial velocity of one star."""
    shared = _shared(system, at, site, instrument, source, quality, note, observer)

    def of(text: str) -> str | None:
        return one_of(text, ("A", "B"), "--star")

    def speed(text: str) -> Any:
        return measured(text, "kms", "--velocity", low=-1e5, high=1e5)

    draft = {
        "kind": "velocity",
        "star": of(_ask(star, "--star", "Star (A or B)", "A", of)),
        "value": speed(_ask(value, "--velocity", "Velocity", "-45.2±3.1 km/s", speed)),
        "unit": "kms",
        "species": plain(species, "--species", 60),
    }
    _log(shared, [draft], db, json, quiet)


def line(
    system: System = None,
    species: Annotated[Text, option("--species", "TEXT", 'As "C III 5696".')] = None,
    width: Annotated[
        Text, option("--width", "VALUE", 'Equivalent width, negative in emission: "-12.4±0.5 A".')
    ] = None,
    star: Annotated[Text, option("--star", "A|B", "Which star, if it is known.")] = None,
    at: At = None,
    site: SiteOption = None,
    instrument: Instrument = None,
    source: Source = None,
    quality: Quality = None,
    note: Note = None,
    db: DbOption = None,
    observer: ObserverOption = None,
    json: JsonOption = False,
    quiet: QuietOption = False,
) -> None:
    """Log the equivalent width of a line."""
    shared = _shared(system, at, site, instrument, source, quality, note, observer)

    def strength(text: str) -> Any:
        return measured(text, "angstrom", "--width")

    draft = {
        "kind": "line",
        "species": plain(_ask(species, "--species", "Species", "C III 5696"), "--species", 60),
        "value": strength(_ask(width, "--width", "Equivalent width", "-12.4±0.5 A", strength)),
        "unit": "angstrom",
        "star": one_of(star, ("A", "B"), "--star"),
    }
    _log(shared, [draft], db, json, quiet)


def position(
    system: System = None,
    separation: Annotated[Text, option("--separation", "VALUE", 'Of B from A: "12.1±0.3 mas".')] = None,
    angle: Annotated[
        Text, option("--angle", "VALUE", 'Position angle, North through East: "143±2 deg".')
    ] = None,
    correlation: Annotated[Text, option("--correlation", "R", "Of separation and angle.")] = None,
    at: At = None,
    site: SiteOption = None,
    instrument: Instrument = None,
    source: Source = None,
    quality: Quality = None,
    note: Note = None,
    db: DbOption = None,
    observer: ObserverOption = None,
    json: JsonOption = False,
    quiet: QuietOption = False,
) -> None:
    """Log the position of star B relative to star A."""
    shared = _shared(system, at, site, instrument, source, quality, note, observer)
    rho = plain_number(
        correlation, "", "--correlation", low=-1.0, high=1.0, low_open=True, high_open=True, shown="0.3"
    )

    def apart(text: str) -> Any:
        return measured(text, "mas", "--separation", low=0.0)

    def towards(text: str) -> Any:
        return measured(text, "deg", "--angle", low=-360.0, high=360.0)

    draft = {
        "kind": "position",
        "value": apart(_ask(separation, "--separation", "Separation", "12.1±0.3 mas", apart)),
        "unit": "mas",
        "position_angle_deg": towards(_ask(angle, "--angle", "Position angle", "143±2 deg", towards)),
        "correlation": rho,
    }
    _log(shared, [draft], db, json, quiet)


def shell(
    system: System = None,
    radius: Annotated[Text, option("--radius", "VALUE", '"1.20±0.05 arcsec".')] = None,
    angle: Annotated[
        Text, option("--angle", "VALUE", "Position angle at which it was measured, deg.")
    ] = None,
    feature: Annotated[Text, option("--feature", "TEXT", "What was measured: limb, ring, plume, ...")] = None,
    measured_at: Annotated[Text, option("--measured-at", "WORD", "edge or peak.")] = None,
    plate_scale_error: Annotated[
        Text, option("--plate-scale-error", "VALUE", 'Shared by one image: "0.5 %".')
    ] = None,
    index: Annotated[Text, option("--index", "N", "1 for the youngest visible, if known.")] = None,
    band: Annotated[Text, option("--band", "BAND", "Band of the image.")] = None,
    at: At = None,
    site: SiteOption = None,
    instrument: Instrument = None,
    source: Source = None,
    quality: Quality = None,
    note: Note = None,
    db: DbOption = None,
    observer: ObserverOption = None,
    json: JsonOption = False,
    quiet: QuietOption = False,
) -> None:
    """Log the radius of a dust shell in an image."""
    shared = _shared(system, at, site, instrument, source, quality, note, observer)
    scale = plain_number(
        plate_scale_error, "fraction", "--plate-scale-error", low=0.0, high=1.0, shown="0.5 %"
    )

    def size(text: str) -> Any:
        return measured(text, "arcsec", "--radius", low=0.0, low_open=True)

    draft = {
        "kind": "shell",
        "value": size(_ask(radius, "--radius", "Radius", "1.20±0.05 arcsec", size)),
        "unit": "arcsec",
        "position_angle_deg": measured(angle, "deg", "--angle", low=-360.0, high=360.0),
        "feature": plain(feature, "--feature", 60),
        "measured_at": one_of(measured_at, ("edge", "peak"), "--measured-at"),
        "plate_scale_error": scale,
        "shell_index": None if index is None else shell_index(index),
        "band": plain(band, "--band", 24),
    }
    _log(shared, [draft], db, json, quiet)


def attempt(
    system: System = None,
    why: Annotated[Text, option("--why", "TEXT", "Why nothing was obtained: cloud, wind, fault, ...")] = None,
    band: Annotated[Text, option("--band", "BAND", "What was tried.")] = None,
    at: At = None,
    site: SiteOption = None,
    instrument: Instrument = None,
    source: Source = None,
    note: Note = None,
    db: DbOption = None,
    observer: ObserverOption = None,
    json: JsonOption = False,
    quiet: QuietOption = False,
) -> None:
    """Log that it was tried and nothing was obtained."""
    shared = _shared(system, at, site, instrument, source, None, note, observer)
    reason = plain(_ask(why, "--why", "Why was nothing obtained", "cloud"), "--why", 400) or ""
    text = f"{reason}; {shared['text']}" if shared["text"] else reason
    _log(shared, [{"kind": "attempt", "band": plain(band, "--band", 24), "text": text}], db, json, quiet)


def remark(
    system: System = None,
    text: Annotated[
        str | None, typer.Argument(metavar="TEXT", help="What is worth keeping.", show_default=False)
    ] = None,
    at: At = None,
    site: SiteOption = None,
    source: Source = None,
    db: DbOption = None,
    observer: ObserverOption = None,
    json: JsonOption = False,
    quiet: QuietOption = False,
) -> None:
    """Log a remark on a system."""
    when = at if at is not None else common.now_iso()
    shared = _shared(system, when, site, None, source, None, None, observer)
    said = plain(_ask(text, "TEXT", "Remark", "seeing poor in L"), "TEXT", 2000)
    _log(shared, [{"kind": "remark", "text": said}], db, json, quiet)


# ------------------------------------------------------------------------------------------ helpers


def _ask(
    value: str | None, name: str, question: str, example: str, check: Callable[[str], object] | None = None
) -> str:
    """The option, or an answer at the terminal; in a script a usage error.

    An answer that ``check`` refuses is asked for again; an option that it refuses ends the command later.
    """
    if value is not None:
        return value
    if not common.asks_questions():
        raise UsageRefused(
            f"{name} is missing.",
            why="It cannot be asked for: there is no terminal.",
            hint=f'For example {name} "{example}".' if name.startswith("-") else f'For example "{example}".',
            details={"missing": name},
        )
    while True:
        answer = common.ask(f"{question} (as {example}):").strip()
        if not answer:
            continue
        try:
            if check is not None:
                check(answer)
        except InputRefused as problem:
            common.tell(f"{problem.message} {problem.why}")
            continue
        return answer


def _when(at: str | None) -> str:
    """The instant as typed; somebody at a terminal may mean now."""
    from campaign.reading.instants import read_instant

    if at is not None or not common.asks_questions():
        return _ask(at, "--at", "When, UTC", "2031-04-07T03:12:10Z")
    while True:
        answer = common.ask("When, UTC (as 2031-04-07T03:12:10Z; empty for now):").strip()
        when = answer or common.now_iso()
        try:
            read_instant(when)
        except InputRefused as problem:
            common.tell(f"{problem.message} {problem.why}")
            continue
        return when


def _where_in_the_spectrum(
    band: str | None, frequency: str | None, energy: str | None
) -> tuple[str | None, str | None, str | None]:
    """Band, frequency and energy range of a flux, asked for at a terminal when none was given."""
    if not (band is None and frequency is None and energy is None and common.asks_questions()):
        return band, frequency, energy
    answer = _ask(None, "--band", "Band, frequency or energies", "N, 8.4 GHz or 0.5..10 keV")
    unit = answer.casefold()
    if unit.endswith("hz"):
        return None, answer, None
    return (None, None, answer) if unit.endswith("ev") else (answer, None, None)


def _shared(
    system: str | None,
    at: str | None,
    site: str | None,
    instrument: str | None,
    source: str | None,
    quality: str | None,
    note: str | None,
    observer: str | None,
) -> dict[str, Any]:
    """What every kind of observation shares, asked for where it is missing."""
    bare = system is None and common.asks_questions()
    name = _ask(system, "SYSTEM", "System", "Lantern 3")
    when = _when(at)
    if bare and site is None:
        site = common.ask("Site (empty for none):").strip() or None
    return {
        "system": name,
        "at": when,
        "site": site,
        "observer": common.observer(observer),
        "instrument": plain(instrument, "--instrument", 120),
        "source": plain(source, "--source", 400),
        "quality": one_of(quality, ("good", "doubtful", "bad"), "--quality") or "good",
        "text": plain(note, "--note", 2000) or "",
    }


def _each_band_once(bands: list[str]) -> None:
    """Two magnitudes of one band at one instant are most likely a slip of the fingers."""
    seen: set[str] = set()
    for band in bands:
        if band in seen:
            raise InputRefused(
                f"The band {band} is given twice.",
                why="One line holds one magnitude a band; the second would stand against the first.",
                hint="For example J=8.91±0.03 K=7.31±0.03, and a second point with its own --at.",
                code="band-repeated",
                details={"band": band},
            )
        seen.add(band)


def _log(
    shared: dict[str, Any], drafts: list[dict[str, Any]], db: str | None, json: bool, quiet: bool
) -> None:
    """Build the observations, log them, and say what the catalogue now knows."""
    from campaign.model.instants import Moment
    from campaign.model.observations import Observation
    from campaign.output import logged as output
    from campaign.studies import log as study

    common_fields = {k: shared[k] for k in ("observer", "instrument", "source", "quality", "text")}
    observations = [
        Observation(id=0, uid="", system_id=0, moment=Moment(0.0), **(common_fields | draft))
        for draft in drafts
    ]
    result = study.log_observations(
        common.database(db),
        common.stamp(shared["observer"]),
        shared["system"],
        observations,
        shared["at"],
        shared["site"],
    )
    if json:
        common.write_json(output.logged_json(result, common.now_iso()))
        return
    if not quiet:
        output.render_logged(common.stdout_screen(), result)
    for warning in result.warnings:
        common.tell(f"Warning: {warning}", quiet=quiet)
