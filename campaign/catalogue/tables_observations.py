"""The one wide table of observations of every kind."""

from __future__ import annotations

from sqlalchemy import Index, Table, TypedColumns, UniqueConstraint

from campaign.catalogue.columns import (
    PLACES,
    SCALES,
    check,
    choice,
    error_checks,
    identity,
    instant,
    line,
    maybe_choice,
    maybe_instant,
    maybe_line,
    maybe_number,
    maybe_reference,
    maybe_whole,
    measured,
    metadata,
    number,
    partial_index,
    prose,
    reference,
)
from campaign.model.observations import OBSERVATION_KINDS


class ObservationColumns(TypedColumns):
    """``value`` is in ``unit``; for a limit it is the bound. Old versions stay, marked as such.

    ``sameness`` is the digest by which a second entry of the same observation is known; it is NULL
    once a row is superseded or withdrawn. Rows of a load that was taken back keep it aside in
    ``former_sameness``, so that the load can be put back. Rows loaded in bulk have no line each in
    ``changes``: ``operation_id`` ties them to the command that brought them.
    """

    id = identity()
    uid = line(36)
    system_id = reference("systems.id")
    kind = choice(*OBSERVATION_KINDS)
    bmjd_tdb = number()
    time_minus_d = maybe_number()
    time_plus_d = maybe_number()
    time_text = line(200)
    time_scale = choice(*SCALES)
    time_place = choice(*PLACES)
    value, value_minus, value_plus = measured()
    unit = maybe_line(20)
    limit_side = maybe_choice("above", "below")
    limit_sigma = maybe_number()
    band = maybe_line(50)
    photometric_system = maybe_line(50)
    frequency_ghz = maybe_number()
    energy_low_kev = maybe_number()
    energy_high_kev = maybe_number()
    star = maybe_line(20)
    species = maybe_line(50)
    position_angle_deg, position_angle_deg_minus, position_angle_deg_plus = measured()
    correlation = maybe_number()
    feature = maybe_line(100)
    measured_at = maybe_choice("edge", "peak")
    plate_scale_error = maybe_number()
    shell_index = maybe_whole()
    site_id = maybe_reference("sites.id")
    observer = maybe_line(200)
    instrument = maybe_line(200)
    comparison_star = maybe_line(200)
    source_id = maybe_reference("sources.id")
    quality = choice("good", "doubtful", "bad")
    text = prose()
    sameness = maybe_line(32)
    entered_at = instant()
    operation_id = reference("operations.id")
    superseded_by_id = maybe_reference("observations.id")
    superseded_at = maybe_instant()
    withdrawn_at = maybe_instant()
    withdrawn_why = maybe_line(500)
    former_sameness = maybe_line(32)


observations = Table(
    "observations",
    metadata,
    ObservationColumns,
    UniqueConstraint("uid"),
    UniqueConstraint("sameness"),
    check("value_given", "(kind IN ('attempt', 'remark')) = (value IS NULL)"),
    check("time_errors", "time_minus_d >= 0 AND time_plus_d >= 0"),
    check(
        "limit", "limit_side IS NULL OR (value IS NOT NULL AND limit_sigma IS NOT NULL AND limit_sigma > 0)"
    ),
    check("spectral_range", "frequency_ghz > 0 AND energy_low_kev >= 0 AND energy_high_kev > energy_low_kev"),
    check("correlation", "correlation BETWEEN -1 AND 1"),
    check("plate_scale", "plate_scale_error >= 0"),
    check("shell_index", "shell_index >= 1"),
    check("superseded", "(superseded_by_id IS NULL) = (superseded_at IS NULL)"),
    *error_checks("value", "position_angle_deg"),
    Index("ix_observations_system_id_kind_bmjd_tdb", "system_id", "kind", "bmjd_tdb"),
    Index("ix_observations_operation_id", "operation_id"),
    # Without it each deleted row would scan the table for rows that it superseded.
    partial_index(
        "ix_observations_superseded_by_id",
        "superseded_by_id",
        condition="superseded_by_id IS NOT NULL",
        unique=False,
    ),
)
