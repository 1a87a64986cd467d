"""``campaign site``: places to observe from."""

from __future__ import annotations

from difflib import get_close_matches
from typing import Annotated

import typer

from campaign.commands import common
from campaign.commands.common import DbOption, JsonOption, ObserverOption, QuietOption, option
from campaign.commands.parsing import plain, plain_number
from campaign.errors import InputRefused

Text = str | None


def add(
    name: Annotated[str, typer.Argument(metavar="SITE", help="Its name.")],
    latitude: Annotated[Text, option("--latitude", "ANGLE", "Geodetic: -31.20 or 31:12 S.")] = None,
    longitude: Annotated[Text, option("--longitude", "ANGLE", "East positive: -70.00 or 70.00 W.")] = None,
    height: Annotated[Text, option("--height", "VALUE", "Above the ellipsoid, m.")] = None,
    horizon: Annotated[Text, option("--horizon", "ANGLE", "Lowest altitude to point at, deg.")] = None,
    elongation: Annotated[
        Text, option("--elongation", "LOW..HIGH", "A space platform: its range of angles from the Sun, deg.")
    ] = None,
    time_zone: Annotated[Text, option("--time-zone", "NAME", "For example Etc/GMT+4.")] = None,
    note: Annotated[Text, option("--note", "TEXT", "Anything worth knowing.")] = None,
    db: DbOption = None,
    observer: ObserverOption = None,
    json: JsonOption = False,
    quiet: QuietOption = False,
) -> None:
    """Add a site on the ground, or a space platform.

    \b
    For example:
      campaign site add "Cold Mesa" --latitude -31.20 --longitude "70.00 W" \\
        --height "2300 m"
      campaign site add "Orbiter" --elongation 85..135
    """
    from campaign.model.measured import Range
    from campaign.model.systems import Site
    from campaign.reading.angles import read_latitude, read_longitude
    from campaign.reading.values import read_measured_or_bound
    from campaign.studies import sites as study

    span = (
        read_measured_or_bound(elongation, "deg", "--elongation", low=0.0, high=180.0) if elongation else None
    )
    _one_kind(name, elongation, latitude, longitude, height, horizon)
    metres = plain_number(height, "m", "--height", low=-500.0, high=9000.0)
    lowest = plain_number(horizon, "deg", "--horizon", low=-5.0, high=90.0)
    site = Site(
        id=0,
        name=plain(name, "SITE", 120) or "",
        kind="space" if elongation is not None else "ground",
        latitude_deg=None if latitude is None else read_latitude(latitude),
        longitude_deg_east=None if longitude is None else read_longitude(longitude),
        height_m=metres,
        horizon_deg=lowest,
        elongation_min_deg=span.low if isinstance(span, Range) else None,
        elongation_max_deg=span.high if isinstance(span, Range) else None,
        time_zone=_known_zone(time_zone),
        notes=plain(note, "--note", 2000) or "",
    )
    common.report(study.add_site(common.database(db), common.stamp(observer), site), json=json, quiet=quiet)


def _one_kind(name: str, elongation: str | None, *of_the_ground: str | None) -> None:
    if elongation is not None and any(text is not None for text in of_the_ground):
        raise InputRefused(
            f"The site {name} is given as two things at once.",
            why="It is either a place on the ground or a space platform, which has no latitude.",
            hint="Leave out --elongation for the ground; give it alone for a space platform.",
            code="site-kind-unclear",
        )


def _known_zone(name: str | None) -> str | None:
    """The name of a time zone, as far as this machine can tell."""
    import zoneinfo

    zone = plain(name, "--time-zone", 60)
    known = zoneinfo.available_timezones()
    if zone is None or not known or zone in known:
        return zone
    near = get_close_matches(zone, known, n=3, cutoff=0.5)
    raise InputRefused(
        f"There is no time zone '{zone}'.",
        why="Zones are named by region and place, or by their offset, whose sign is turned round.",
        hint=f"For example {' or '.join([*near, 'Etc/GMT+4'])}; or leave it out.",
        code="time-zone-unknown",
        details={"nearest": near},
    )


def list_(db: DbOption = None, json: JsonOption = False) -> None:
    """The sites of the campaign."""
    from campaign.output import systems as output
    from campaign.studies import sites as study

    found = study.list_sites(common.database(db))
    if json:
        common.write_json(output.sites_json(found, common.now_iso()))
    else:
        output.render_sites(common.stdout_screen(), found)
