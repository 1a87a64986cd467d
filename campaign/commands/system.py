"""``campaign system``: the stars under watch."""

from __future__ import annotations

from typing import Annotated, Any

import typer

from campaign.commands import common
from campaign.commands.common import DbOption, JsonOption, ObserverOption, QuietOption, option
from campaign.commands.parsing import measured, one_of, plain, plain_number
from campaign.errors import InputRefused, UsageRefused

Name = Annotated[str, typer.Argument(metavar="SYSTEM", help="Name or alias.")]
Text = str | None
RaOption = Annotated[Text, option("--ra", "RA", "Right ascension, ICRS: 18:02:31.5 or 270.631.")]
DecOption = Annotated[Text, option("--dec", "DEC", "Declination, ICRS: -45:12:30 or -45.2083.")]
EpochOption = Annotated[Text, option("--position-epoch", "YEAR", "Julian epoch of the position; else 2000.")]
PmRaOption = Annotated[Text, option("--pm-ra", "VALUE", "Proper motion in RA times cos(dec), mas/yr.")]
PmDecOption = Annotated[Text, option("--pm-dec", "VALUE", "Proper motion in declination, mas/yr.")]
DistanceOption = Annotated[Text, option("--distance", "VALUE", 'Distance: "2.1±0.2 kpc".')]
ParallaxOption = Annotated[Text, option("--parallax", "VALUE", 'Parallax: "0.48±0.03 mas".')]
StateOption = Annotated[Text, option("--state", "STATE", "episodic, persistent, candidate or retired.")]
PriorityOption = Annotated[Text, option("--priority", "1-5", "1 is watched first; else 3.")]
NoteOption = Annotated[Text, option("--note", "TEXT", "Anything worth knowing.")]
AliasOption = Annotated[
    list[str],
    typer.Option("--alias", metavar="NAME", help="Another name; may be repeated.", show_default=False),
]
TypeA = Annotated[Text, option("--type-a", "TYPE", "Spectral type of star A.")]
TypeB = Annotated[Text, option("--type-b", "TYPE", "Spectral type of star B.")]
MassA = Annotated[Text, option("--mass-a", "VALUE", "Mass of star A, Msun.")]
MassB = Annotated[Text, option("--mass-b", "VALUE", "Mass of star B, Msun.")]
LuminosityA = Annotated[Text, option("--luminosity-a", "VALUE", "Luminosity of star A, Lsun.")]
LuminosityB = Annotated[Text, option("--luminosity-b", "VALUE", "Luminosity of star B, Lsun.")]
TemperatureA = Annotated[Text, option("--temperature-a", "VALUE", "Temperature of star A, K.")]
TemperatureB = Annotated[Text, option("--temperature-b", "VALUE", "Temperature of star B, K.")]
RadiusA = Annotated[Text, option("--radius-a", "VALUE", "Radius of star A, Rsun.")]
RadiusB = Annotated[Text, option("--radius-b", "VALUE", "Radius of star B, Rsun.")]
MassLossA = Annotated[Text, option("--mass-loss-a", "VALUE", 'Mass loss of star A: "(3.1±0.4)e-5 Msun/yr".')]
MassLossB = Annotated[Text, option("--mass-loss-b", "VALUE", "Mass loss of star B, Msun/yr.")]
WindA = Annotated[Text, option("--wind-speed-a", "VALUE", "Terminal wind speed of star A, km/s.")]
WindB = Annotated[Text, option("--wind-speed-b", "VALUE", "Terminal wind speed of star B, km/s.")]


def add(
    name: Annotated[str, typer.Argument(metavar="SYSTEM", help="Its name.")],
    ra: RaOption = None,
    dec: DecOption = None,
    position_epoch: EpochOption = None,
    pm_ra: PmRaOption = None,
    pm_dec: PmDecOption = None,
    distance: DistanceOption = None,
    parallax: ParallaxOption = None,
    state: StateOption = None,
    priority: PriorityOption = None,
    alias: AliasOption = [],  # noqa: B006 - typer copies it
    note: NoteOption = None,
    type_a: TypeA = None,
    type_b: TypeB = None,
    mass_a: MassA = None,
    mass_b: MassB = None,
    luminosity_a: LuminosityA = None,
    luminosity_b: LuminosityB = None,
    temperature_a: TemperatureA = None,
    temperature_b: TemperatureB = None,
    radius_a: RadiusA = None,
    radius_b: RadiusB = None,
    mass_loss_a: MassLossA = None,
    mass_loss_b: MassLossB = None,
    wind_speed_a: WindA = None,
    wind_speed_b: WindB = None,
    db: DbOption = None,
    observer: ObserverOption = None,
    json: JsonOption = False,
    quiet: QuietOption = False,
) -> None:
    """Put a system under watch.

    \b
    For example:
      campaign system add "Lantern 3" --ra 18:02:31.5 --dec -45:12:30 \\
        --distance "2.1±0.2 kpc" --alias LN3
    """
    given = dict(locals())
    if ra is None or dec is None:
        raise UsageRefused(
            "A system needs its position.",
            why="Both --ra and --dec are needed: light time and seasons follow from them.",
            hint=f'campaign system add "{name}" --ra 18:02:31.5 --dec -45:12:30',
        )
    from campaign.model.systems import Star, System
    from campaign.studies import systems as study

    fields = _fields(given)
    fields["star_a"] = Star("A", **fields.pop("star_a", {}))
    fields["star_b"] = Star("B", **fields.pop("star_b", {}))
    system = System(id=0, name=plain(name, "SYSTEM", 120) or "", **fields)
    kept = study.add_system(common.database(db), common.stamp(observer), system)
    common.report(kept, json=json, quiet=quiet)


def change(
    name: Name,
    new_name: Annotated[Text, option("--name", "NAME", "A new name; the old one becomes an alias.")] = None,
    ra: RaOption = None,
    dec: DecOption = None,
    position_epoch: EpochOption = None,
    pm_ra: PmRaOption = None,
    pm_dec: PmDecOption = None,
    distance: DistanceOption = None,
    parallax: ParallaxOption = None,
    state: StateOption = None,
    priority: PriorityOption = None,
    alias: AliasOption = [],  # noqa: B006 - typer copies it
    note: NoteOption = None,
    type_a: TypeA = None,
    type_b: TypeB = None,
    mass_a: MassA = None,
    mass_b: MassB = None,
    luminosity_a: LuminosityA = None,
    luminosity_b: LuminosityB = None,
    temperature_a: TemperatureA = None,
    temperature_b: TemperatureB = None,
    radius_a: RadiusA = None,
    radius_b: RadiusB = None,
    mass_loss_a: MassLossA = None,
    mass_loss_b: MassLossB = None,
    wind_speed_a: WindA = None,
    wind_speed_b: WindB = None,
    db: DbOption = None,
    observer: ObserverOption = None,
    json: JsonOption = False,
    quiet: QuietOption = False,
) -> None:
    """Change what is given of a system; aliases are added."""
    given = dict(locals())
    from campaign.studies import systems as study

    changes = _fields(given)
    if new_name is not None:
        changes["name"] = plain(new_name, "--name", 120)
    if not changes:
        raise UsageRefused(
            "Nothing to change was given.",
            why="Only the options that are given change something.",
            hint=f'campaign system change "{name}" --distance "2.1±0.2 kpc"',
        )
    kept = study.change_system(common.database(db), common.stamp(observer), name, changes)
    common.report(kept, json=json, quiet=quiet)


def retire(
    name: Name,
    db: DbOption = None,
    observer: ObserverOption = None,
    json: JsonOption = False,
    quiet: QuietOption = False,
) -> None:
    """Take a system out of the watch; nothing is erased."""
    from campaign.studies import systems as study

    kept = study.retire_system(common.database(db), common.stamp(observer), name)
    common.report(kept, json=json, quiet=quiet)


def show(name: Name, db: DbOption = None, json: JsonOption = False) -> None:
    """Everything known of one system, and what follows from it."""
    from campaign.output import systems as output
    from campaign.studies import systems as study

    shown = study.show_system(common.database(db), name)
    if json:
        common.write_json(output.system_json(shown, common.now_iso()))
    else:
        output.render_system(common.stdout_screen(), shown)


def list_(
    retired: Annotated[bool, typer.Option("--retired", help="Retired ones too.", show_default=False)] = False,
    db: DbOption = None,
    json: JsonOption = False,
) -> None:
    """The systems under watch."""
    from campaign.output import systems as output
    from campaign.studies import systems as study

    found = study.list_systems(common.database(db), retired)
    if json:
        common.write_json(output.systems_json(found, common.now_iso()))
    else:
        output.render_systems(common.stdout_screen(), found)


_STAR_QUANTITIES = (
    ("mass", "mass_msun", "msun"),
    ("luminosity", "luminosity_lsun", "lsun"),
    ("temperature", "temperature_k", "K"),
    ("radius", "radius_rsun", "rsun"),
    ("mass_loss", "mass_loss_msun_yr", "msun/yr"),
    ("wind_speed", "wind_speed_kms", "kms"),
)
_LIGHT_KMS = 299_792.458


def _fields(given: dict[str, Any]) -> dict[str, Any]:  # noqa: PLR0912
    """The fields of a system, and of its stars, that were given."""
    from campaign.model.systems import SYSTEM_STATES
    from campaign.reading.angles import read_declination, read_right_ascension

    fields: dict[str, Any] = {}
    if given["ra"] is not None:
        fields["ra_deg"] = read_right_ascension(given["ra"])
    if given["dec"] is not None:
        fields["dec_deg"] = read_declination(given["dec"])
    if given["position_epoch"] is not None:
        fields["position_epoch_jyr"] = _between(given["position_epoch"], "--position-epoch", 1800, 2200, 2016)
    for key, field in (("pm_ra", "pm_ra_cosdec_mas_yr"), ("pm_dec", "pm_dec_mas_yr")):
        motion = plain_number(given[key], "mas/yr", "--" + key.replace("_", "-"), low=-2e4, high=2e4)
        if motion is not None:
            fields[field] = motion
    if given["distance"] is not None:
        fields["distance_pc"] = measured(given["distance"], "pc", "--distance", low=0.0, low_open=True)
    if given["parallax"] is not None:
        fields["parallax_mas"] = measured(given["parallax"], "mas", "--parallax")
    if given["state"] is not None:
        fields["state"] = one_of(given["state"], SYSTEM_STATES, "--state")
    if given["priority"] is not None:
        fields["priority"] = int(_between(given["priority"], "--priority", 1, 5, 1, whole=True))
    if given["note"] is not None:
        fields["notes"] = plain(given["note"], "--note", 2000)
    if given["alias"]:
        fields["aliases"] = tuple(plain(a, "--alias", 120) or "" for a in given["alias"])
    for star in ("a", "b"):
        values = _star_fields(given, star)
        if values:
            fields[f"star_{star}"] = values
    return fields


def _star_fields(given: dict[str, Any], star: str) -> dict[str, Any]:
    values: dict[str, Any] = {}
    if given[f"type_{star}"] is not None:
        values["spectral_type"] = plain(given[f"type_{star}"], f"--type-{star}", 40)
    for key, field, unit in _STAR_QUANTITIES:
        text = given[f"{key}_{star}"]
        if text is not None:
            high = _LIGHT_KMS if field == "wind_speed_kms" else None
            name = f"--{key.replace('_', '-')}-{star}"
            values[field] = measured(text, unit, name, low=0.0, low_open=True, high=high, high_open=True)
    return values


def _between(text: str, name: str, low: float, high: float, example: float, whole: bool = False) -> float:
    from campaign.reading.numbers import read_number

    value = read_number(text, name)
    if low <= value <= high and not (whole and value != int(value)):
        return value
    raise InputRefused(
        f"{name} {text} is out of range.",
        why=f"It is {'a whole number ' if whole else ''}from {low:g} to {high:g}.",
        hint=f"For example {name} {example:g}.",
        code="out-of-range",
    )
