"""The catalogue from nothing: systems, knowledge, observations, history.

Revision ID: 0001
Revises:
"""

from __future__ import annotations

import sqlalchemy as sa
from alembic import op

revision = "0001"
down_revision = None
branch_labels = None
depends_on = None

UTC_TEXT = sa.String(27)
WORD = sa.String(32)


def identity() -> sa.Column:
    return sa.Column("id", sa.Integer, nullable=False)


def measured(name: str) -> list[sa.Column]:
    """A value with the sizes of its lower and upper error."""
    return [sa.Column(name + part, sa.Double) for part in ("", "_minus", "_plus")]


def moment(prefix: str) -> list[sa.Column]:
    """An instant with its errors, and text, scale and place as typed."""
    return [
        sa.Column(f"{prefix}_bmjd_tdb", sa.Double),
        sa.Column(f"{prefix}_minus_d", sa.Double),
        sa.Column(f"{prefix}_plus_d", sa.Double),
        sa.Column(f"{prefix}_text", sa.String(200)),
        sa.Column(f"{prefix}_scale", WORD),
        sa.Column(f"{prefix}_place", WORD),
    ]


def check(table: str, name: str, condition: str) -> sa.CheckConstraint:
    return sa.CheckConstraint(condition, name=f"ck_{table}_{name}")


def _sizes(value: str, minus: str, plus: str) -> str:
    return f"{minus} >= 0 AND {plus} >= 0 AND ({value} IS NOT NULL OR ({minus} IS NULL AND {plus} IS NULL))"


def error_checks(table: str, *names: str) -> list[sa.CheckConstraint]:
    return [check(table, name, _sizes(name, f"{name}_minus", f"{name}_plus")) for name in names]


def moment_checks(table: str, *prefixes: str) -> list[sa.CheckConstraint]:
    return [
        check(table, f"{p}_errors", _sizes(f"{p}_bmjd_tdb", f"{p}_minus_d", f"{p}_plus_d")) for p in prefixes
    ]


def partial_index(name: str, table: str, column: str, condition: str, *, unique: bool) -> None:
    where = sa.text(condition)
    op.create_index(name, table, [column], unique=unique, sqlite_where=where, postgresql_where=where)


def upgrade() -> None:
    _create_systems()
    _create_system_names()
    _create_stars()
    _create_sites()
    _create_sources()
    _create_solutions()
    _create_adoptions()
    _create_dust_rules()
    _create_episodes()
    _create_operations()
    _create_changes()
    _create_observations()
    _create_campaign_info()


def _create_systems() -> None:
    op.create_table(
        "systems",
        identity(),
        sa.Column("ra_deg", sa.Double, nullable=False),
        sa.Column("dec_deg", sa.Double, nullable=False),
        sa.Column("position_epoch_jyr", sa.Double, nullable=False),
        sa.Column("pm_ra_cosdec_mas_yr", sa.Double),
        sa.Column("pm_dec_mas_yr", sa.Double),
        *measured("distance_pc"),
        *measured("parallax_mas"),
        sa.Column("state", WORD, nullable=False),
        sa.Column("priority", sa.Integer, nullable=False),
        sa.Column("notes", sa.Text, nullable=False),
        sa.Column("cycle_anchor_bmjd_tdb", sa.Double),
        sa.Column("cycle_anchor_period_d", sa.Double),
        sa.Column("entered_at", UTC_TEXT, nullable=False),
        sa.PrimaryKeyConstraint("id", name="pk_systems"),
        check("systems", "ra", "ra_deg >= 0 AND ra_deg < 360"),
        check("systems", "dec", "dec_deg BETWEEN -90 AND 90"),
        check("systems", "distance", "distance_pc > 0"),
        check("systems", "priority", "priority BETWEEN 1 AND 9"),
        check("systems", "anchor_period", "cycle_anchor_period_d > 0"),
        *error_checks("systems", "distance_pc", "parallax_mas"),
    )


def _create_system_names() -> None:
    op.create_table(
        "system_names",
        identity(),
        sa.Column("system_id", sa.Integer, nullable=False),
        sa.Column("name_rank", sa.Integer, nullable=False),
        sa.Column("name", sa.String(200), nullable=False),
        sa.Column("name_key", sa.String(200), nullable=False),
        sa.PrimaryKeyConstraint("id", name="pk_system_names"),
        sa.UniqueConstraint("name_key", name="uq_system_names_name_key"),
        sa.UniqueConstraint("system_id", "name_rank", name="uq_system_names_system_id_name_rank"),
        sa.ForeignKeyConstraint(["system_id"], ["systems.id"], name="fk_system_names_system_id"),
        check("system_names", "name_rank", "name_rank >= 0"),
        check("system_names", "name_key", "name_key <> ''"),
    )


def _create_stars() -> None:
    op.create_table(
        "stars",
        identity(),
        sa.Column("system_id", sa.Integer, nullable=False),
        sa.Column("star", WORD, nullable=False),
        sa.Column("spectral_type", sa.String(100)),
        *measured("mass_msun"),
        *measured("luminosity_lsun"),
        *measured("temperature_k"),
        *measured("radius_rsun"),
        *measured("mass_loss_msun_yr"),
        *measured("wind_speed_kms"),
        sa.PrimaryKeyConstraint("id", name="pk_stars"),
        sa.UniqueConstraint("system_id", "star", name="uq_stars_system_id_star"),
        sa.ForeignKeyConstraint(["system_id"], ["systems.id"], name="fk_stars_system_id"),
        check(
            "stars",
            "sizes",
            "mass_msun > 0 AND luminosity_lsun > 0 AND temperature_k > 0 AND radius_rsun > 0"
            " AND mass_loss_msun_yr > 0 AND wind_speed_kms > 0",
        ),
        *error_checks(
            "stars",
            "mass_msun",
            "luminosity_lsun",
            "temperature_k",
            "radius_rsun",
            "mass_loss_msun_yr",
            "wind_speed_kms",
        ),
    )


def _create_sites() -> None:
    op.create_table(
        "sites",
        identity(),
        sa.Column("name", sa.String(200), nullable=False),
        sa.Column("name_key", sa.String(200), nullable=False),
        sa.Column("kind", WORD, nullable=False),
        sa.Column("latitude_deg", sa.Double),
        sa.Column("longitude_deg_east", sa.Double),
        sa.Column("height_m", sa.Double),
        sa.Column("horizon_deg", sa.Double),
        sa.Column("elongation_min_deg", sa.Double),
        sa.Column("elongation_max_deg", sa.Double),
        sa.Column("time_zone", sa.String(100)),
        sa.Column("notes", sa.Text, nullable=False),
        sa.Column("entered_at", UTC_TEXT, nullable=False),
        sa.PrimaryKeyConstraint("id", name="pk_sites"),
        sa.UniqueConstraint("name_key", name="uq_sites_name_key"),
        check("sites", "name_key", "name_key <> ''"),
        check("sites", "latitude", "latitude_deg BETWEEN -90 AND 90"),
        check("sites", "longitude", "longitude_deg_east BETWEEN -180 AND 360"),
        check("sites", "height", "height_m BETWEEN -500 AND 100000"),
        check("sites", "horizon", "horizon_deg BETWEEN -90 AND 90"),
        check(
            "sites",
            "elongation",
            "elongation_min_deg BETWEEN 0 AND 180 AND elongation_max_deg BETWEEN 0"
            " AND 180 AND elongation_min_deg <= elongation_max_deg",
        ),
        check(
            "sites",
            "ground",
            "kind <> 'ground' OR (latitude_deg IS NOT NULL AND longitude_deg_east IS NOT NULL)",
        ),
    )


def _create_sources() -> None:
    op.create_table(
        "sources",
        identity(),
        sa.Column("title", sa.String(500), nullable=False),
        sa.Column("source_key", sa.String(500), nullable=False),
        sa.Column("entered_at", UTC_TEXT, nullable=False),
        sa.PrimaryKeyConstraint("id", name="pk_sources"),
        sa.UniqueConstraint("source_key", name="uq_sources_source_key"),
        check("sources", "source_key", "source_key <> ''"),
    )


def _create_solutions() -> None:
    op.create_table(
        "solutions",
        identity(),
        sa.Column("system_id", sa.Integer, nullable=False),
        sa.Column("label", sa.String(100), nullable=False),
        sa.Column("label_key", sa.String(100), nullable=False),
        sa.Column("period_kind", WORD),
        *measured("period_d"),
        sa.Column("period_high_d", sa.Double),
        sa.Column("period_limit_sigma", sa.Double),
        *moment("epoch"),
        sa.Column("epoch_marks", WORD, nullable=False),
        *measured("eccentricity"),
        *measured("omega_deg"),
        sa.Column("omega_of", WORD),
        *measured("inclination_deg"),
        *measured("node_deg"),
        *measured("k_a_kms"),
        *measured("k_b_kms"),
        *measured("gamma_kms"),
        *measured("a_au"),
        *measured("a_arcsec"),
        sa.Column("covariance", sa.Text),
        sa.Column("source_id", sa.Integer),
        sa.Column("data_until_bmjd_tdb", sa.Double),
        sa.Column("epoch_cycle", sa.Integer),
        sa.Column("published_cycle_offset", sa.Integer),
        sa.Column("note", sa.Text, nullable=False),
        sa.Column("entered_at", UTC_TEXT, nullable=False),
        sa.PrimaryKeyConstraint("id", name="pk_solutions"),
        sa.UniqueConstraint("system_id", "label_key", name="uq_solutions_system_id_label_key"),
        sa.UniqueConstraint("id", "system_id", name="uq_solutions_id_system_id"),
        sa.ForeignKeyConstraint(["system_id"], ["systems.id"], name="fk_solutions_system_id"),
        sa.ForeignKeyConstraint(["source_id"], ["sources.id"], name="fk_solutions_source_id"),
        check("solutions", "label_key", "label_key <> ''"),
        check("solutions", "period", "period_d > 0 AND period_high_d > period_d AND period_limit_sigma > 0"),
        check(
            "solutions",
            "period_kind",
            "(period_kind IS NULL) = (period_d IS NULL)"
            " AND (period_high_d IS NULL OR period_kind = 'range')"
            " AND (period_kind <> 'range' OR period_high_d IS NOT NULL)"
            " AND (period_kind NOT IN ('above', 'below') OR period_limit_sigma IS NOT NULL)",
        ),
        check("solutions", "eccentricity_range", "eccentricity >= 0 AND eccentricity < 1"),
        check("solutions", "angles", "omega_deg BETWEEN -360 AND 360 AND node_deg BETWEEN -360 AND 360"),
        check("solutions", "omega_of", "omega_deg IS NULL OR omega_of IS NOT NULL"),
        check("solutions", "inclination_range", "inclination_deg BETWEEN 0 AND 180"),
        check("solutions", "sizes", "k_a_kms >= 0 AND k_b_kms >= 0 AND a_au > 0 AND a_arcsec > 0"),
        *error_checks(
            "solutions",
            "period_d",
            "eccentricity",
            "omega_deg",
            "inclination_deg",
            "node_deg",
            "k_a_kms",
            "k_b_kms",
            "gamma_kms",
            "a_au",
            "a_arcsec",
        ),
        *moment_checks("solutions", "epoch"),
    )


def _create_adoptions() -> None:
    op.create_table(
        "adoptions",
        identity(),
        sa.Column("system_id", sa.Integer, nullable=False),
        sa.Column("solution_id", sa.Integer, nullable=False),
        sa.Column("weight", sa.Double),
        sa.Column("adopted_at", UTC_TEXT, nullable=False),
        sa.Column("ended_at", UTC_TEXT),
        sa.PrimaryKeyConstraint("id", name="pk_adoptions"),
        sa.ForeignKeyConstraint(
            ["solution_id", "system_id"],
            ["solutions.id", "solutions.system_id"],
            name="fk_adoptions_solution_of_system",
        ),
        sa.ForeignKeyConstraint(["system_id"], ["systems.id"], name="fk_adoptions_system_id"),
        check("adoptions", "weight", "weight > 0"),
    )
    op.create_index("ix_adoptions_system_id", "adoptions", ["system_id"])
    partial_index(
        "uq_adoptions_current_alone",
        "adoptions",
        "system_id",
        "ended_at IS NULL AND weight IS NULL",
        unique=True,
    )
    partial_index(
        "uq_adoptions_current_solution", "adoptions", "solution_id", "ended_at IS NULL", unique=True
    )


def _create_dust_rules() -> None:
    op.create_table(
        "dust_rules",
        identity(),
        sa.Column("system_id", sa.Integer, nullable=False),
        sa.Column("kind", WORD, nullable=False),
        *measured("onset_offset"),
        *measured("maximum_offset"),
        *measured("end_offset"),
        *measured("critical_separation_au"),
        *measured("condensation_distance_au"),
        *measured("flow_speed_kms"),
        *measured("maximum_lag_d"),
        sa.Column("scatter_onset_d", sa.Double),
        sa.Column("scatter_maximum_d", sa.Double),
        sa.Column("scatter_end_d", sa.Double),
        sa.Column("note", sa.Text, nullable=False),
        sa.Column("set_at", UTC_TEXT, nullable=False),
        sa.Column("ended_at", UTC_TEXT),
        sa.PrimaryKeyConstraint("id", name="pk_dust_rules"),
        sa.ForeignKeyConstraint(["system_id"], ["systems.id"], name="fk_dust_rules_system_id"),
        check(
            "dust_rules",
            "sizes",
            "critical_separation_au > 0 AND condensation_distance_au >= 0 AND flow_speed_kms > 0",
        ),
        check(
            "dust_rules", "scatter", "scatter_onset_d >= 0 AND scatter_maximum_d >= 0 AND scatter_end_d >= 0"
        ),
        *error_checks(
            "dust_rules",
            "onset_offset",
            "maximum_offset",
            "end_offset",
            "critical_separation_au",
            "condensation_distance_au",
            "flow_speed_kms",
            "maximum_lag_d",
        ),
    )
    op.create_index("ix_dust_rules_system_id", "dust_rules", ["system_id"])
    partial_index("uq_dust_rules_current", "dust_rules", "system_id", "ended_at IS NULL", unique=True)


def _create_episodes() -> None:
    op.create_table(
        "episodes",
        identity(),
        sa.Column("system_id", sa.Integer, nullable=False),
        sa.Column("cycle", sa.Integer),
        sa.Column("state", WORD, nullable=False),
        *moment("onset"),
        sa.Column("onset_band", sa.String(50)),
        sa.Column("onset_method", sa.String(200)),
        *moment("maximum"),
        sa.Column("maximum_band", sa.String(50)),
        sa.Column("maximum_method", sa.String(200)),
        *moment("end"),
        sa.Column("end_band", sa.String(50)),
        sa.Column("end_method", sa.String(200)),
        sa.Column("source_id", sa.Integer),
        sa.Column("note", sa.Text, nullable=False),
        sa.Column("entered_at", UTC_TEXT, nullable=False),
        sa.Column("decided_at", UTC_TEXT),
        sa.Column("withdrawn_at", UTC_TEXT),
        sa.Column("replaces_id", sa.Integer),
        sa.PrimaryKeyConstraint("id", name="pk_episodes"),
        sa.ForeignKeyConstraint(["system_id"], ["systems.id"], name="fk_episodes_system_id"),
        sa.ForeignKeyConstraint(["source_id"], ["sources.id"], name="fk_episodes_source_id"),
        sa.ForeignKeyConstraint(["replaces_id"], ["episodes.id"], name="fk_episodes_replaces_id"),
        check("episodes", "decided", "(state = 'proposed') = (decided_at IS NULL)"),
        *moment_checks("episodes", "onset", "maximum", "end"),
    )
    op.create_index("ix_episodes_system_id", "episodes", ["system_id"])


def _create_operations() -> None:
    op.create_table(
        "operations",
        identity(),
        sa.Column("uid", sa.String(36), nullable=False),
        sa.Column("at", UTC_TEXT, nullable=False),
        sa.Column("who", sa.String(200), nullable=False),
        sa.Column("command", sa.Text, nullable=False),
        sa.Column("summary", sa.Text, nullable=False),
        sa.Column("program_version", sa.String(50), nullable=False),
        sa.PrimaryKeyConstraint("id", name="pk_operations"),
        sa.UniqueConstraint("uid", name="uq_operations_uid"),
    )


def _create_changes() -> None:
    op.create_table(
        "changes",
        identity(),
        sa.Column("operation_id", sa.Integer, nullable=False),
        sa.Column("table_name", sa.String(63), nullable=False),
        sa.Column("row_id", sa.Integer),
        sa.Column("action", WORD, nullable=False),
        sa.Column("before", sa.Text),
        sa.Column("after", sa.Text),
        sa.PrimaryKeyConstraint("id", name="pk_changes"),
        sa.ForeignKeyConstraint(["operation_id"], ["operations.id"], name="fk_changes_operation_id"),
    )
    op.create_index("ix_changes_operation_id", "changes", ["operation_id"])
    op.create_index("ix_changes_table_name_row_id", "changes", ["table_name", "row_id"])


def _create_observations() -> None:
    op.create_table(
        "observations",
        identity(),
        sa.Column("uid", sa.String(36), nullable=False),
        sa.Column("system_id", sa.Integer, nullable=False),
        sa.Column("kind", WORD, nullable=False),
        sa.Column("bmjd_tdb", sa.Double, nullable=False),
        sa.Column("time_minus_d", sa.Double),
        sa.Column("time_plus_d", sa.Double),
        sa.Column("time_text", sa.String(200), nullable=False),
        sa.Column("time_scale", WORD, nullable=False),
        sa.Column("time_place", WORD, nullable=False),
        *measured("value"),
        sa.Column("unit", sa.String(20)),
        sa.Column("limit_side", WORD),
        sa.Column("limit_sigma", sa.Double),
        sa.Column("band", sa.String(50)),
        sa.Column("photometric_system", sa.String(50)),
        sa.Column("frequency_ghz", sa.Double),
        sa.Column("energy_low_kev", sa.Double),
        sa.Column("energy_high_kev", sa.Double),
        sa.Column("star", sa.String(20)),
        sa.Column("species", sa.String(50)),
        *measured("position_angle_deg"),
        sa.Column("correlation", sa.Double),
        sa.Column("feature", sa.String(100)),
        sa.Column("measured_at", WORD),
        sa.Column("plate_scale_error", sa.Double),
        sa.Column("shell_index", sa.Integer),
        sa.Column("site_id", sa.Integer),
        sa.Column("observer", sa.String(200)),
        sa.Column("instrument", sa.String(200)),
        sa.Column("comparison_star", sa.String(200)),
        sa.Column("source_id", sa.Integer),
        sa.Column("quality", WORD, nullable=False),
        sa.Column("text", sa.Text, nullable=False),
        sa.Column("sameness", sa.String(32)),
        sa.Column("entered_at", UTC_TEXT, nullable=False),
        sa.Column("operation_id", sa.Integer, nullable=False),
        sa.Column("superseded_by_id", sa.Integer),
        sa.Column("superseded_at", UTC_TEXT),
        sa.Column("withdrawn_at", UTC_TEXT),
        sa.PrimaryKeyConstraint("id", name="pk_observations"),
        sa.UniqueConstraint("uid", name="uq_observations_uid"),
        sa.UniqueConstraint("sameness", name="uq_observations_sameness"),
        sa.ForeignKeyConstraint(["system_id"], ["systems.id"], name="fk_observations_system_id"),
        sa.ForeignKeyConstraint(["site_id"], ["sites.id"], name="fk_observations_site_id"),
        sa.ForeignKeyConstraint(["source_id"], ["sources.id"], name="fk_observations_source_id"),
        sa.ForeignKeyConstraint(["operation_id"], ["operations.id"], name="fk_observations_operation_id"),
        sa.ForeignKeyConstraint(
            ["superseded_by_id"], ["observations.id"], name="fk_observations_superseded_by_id"
        ),
        check("observations", "value_given", "(kind IN ('attempt', 'remark')) = (value IS NULL)"),
        check("observations", "time_errors", "time_minus_d >= 0 AND time_plus_d >= 0"),
        check(
            "observations",
            "limit",
            "limit_side IS NULL OR (value IS NOT NULL AND limit_sigma IS NOT NULL AND limit_sigma > 0)",
        ),
        check(
            "observations",
            "spectral_range",
            "frequency_ghz > 0 AND energy_low_kev >= 0 AND energy_high_kev > energy_low_kev",
        ),
        check("observations", "correlation", "correlation BETWEEN -1 AND 1"),
        check("observations", "plate_scale", "plate_scale_error >= 0"),
        check("observations", "shell_index", "shell_index >= 1"),
        check("observations", "superseded", "(superseded_by_id IS NULL) = (superseded_at IS NULL)"),
        *error_checks("observations", "value", "position_angle_deg"),
    )
    op.create_index("ix_observations_operation_id", "observations", ["operation_id"])
    partial_index(
        "ix_observations_superseded_by_id",
        "observations",
        "superseded_by_id",
        "superseded_by_id IS NOT NULL",
        unique=False,
    )
    op.create_index(
        "ix_observations_system_id_kind_bmjd_tdb", "observations", ["system_id", "kind", "bmjd_tdb"]
    )


def _create_campaign_info() -> None:
    op.create_table(
        "campaign_info",
        identity(),
        sa.Column("key", sa.String(50), nullable=False),
        sa.Column("value", sa.String(500), nullable=False),
        sa.PrimaryKeyConstraint("id", name="pk_campaign_info"),
        sa.UniqueConstraint("key", name="uq_campaign_info_key"),
    )
