"""``campaign winds``: the wind collision of one system through its orbit."""

from __future__ import annotations

from typing import Annotated, Any

import typer

from campaign.commands import common
from campaign.commands.common import AsOfOption, DbOption, JsonOption, option
from campaign.commands.parsing import (
    clock_instant,
    count,
    elements_instant,
    measured,
    one_of,
    period,
    semi_major_axis,
)
from campaign.errors import UsageRefused

Text = str | None


def winds(
    system: Annotated[str, typer.Argument(metavar="SYSTEM", help="Name or alias.")],
    from_: Annotated[Text, option("--from", "INSTANT", "First line; else now.")] = None,
    until: Annotated[Text, option("--until", "INSTANT", "Last line; else one period later.")] = None,
    step: Annotated[Text, option("--step", "SPAN", "As 30d; else a fortieth of the span.")] = None,
    solution: Annotated[Text, option("--solution", "LABEL", "Else the adopted one.")] = None,
    forms: Annotated[
        bool,
        typer.Option("--forms", help="Other published forms of the angle beside it.", show_default=False),
    ] = False,
    shape: Annotated[
        bool,
        typer.Option("--shape", help="The contact surface point by point.", show_default=False),
    ] = False,
    mass_loss_a: Annotated[
        Text, option("--mass-loss-a", "VALUE", 'In place of the catalogue: "(2.0±0.5)e-5 Msun/yr".')
    ] = None,
    mass_loss_b: Annotated[Text, option("--mass-loss-b", "VALUE", "The same of star B.")] = None,
    wind_speed_a: Annotated[Text, option("--wind-speed-a", "VALUE", "Terminal speed, km/s.")] = None,
    wind_speed_b: Annotated[Text, option("--wind-speed-b", "VALUE", "The same of star B.")] = None,
    radius_a: Annotated[Text, option("--radius-a", "VALUE", "Where the wind starts, Rsun.")] = None,
    radius_b: Annotated[Text, option("--radius-b", "VALUE", "The same of star B.")] = None,
    composition_a: Annotated[
        Text, option("--composition-a", "MIX", 'solar, WN, WNh, WC, WO or "He=0.5 C=0.4 O=0.1" by mass.')
    ] = None,
    composition_b: Annotated[Text, option("--composition-b", "MIX", "The same of star B.")] = None,
    momentum_ratio: Annotated[
        Text, option("--momentum-ratio", "VALUE", "Of B's wind over A's, in place of what follows.")
    ] = None,
    beta: Annotated[Text, option("--beta", "VALUE", "Exponent of the velocity law; else 1.")] = None,
    flare: Annotated[
        Text, option("--flare", "VALUE", "Shocks beyond the contact surface; else 20 deg.")
    ] = None,
    a: Annotated[Text, option("--a", "VALUE", 'Semi-major axis: "16±0.2 au" or "7.9±0.3 mas".')] = None,
    eccentricity: Annotated[Text, option("--eccentricity", "VALUE", "At least 0 and below 1.")] = None,
    inclination: Annotated[Text, option("--inclination", "VALUE", "0 to 180 deg.")] = None,
    omega: Annotated[Text, option("--omega", "VALUE", 'Argument of periastron, "143±2 deg".')] = None,
    omega_of: Annotated[Text, option("--omega-of", "A|B", "The star that omega belongs to.")] = None,
    period_text: Annotated[Text, option("--period", "VALUE", '"3127.5±0.3 d".')] = None,
    epoch: Annotated[Text, option("--epoch", "INSTANT", 'Of periastron: "BJD 2461234.2±0.5".')] = None,
    k_a: Annotated[Text, option("--k-a", "VALUE", "Velocity semi-amplitude of star A, km/s.")] = None,
    k_b: Annotated[Text, option("--k-b", "VALUE", "Velocity semi-amplitude of star B, km/s.")] = None,
    mass_a: Annotated[Text, option("--mass-a", "VALUE", "Mass of star A, Msun.")] = None,
    mass_b: Annotated[Text, option("--mass-b", "VALUE", "Mass of star B, Msun.")] = None,
    distance: Annotated[Text, option("--distance", "VALUE", 'Distance: "2.1±0.2 kpc".')] = None,
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
    """Where two winds collide, how hot, and what you look through.

    \b
    For example:
      campaign winds "Lantern 3" --mass-loss-a "(2.0±0.5)e-5" \\
        --wind-speed-a 2300±100 --mass-loss-b "(8±3)e-7" --wind-speed-b 2600±150
      campaign winds "Kettle 7" --sample --forms
    """
    given = dict(locals())
    from campaign.output import winds as output
    from campaign.reading.instants import read_duration
    from campaign.studies import watch
    from campaign.studies import winds as study

    asked = clock_instant(as_of, "--as-of")
    if sample:
        common.refuse_with_sample(db)
        campaign = watch.load_sample_campaign([system])
    else:
        campaign = watch.load_campaign(common.database(db), [system], None, asked)
    question = study.ask(
        campaign,
        now=common.now_utc(),
        as_of=asked,
        start=clock_instant(from_, "--from"),
        end=clock_instant(until, "--until"),
        step_d=None if step is None else read_duration(step, name="--step"),
        solution=solution,
        overrides=_overrides(given),
        draws=count(draws, "--draws", 100, 1_000_000),
        seed=count(seed, "--seed", 0, 2**32 - 1),
    )
    result = study.winds(campaign.records[0], question)
    if json:
        common.write_json(output.winds_json(result))
    else:
        output.render_winds(common.stdout_screen(), result, forms=forms, shape=shape)


_LIGHT_KMS = 299_792.458
_STAR_OPTIONS = (
    ("mass_loss", "mass_loss_msun_yr", "msun/yr", None),
    ("wind_speed", "wind_speed_kms", "kms", _LIGHT_KMS),
    ("radius", "radius_rsun", "rsun", None),
    ("mass", "mass_msun", "msun", None),
)


def _overrides(given: dict[str, Any]) -> Any:
    """What stands in for the catalogue, field by field."""
    from campaign.model.winds import WindOverrides
    from campaign.reading.compositions import read_composition

    mixes = {
        f"composition_{star}": read_composition(text, f"--composition-{star}")
        for star in ("a", "b")
        if (text := given[f"composition_{star}"]) is not None
    }
    far = measured(given["distance"], "pc", "--distance", low=0.0, low_open=True)
    return WindOverrides(
        star_a=_star(given, "a"),
        star_b=_star(given, "b"),
        system={} if far is None else {"distance_pc": far},
        solution=_elements(given),
        epoch=elements_instant(given["epoch"], "--epoch"),
        momentum_ratio_b_over_a=measured(
            given["momentum_ratio"], "", "--momentum-ratio", low=0.0, low_open=True
        ),
        beta=measured(given["beta"], "", "--beta", low=0.01, high=20.0),
        flare_deg=measured(given["flare"], "deg", "--flare", low=0.0, high=180.0),
        **mixes,
    )


def _star(given: dict[str, Any], star: str) -> dict[str, Any]:
    fields = {}
    for key, field, unit, high in _STAR_OPTIONS:
        name = f"--{key.replace('_', '-')}-{star}"
        value = measured(
            given[f"{key}_{star}"], unit, name, low=0.0, low_open=True, high=high, high_open=True
        )
        if value is not None:
            fields[field] = value
    return fields


def _elements(given: dict[str, Any]) -> dict[str, Any]:
    star = one_of(given["omega_of"], ("A", "B"), "--omega-of")
    if (given["omega"] is None) != (star is None):
        raise UsageRefused(
            "Whose omega is it?" if star is None else "--omega-of stands without --omega.",
            why="The arguments of the two stars differ by 180 deg; the wrong one turns the cone around.",
            hint='Give both, for example --omega "143±2 deg" --omega-of A.',
        )
    a_au, a_arcsec = semi_major_axis(given["a"])
    fields: dict[str, Any] = {
        "period_d": period(given["period_text"]),
        "eccentricity": measured(
            given["eccentricity"], "", "--eccentricity", low=0.0, high=1.0, high_open=True
        ),
        "inclination_deg": measured(given["inclination"], "deg", "--inclination", low=0.0, high=180.0),
        "omega_deg": measured(given["omega"], "deg", "--omega", low=-360.0, high=360.0),
        "omega_of": star,
        "k_a_kms": measured(given["k_a"], "kms", "--k-a", low=0.0, low_open=True),
        "k_b_kms": measured(given["k_b"], "kms", "--k-b", low=0.0, low_open=True),
    }
    found = {name: value for name, value in fields.items() if value is not None}
    if given["a"] is not None:
        # One of them alone: the catalogue's other size would otherwise be taken before it.
        found |= {"a_au": a_au, "a_arcsec": a_arcsec}
    return found
