"""Tables of what is believed of a system: solutions, their adoption, dust rules, episodes."""

from __future__ import annotations

from sqlalchemy import ForeignKeyConstraint, Index, Table, TypedColumns, UniqueConstraint

from campaign.catalogue.columns import (
    check,
    choice,
    error_checks,
    identity,
    instant,
    line,
    maybe_choice,
    maybe_document,
    maybe_instant,
    maybe_line,
    maybe_number,
    maybe_reference,
    maybe_whole,
    measured,
    metadata,
    moment,
    moment_checks,
    partial_index,
    prose,
    reference,
    whole,
)
from campaign.catalogue.tables_systems import IN_USE
from campaign.model.systems import EPOCH_MARKS, RULE_KINDS

PERIOD_KINDS = ("measured", "above", "below", "range")
EPISODE_STATES = ("proposed", "confirmed", "rejected")


class SolutionColumns(TypedColumns):
    """Orbital elements as published or fitted.

    ``period_d`` is the value, the bound or the lower end of a range, as ``period_kind`` says.
    """

    id = identity()
    system_id = reference("systems.id")
    label = line(100)
    label_key = line(100)
    period_kind = maybe_choice(*PERIOD_KINDS)
    period_d, period_d_minus, period_d_plus = measured()
    period_high_d = maybe_number()
    period_limit_sigma = maybe_number()
    epoch_bmjd_tdb, epoch_minus_d, epoch_plus_d, epoch_text, epoch_scale, epoch_place = moment()
    epoch_marks = choice(*EPOCH_MARKS)
    eccentricity, eccentricity_minus, eccentricity_plus = measured()
    omega_deg, omega_deg_minus, omega_deg_plus = measured()
    omega_of = maybe_choice("A", "B")
    inclination_deg, inclination_deg_minus, inclination_deg_plus = measured()
    node_deg, node_deg_minus, node_deg_plus = measured()
    k_a_kms, k_a_kms_minus, k_a_kms_plus = measured()
    k_b_kms, k_b_kms_minus, k_b_kms_plus = measured()
    gamma_kms, gamma_kms_minus, gamma_kms_plus = measured()
    a_au, a_au_minus, a_au_plus = measured()
    a_arcsec, a_arcsec_minus, a_arcsec_plus = measured()
    covariance = maybe_document()
    source_id = maybe_reference("sources.id")
    data_until_bmjd_tdb = maybe_number()
    epoch_cycle = maybe_whole()
    published_cycle_offset = maybe_whole()
    note = prose()
    entered_at = instant()
    withdrawn_at = maybe_instant()


ELEMENT_QUANTITIES = (
    "eccentricity",
    "omega_deg",
    "inclination_deg",
    "node_deg",
    "k_a_kms",
    "k_b_kms",
    "gamma_kms",
    "a_au",
    "a_arcsec",
)

solutions = Table(
    "solutions",
    metadata,
    SolutionColumns,
    # Lets an adoption name solution and system together, so that the two cannot disagree.
    UniqueConstraint("id", "system_id"),
    check("label_key", "label_key <> ''"),
    check("period", "period_d > 0 AND period_high_d > period_d AND period_limit_sigma > 0"),
    check(
        "period_kind",
        "(period_kind IS NULL) = (period_d IS NULL)"
        " AND (period_high_d IS NULL OR period_kind = 'range')"
        " AND (period_kind <> 'range' OR period_high_d IS NOT NULL)"
        " AND (period_kind NOT IN ('above', 'below') OR period_limit_sigma IS NOT NULL)",
    ),
    check("eccentricity_range", "eccentricity >= 0 AND eccentricity < 1"),
    check("angles", "omega_deg BETWEEN -360 AND 360 AND node_deg BETWEEN -360 AND 360"),
    check("omega_of", "omega_deg IS NULL OR omega_of IS NOT NULL"),
    check("inclination_range", "inclination_deg BETWEEN 0 AND 180"),
    check("sizes", "k_a_kms >= 0 AND k_b_kms >= 0 AND a_au > 0 AND a_arcsec > 0"),
    *error_checks("period_d", *ELEMENT_QUANTITIES),
    *moment_checks("epoch"),
    partial_index(
        "uq_solutions_system_id_label_key", "system_id", "label_key", condition=IN_USE, unique=True
    ),
)


class AdoptionColumns(TypedColumns):
    """Which solutions the forecast rests on, from when until when; weight NULL: alone."""

    id = identity()
    system_id = reference("systems.id")
    solution_id = whole()
    weight = maybe_number()
    adopted_at = instant()
    ended_at = maybe_instant()


_CURRENT = "ended_at IS NULL"
_CURRENT_ALONE = "ended_at IS NULL AND weight IS NULL"

adoptions = Table(
    "adoptions",
    metadata,
    AdoptionColumns,
    ForeignKeyConstraint(
        ["solution_id", "system_id"],
        ["solutions.id", "solutions.system_id"],
        name="fk_adoptions_solution_of_system",
    ),
    check("weight", "weight > 0"),
    Index("ix_adoptions_system_id", "system_id"),
    partial_index("uq_adoptions_current_alone", "system_id", condition=_CURRENT_ALONE, unique=True),
    partial_index("uq_adoptions_current_solution", "solution_id", condition=_CURRENT, unique=True),
)


class DustRuleColumns(TypedColumns):
    """How the stages follow from the orbit; offsets in periods or days as ``kind`` says.

    A new rule ends the one before.
    """

    id = identity()
    system_id = reference("systems.id")
    kind = choice(*RULE_KINDS)
    onset_offset, onset_offset_minus, onset_offset_plus = measured()
    maximum_offset, maximum_offset_minus, maximum_offset_plus = measured()
    end_offset, end_offset_minus, end_offset_plus = measured()
    critical_separation_au, critical_separation_au_minus, critical_separation_au_plus = measured()
    condensation_distance_au, condensation_distance_au_minus, condensation_distance_au_plus = measured()
    flow_speed_kms, flow_speed_kms_minus, flow_speed_kms_plus = measured()
    maximum_lag_d, maximum_lag_d_minus, maximum_lag_d_plus = measured()
    scatter_onset_d = maybe_number()
    scatter_maximum_d = maybe_number()
    scatter_end_d = maybe_number()
    note = prose()
    set_at = instant()
    ended_at = maybe_instant()


RULE_QUANTITIES = (
    "onset_offset",
    "maximum_offset",
    "end_offset",
    "critical_separation_au",
    "condensation_distance_au",
    "flow_speed_kms",
    "maximum_lag_d",
)

dust_rules = Table(
    "dust_rules",
    metadata,
    DustRuleColumns,
    check("sizes", "critical_separation_au > 0 AND condensation_distance_au >= 0 AND flow_speed_kms > 0"),
    check("scatter", "scatter_onset_d >= 0 AND scatter_maximum_d >= 0 AND scatter_end_d >= 0"),
    *error_checks(*RULE_QUANTITIES),
    Index("ix_dust_rules_system_id", "system_id"),
    partial_index("uq_dust_rules_current", "system_id", condition=_CURRENT, unique=True),
)


class EpisodeColumns(TypedColumns):
    """One burst of production: three dated stages, each with its band and method."""

    id = identity()
    system_id = reference("systems.id")
    cycle = maybe_whole()
    state = choice(*EPISODE_STATES)
    onset_bmjd_tdb, onset_minus_d, onset_plus_d, onset_text, onset_scale, onset_place = moment()
    onset_band = maybe_line(50)
    onset_method = maybe_line(200)
    (
        maximum_bmjd_tdb,
        maximum_minus_d,
        maximum_plus_d,
        maximum_text,
        maximum_scale,
        maximum_place,
    ) = moment()
    maximum_band = maybe_line(50)
    maximum_method = maybe_line(200)
    end_bmjd_tdb, end_minus_d, end_plus_d, end_text, end_scale, end_place = moment()
    end_band = maybe_line(50)
    end_method = maybe_line(200)
    source_id = maybe_reference("sources.id")
    note = prose()
    entered_at = instant()
    decided_at = maybe_instant()
    withdrawn_at = maybe_instant()
    replaces_id = maybe_reference("episodes.id")


episodes = Table(
    "episodes",
    metadata,
    EpisodeColumns,
    check("decided", "(state = 'proposed') = (decided_at IS NULL)"),
    *moment_checks("onset", "maximum", "end"),
    Index("ix_episodes_system_id", "system_id"),
)
