"""``campaign amend``: correct one observation."""

from __future__ import annotations

from typing import Annotated

import typer

from campaign.commands import common
from campaign.commands.common import (
    DbOption,
    DryRunOption,
    JsonOption,
    ObserverOption,
    QuietOption,
    option,
)
from campaign.commands.parsing import entry_number
from campaign.errors import UsageRefused

Text = str | None


def amend(
    number: Annotated[str, typer.Argument(metavar="N", help="The observation's number.")],
    at: Annotated[Text, option("--at", "INSTANT", "When it was.")] = None,
    site: Annotated[Text, option("--site", "SITE", 'Where; "" for unknown.')] = None,
    band: Annotated[Text, option("--band", "BAND", "The band.")] = None,
    mag: Annotated[Text, option("--mag", "VALUE", 'Photometry: 7.31±0.03, ">12.1", "<6.0".')] = None,
    magnitudes: Annotated[Text, option("--magnitudes", "SYSTEM", "Photometric system.")] = None,
    comparison: Annotated[Text, option("--comparison", "STAR", "Comparison star.")] = None,
    value: Annotated[Text, option("--value", "VALUE", 'Flux: "2.3±0.2 mJy".')] = None,
    frequency: Annotated[Text, option("--frequency", "VALUE", 'Flux: "8.4 GHz".')] = None,
    energy: Annotated[Text, option("--energy", "LOW..HIGH", 'Flux: "0.5..10 keV".')] = None,
    limit_sigma: Annotated[Text, option("--limit-sigma", "N", "Level of a limit.")] = None,
    velocity: Annotated[Text, option("--velocity", "VALUE", 'Velocity: "-45.2±3.1 km/s".')] = None,
    width: Annotated[Text, option("--width", "VALUE", 'Line: "-12.4±0.5 A".')] = None,
    star: Annotated[Text, option("--star", "A|B", "Velocity, line: which star.")] = None,
    species: Annotated[Text, option("--species", "TEXT", "Velocity, line: which line.")] = None,
    separation: Annotated[Text, option("--separation", "VALUE", 'Position: "12.1±0.3 mas".')] = None,
    angle: Annotated[Text, option("--angle", "VALUE", 'Position, shell: "143±2 deg".')] = None,
    correlation: Annotated[Text, option("--correlation", "R", "Position: of both.")] = None,
    radius: Annotated[Text, option("--radius", "VALUE", 'Shell: "1.20±0.05 arcsec".')] = None,
    feature: Annotated[Text, option("--feature", "TEXT", "Shell: what was measured.")] = None,
    measured_at: Annotated[Text, option("--measured-at", "WORD", "Shell: edge or peak.")] = None,
    plate_scale_error: Annotated[Text, option("--plate-scale-error", "VALUE", 'Shell: "0.5 %".')] = None,
    index: Annotated[Text, option("--index", "N", "Shell: 1 for the youngest visible.")] = None,
    why: Annotated[Text, option("--why", "TEXT", "Attempt: why nothing was obtained.")] = None,
    instrument: Annotated[Text, option("--instrument", "TEXT", "With what.")] = None,
    source: Annotated[Text, option("--source", "TEXT", "Where it was published.")] = None,
    quality: Annotated[Text, option("--quality", "WORD", "good, doubtful or bad.")] = None,
    note: Annotated[Text, option("--note", "TEXT", "Anything worth knowing.")] = None,
    db: DbOption = None,
    observer: ObserverOption = None,
    dry_run: DryRunOption = False,
    json: JsonOption = False,
    quiet: QuietOption = False,
) -> None:
    """Correct an observation; the old one is kept beside it."""
    from campaign.commands.amending import fields_given
    from campaign.output import observations as output
    from campaign.studies import amend as study

    options = {
        "--band": band, "--mag": mag, "--magnitudes": magnitudes, "--comparison": comparison,
        "--value": value, "--frequency": frequency, "--energy": energy, "--limit-sigma": limit_sigma,
        "--velocity": velocity, "--width": width, "--star": star, "--species": species,
        "--separation": separation, "--angle": angle, "--correlation": correlation, "--radius": radius,
        "--feature": feature, "--measured-at": measured_at, "--plate-scale-error": plate_scale_error,
        "--index": index, "--why": why, "--instrument": instrument, "--source": source,
        "--quality": quality, "--note": note,
    }  # fmt: skip
    given = {flag: text for flag, text in options.items() if text is not None}
    if not given and at is None and site is None:
        raise UsageRefused(
            "Nothing to correct was given.",
            why="The options are those of campaign log: what is given replaces what was logged.",
            hint='For example: campaign amend 12 --mag 7.31±0.03, or campaign amend 12 --site "Cold Mesa".',
        )
    place, own_number = common.database(db), entry_number(number, "N")
    fields = fields_given(study.observation_to_amend(place, own_number), given)
    result = study.amend_observation(
        place, common.stamp(observer), own_number, fields, at, site, rehearse=dry_run
    )
    if json:
        common.write_json(output.amended_json(result, common.now_iso()))
    else:
        if not quiet:
            output.render_amended(common.stdout_screen(), result)
        for warning in result.warnings:
            common.tell(f"Warning: {warning}", quiet=quiet)
