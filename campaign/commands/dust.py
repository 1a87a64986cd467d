"""``campaign dust``: grains in the light of a system, and the dust that its photometry shows."""

from __future__ import annotations

from typing import Annotated, Any

import typer

from campaign.commands import common
from campaign.commands.common import AsOfOption, DbOption, JsonOption, option
from campaign.commands.parsing import clock_instant, plain_number, whole_number
from campaign.errors import UsageRefused

Text = str | None
Texts = list[str] | None


def dust(
    system: Annotated[str, typer.Argument(metavar="SYSTEM", help="Name or alias.")],
    on: Annotated[Text, option("--on", "INSTANT", "Dust shown by the photometry near a date.")] = None,
    within: Annotated[Text, option("--within", "SPAN", "How near: else 10d on either side.")] = None,
    from_: Annotated[Text, option("--from", "INSTANT", "Mass through an episode: first instant.")] = None,
    until: Annotated[Text, option("--until", "INSTANT", "Its last instant.")] = None,
    cycle: Annotated[Text, option("--cycle", "N", "The dated episode of a cycle, in place of both.")] = None,
    temperature: Annotated[
        Text, option("--temperature", "VALUE", 'Of the dust, not fitted: "900±100 K" or "700..1100 K".')
    ] = None,
    opacity: Annotated[
        Text,
        option(
            "--opacity",
            "NAME|LAW",
            'zubko-0.01, -0.1, -0.5, preibisch-0.01, -0.1, or "1000±300 cm2/g at 10 um, index 1.2".',
        ),
    ] = None,
    opacity_error: Annotated[Text, option("--opacity-error", "SHARE", 'As "30 %".')] = None,
    zero_points: Annotated[
        Texts, option("--zero-points", "[NAME=]NAME", "Whose zero points stand in for unknown ones.")
    ] = None,
    zero_point: Annotated[Texts, option("--zero-point", "BAND=...", '"K=640±20 Jy at 2.19 um".')] = None,
    level: Annotated[
        Texts, option("--level", "BAND=MAG", "The stars' own magnitude: K=7.31±0.02, or N=none.")
    ] = None,
    extinction: Annotated[
        Text, option("--extinction", "MAG", "Interstellar, in K: 0.35±0.05; else none.")
    ] = None,
    distance: Annotated[Text, option("--distance", "VALUE", 'Distance: "2.1±0.2 kpc".')] = None,
    luminosity: Annotated[
        Text, option("--luminosity", "VALUE", 'Of both stars together: "(3.0±0.5)e5 Lsun".')
    ] = None,
    luminosity_a: Annotated[Text, option("--luminosity-a", "VALUE", "Of star A, Lsun.")] = None,
    luminosity_b: Annotated[Text, option("--luminosity-b", "VALUE", "Of star B, Lsun.")] = None,
    star_temperature: Annotated[
        Text, option("--star-temperature", "VALUE", "Of the brighter star, K.")
    ] = None,
    mass: Annotated[Text, option("--mass", "VALUE", "Of both stars together, Msun.")] = None,
    mass_a: Annotated[Text, option("--mass-a", "VALUE", "Of star A, Msun.")] = None,
    mass_b: Annotated[Text, option("--mass-b", "VALUE", "Of star B, Msun.")] = None,
    mass_loss_a: Annotated[Text, option("--mass-loss-a", "VALUE", "Of star A, Msun/yr.")] = None,
    mass_loss_b: Annotated[Text, option("--mass-loss-b", "VALUE", "Of star B, Msun/yr.")] = None,
    wind_speed_a: Annotated[Text, option("--wind-speed-a", "VALUE", "Of star A, km/s.")] = None,
    wind_speed_b: Annotated[Text, option("--wind-speed-b", "VALUE", "Of star B, km/s.")] = None,
    separation: Annotated[Text, option("--separation", "VALUE", "Of the stars when dust begins, au.")] = None,
    condensation: Annotated[
        Text, option("--condensation", "VALUE", 'Of carbon: "1200±100 K"; else "1000..1800 K".')
    ] = None,
    index: Annotated[Text, option("--index", "VALUE", "Emissivity index; else 1.2±0.1.")] = None,
    grain_radius: Annotated[Text, option("--grain-radius", "VALUE", "um; else that of the opacity.")] = None,
    grain_density: Annotated[Text, option("--grain-density", "VALUE", "g/cm3; else 1.8±0.2.")] = None,
    flow_speed: Annotated[Text, option("--flow-speed", "VALUE", "Of the shocked gas, km/s.")] = None,
    launch_speed: Annotated[Text, option("--launch-speed", "VALUE", "Of new grains; else the flow.")] = None,
    kappa_pr: Annotated[Text, option("--kappa-pr", "VALUE", "For radiation pressure, cm2/g of dust.")] = None,
    dust_share: Annotated[Text, option("--dust-share", "VALUE", 'Of the mass; else 0.01, as "1 %".')] = None,
    at_distance: Annotated[
        Text, option("--at-distance", "LIST", 'Grain temperatures at "20,50,100 au".')
    ] = None,
    solution: Annotated[Text, option("--solution", "LABEL", "Else the adopted one.")] = None,
    draws: Annotated[Text, option("--draws", "N", "Random draws; else 20000.")] = None,
    seed: Annotated[Text, option("--seed", "N", "Seed of the draws; else 1.")] = None,
    sample: Annotated[
        bool,
        typer.Option("--sample", help="On the invented sample campaign, no database.", show_default=False),
    ] = False,
    as_of: AsOfOption = None,
    db: DbOption = None,
    json: JsonOption = False,
) -> None:
    """Where dust condenses, how hot it is, and what its light weighs.

    \b
    For example:
      campaign dust "Kettle 7" --sample --condensation "1200±100 K"
      campaign dust "Kettle 7" --sample --on 2018-06-10 \\
        --zero-points Johnson-Glass
      campaign dust "Kettle 7" --sample --cycle 0 --within 20d \\
        --zero-points Johnson-Glass
    """
    given = dict(locals())
    from campaign.output import dust as output
    from campaign.reading.instants import read_duration
    from campaign.studies import dust as study
    from campaign.studies import watch

    _one_question(given)
    overrides = _overrides(given)
    asked = clock_instant(as_of, "--as-of")
    if sample:
        common.refuse_with_sample(db)
        campaign = watch.load_sample_campaign([system])
        fluxes: Any = ()
    else:
        place = common.database(db)
        campaign = watch.load_campaign(place, [system], None, asked)
        fluxes = study.fluxes_of(place, campaign.records[0].system.id, asked)
    question = study.DustQuestion(
        now=common.now_utc(),
        as_of=asked,
        on=clock_instant(on, "--on"),
        start=clock_instant(from_, "--from"),
        end=clock_instant(until, "--until"),
        cycle=None if cycle is None else whole_number(cycle, "--cycle", 100_000, 0),
        label=solution,
        **_numbers(given, read_duration),
    )
    result = study.tell_dust(campaign, overrides, question, fluxes)
    if json:
        common.write_json(output.dust_json(result))
    else:
        output.render_dust(common.stdout_screen(), result)


# Parameter, key of the input, unit, lowest and highest value; a range may stand for any of them.
_VALUES: tuple[tuple[str, str, str, float, float | None], ...] = (
    ("temperature", "temperature_k", "K", 20.0, 2500.0),
    ("distance", "distance_pc", "pc", 1e-3, None),
    ("luminosity", "luminosity_lsun", "lsun", 1e-3, None),
    ("luminosity_a", "luminosity_a_lsun", "lsun", 1e-3, None),
    ("luminosity_b", "luminosity_b_lsun", "lsun", 1e-3, None),
    ("star_temperature", "star_temperature_k", "K", 1e3, 1e6),
    ("mass", "mass_msun", "msun", 1e-2, None),
    ("mass_a", "mass_a_msun", "msun", 1e-2, None),
    ("mass_b", "mass_b_msun", "msun", 1e-2, None),
    ("mass_loss_a", "mass_loss_a_msun_yr", "msun/yr", 1e-13, None),
    ("mass_loss_b", "mass_loss_b_msun_yr", "msun/yr", 1e-13, None),
    ("wind_speed_a", "wind_speed_a_kms", "kms", 1.0, 299_792.458),
    ("wind_speed_b", "wind_speed_b_kms", "kms", 1.0, 299_792.458),
    ("separation", "separation_au", "au", 1e-6, None),
    ("condensation", "condensation_k", "K", 50.0, None),
    ("index", "emissivity_index", "", 0.0, 4.0),
    ("grain_radius", "grain_radius_um", "um", 1e-4, 1e3),
    ("grain_density", "grain_density_g_cm3", "g/cm3", 0.05, 30.0),
    ("flow_speed", "flow_speed_kms", "kms", 1.0, 299_792.458),
    ("launch_speed", "launch_speed_kms", "kms", 0.0, 299_792.458),
    ("kappa_pr", "kappa_pr_cm2_g", "cm2/g", 1e-6, None),
    ("dust_share", "dust_share", "fraction", 1e-8, 1.0),
)


def _overrides(given: dict[str, Any]) -> Any:
    """What stands in for the catalogue, by key."""
    from dataclasses import replace

    from campaign.model.dust import DustOpacity, DustOverrides
    from campaign.reading import dustoptions as read

    inputs = {}
    for name, key, unit, low, high in _VALUES:
        text = given[name]
        if text is not None:
            domain = {"low": low} if high is None else {"low": low, "high": high}
            inputs[key] = read.read_value_or_range(text, unit, f"--{name.replace('_', '-')}", **domain)
    opacity = DustOpacity() if given["opacity"] is None else read.read_opacity(given["opacity"])
    error = plain_number(given["opacity_error"], "fraction", "--opacity-error", low=0.0, high=10.0)
    return DustOverrides(
        inputs=inputs,
        opacity=replace(opacity, error=error),
        zero_points=tuple(read.read_zero_point(text) for text in given["zero_point"] or ()),
        zero_points_of=dict(read.read_zero_points_of(text) for text in given["zero_points"] or ()),
        levels=tuple(read.read_level(text) for text in given["level"] or ()),
        extinction_k_mag=read.read_extinction(given["extinction"]) if given["extinction"] else None,
        distances_au=() if given["at_distance"] is None else read.read_distances(given["at_distance"]),
    )


def _numbers(given: dict[str, Any], read_duration: Any) -> dict[str, Any]:
    """Days and counts that were given; the rest keeps its default."""
    from campaign.commands.parsing import count

    found = {
        "draws": count(given["draws"], "--draws", 100, 1_000_000),
        "seed": count(given["seed"], "--seed", 0, 2**32 - 1),
        "within_d": None if given["within"] is None else read_duration(given["within"], name="--within"),
    }
    return {name: value for name, value in found.items() if value is not None}


def _one_question(given: dict[str, Any]) -> None:
    """A date, a span or a cycle: not two of them."""
    asked = [
        flag
        for flag, names in (("--on", ("on",)), ("--from", ("from_", "until")), ("--cycle", ("cycle",)))
        if any(given[name] is not None for name in names)
    ]
    if len(asked) > 1:
        raise UsageRefused(
            f"{' and '.join(asked)} ask two things at once.",
            why="The dust is told at one date, or through one span or episode.",
            hint="Give --on alone, or --from with --until, or --cycle.",
        )
    if not asked and given["within"] is not None:
        raise UsageRefused(
            "--within needs a date.",
            why="It says how near to a date photometry is looked at.",
            hint="For example --on 2031-04-07 --within 20d.",
        )
