"""Tables of what is watched, from where, and who said so: systems, names, stars, sites, sources."""

from __future__ import annotations

from sqlalchemy import Table, TypedColumns, UniqueConstraint

from campaign.catalogue.columns import (
    check,
    choice,
    error_checks,
    identity,
    instant,
    line,
    maybe_instant,
    maybe_line,
    maybe_number,
    measured,
    metadata,
    number,
    partial_index,
    prose,
    reference,
    whole,
)
from campaign.model.systems import SYSTEM_STATES

# An entry that was taken back stays, and no longer holds its name.
IN_USE = "withdrawn_at IS NULL"


class SystemColumns(TypedColumns):
    """Position in ICRS at ``position_epoch_jyr``; the names stand in a table of their own."""

    id = identity()
    ra_deg = number()
    dec_deg = number()
    position_epoch_jyr = number()
    pm_ra_cosdec_mas_yr = maybe_number()
    pm_dec_mas_yr = maybe_number()
    distance_pc, distance_pc_minus, distance_pc_plus = measured()
    parallax_mas, parallax_mas_minus, parallax_mas_plus = measured()
    state = choice(*SYSTEM_STATES)
    priority = whole()
    notes = prose()
    cycle_anchor_bmjd_tdb = maybe_number()
    cycle_anchor_period_d = maybe_number()
    entered_at = instant()
    withdrawn_at = maybe_instant()


systems = Table(
    "systems",
    metadata,
    SystemColumns,
    check("ra", "ra_deg >= 0 AND ra_deg < 360"),
    check("dec", "dec_deg BETWEEN -90 AND 90"),
    check("distance", "distance_pc > 0"),
    check("priority", "priority BETWEEN 1 AND 9"),
    check("anchor_period", "cycle_anchor_period_d > 0"),
    *error_checks("distance_pc", "parallax_mas"),
)


class SystemNameColumns(TypedColumns):
    """Rank 0 is the primary name, 1, 2, ... are aliases in the order given."""

    id = identity()
    system_id = reference("systems.id")
    name_rank = whole()
    name = line(200)
    name_key = line(200)
    withdrawn_at = maybe_instant()


system_names = Table(
    "system_names",
    metadata,
    SystemNameColumns,
    check("name_rank", "name_rank >= 0"),
    check("name_key", "name_key <> ''"),
    partial_index("uq_system_names_name_key", "name_key", condition=IN_USE, unique=True),
    partial_index(
        "uq_system_names_system_id_name_rank", "system_id", "name_rank", condition=IN_USE, unique=True
    ),
)


class StarColumns(TypedColumns):
    """One star of a system; which one is A was fixed at entry."""

    id = identity()
    system_id = reference("systems.id")
    star = choice("A", "B")
    spectral_type = maybe_line(100)
    mass_msun, mass_msun_minus, mass_msun_plus = measured()
    luminosity_lsun, luminosity_lsun_minus, luminosity_lsun_plus = measured()
    temperature_k, temperature_k_minus, temperature_k_plus = measured()
    radius_rsun, radius_rsun_minus, radius_rsun_plus = measured()
    mass_loss_msun_yr, mass_loss_msun_yr_minus, mass_loss_msun_yr_plus = measured()
    wind_speed_kms, wind_speed_kms_minus, wind_speed_kms_plus = measured()


STAR_QUANTITIES = (
    "mass_msun",
    "luminosity_lsun",
    "temperature_k",
    "radius_rsun",
    "mass_loss_msun_yr",
    "wind_speed_kms",
)

stars = Table(
    "stars",
    metadata,
    StarColumns,
    UniqueConstraint("system_id", "star"),
    check("sizes", " AND ".join(f"{quantity} > 0" for quantity in STAR_QUANTITIES)),
    *error_checks(*STAR_QUANTITIES),
)


class SiteColumns(TypedColumns):
    """A place on the ground, or a space platform known by its solar elongations."""

    id = identity()
    name = line(200)
    name_key = line(200)
    kind = choice("ground", "space")
    latitude_deg = maybe_number()
    longitude_deg_east = maybe_number()
    height_m = maybe_number()
    horizon_deg = maybe_number()
    elongation_min_deg = maybe_number()
    elongation_max_deg = maybe_number()
    time_zone = maybe_line(100)
    notes = prose()
    entered_at = instant()
    withdrawn_at = maybe_instant()


sites = Table(
    "sites",
    metadata,
    SiteColumns,
    check("name_key", "name_key <> ''"),
    check("latitude", "latitude_deg BETWEEN -90 AND 90"),
    check("longitude", "longitude_deg_east BETWEEN -180 AND 360"),
    check("height", "height_m BETWEEN -500 AND 100000"),
    check("horizon", "horizon_deg BETWEEN -90 AND 90"),
    check(
        "elongation",
        "elongation_min_deg BETWEEN 0 AND 180 AND elongation_max_deg BETWEEN 0 AND 180"
        " AND elongation_min_deg <= elongation_max_deg",
    ),
    check("ground", "kind <> 'ground' OR (latitude_deg IS NOT NULL AND longitude_deg_east IS NOT NULL)"),
    partial_index("uq_sites_name_key", "name_key", condition=IN_USE, unique=True),
)


class SourceColumns(TypedColumns):
    """Where a value was published, or who gave it."""

    id = identity()
    title = line(500)
    source_key = line(500)
    entered_at = instant()


sources = Table(
    "sources",
    metadata,
    SourceColumns,
    UniqueConstraint("source_key"),
    check("source_key", "source_key <> ''"),
)
