"""Keep sites: places on the ground and space platforms."""

from __future__ import annotations

from campaign.catalogue import sites as kept
from campaign.catalogue import store
from campaign.errors import InputRefused
from campaign.model.kept import Kept, Stamp
from campaign.model.systems import Site


def add_site(db: str, stamp: Stamp, site: Site) -> Kept:
    """Add a site.

    Parameters
    ----------
    db : str
        Path or SQLAlchemy URL.
    stamp : Stamp
        Who, when, which command.
    site : Site
        Geodetic position (deg, east positive; m), or a solar-elongation range (deg) for a space platform.

    Returns
    -------
    Kept
        What was written.

    Raises
    ------
    InputRefused, Conflict
        A position or range is missing or cannot be; the name is taken.

    Notes
    -----
    Accuracy: not applicable. Source: project convention.
    """
    _check(site)
    with store.writing(db, at=stamp.at, who=stamp.who, command=stamp.command) as writing:
        site_id = kept.add_site(writing, site)
        writing.summarise(f"added site {site.name}")
    return Kept(
        "site-add",
        True,
        (f"added site {site.name}: {describe_site(site)}",),
        {"site": site.name, "id": site_id},
    )


def _check(site: Site) -> None:
    if site.kind == "ground" and (site.latitude_deg is None or site.longitude_deg_east is None):
        raise InputRefused(
            f"The site {site.name} has no position.",
            why="A site on the ground needs its latitude and its longitude (east positive).",
            hint='For example --latitude -31.20 --longitude "70.00 W" --height "2300 m".',
            code="site-position-missing",
        )
    if site.kind == "space":
        low, high = site.elongation_min_deg, site.elongation_max_deg
        if low is None or high is None or not low < high:
            raise InputRefused(
                f"The space platform {site.name} has no solar-elongation range.",
                why="It is known by the range of angles from the Sun at which it may point.",
                hint="For example --elongation 85..135.",
                code="site-elongation-missing",
            )


def list_sites(db: str) -> list[Site]:
    """All sites of the catalogue.

    Parameters
    ----------
    db : str
        Path or SQLAlchemy URL.

    Returns
    -------
    list of Site
        By name; deg and m.

    Notes
    -----
    Accuracy: not applicable. Source: the catalogue.
    """
    with store.reading(db) as connection:
        return kept.list_sites(connection)


def describe_site(site: Site) -> str:
    """A site in a few words.

    Parameters
    ----------
    site : Site
        deg, m.

    Returns
    -------
    str
        One phrase.

    Notes
    -----
    Accuracy: printed to 0.0001 deg. Source: project convention.
    """
    if site.kind == "space":
        return f"space platform, {site.elongation_min_deg:g} to {site.elongation_max_deg:g} deg from the Sun"
    latitude, longitude = site.latitude_deg or 0.0, site.longitude_deg_east or 0.0
    north, east = ("N" if latitude >= 0 else "S"), ("E" if longitude >= 0 else "W")
    height = f", {site.height_m:g} m" if site.height_m is not None else ""
    return f"{abs(latitude):.4f} {north}, {abs(longitude):.4f} {east}{height}"
