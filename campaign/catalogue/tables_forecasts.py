"""Tables of forecasts as they were kept, to be held against what came."""

from __future__ import annotations

from sqlalchemy import Index, Table, TypedColumns

from campaign.catalogue.columns import (
    check,
    choice,
    document,
    identity,
    instant,
    line,
    maybe_document,
    maybe_instant,
    maybe_line,
    maybe_number,
    maybe_whole,
    metadata,
    number,
    partial_index,
    prose,
    reference,
    whole,
)
from campaign.catalogue.tables_systems import IN_USE
from campaign.model.forecasts import EVENT_NAMES, STATUSES


class KeepingColumns(TypedColumns):
    """One ``forecast keep``: what was asked, with what, and when.

    Entries made after ``known_at`` and observations made after the instant of the question were hidden.
    """

    id = identity()
    label = maybe_line(100)
    label_key = maybe_line(100)
    as_of_bmjd_tdb = number()
    from_bmjd_tdb = number()
    until_bmjd_tdb = number()
    known_at = instant()
    draws = whole()
    seed = whole()
    program_version = line(50)
    kept_at = instant()
    withdrawn_at = maybe_instant()


keepings = Table(
    "keepings",
    metadata,
    KeepingColumns,
    check("label", "(label IS NULL) = (label_key IS NULL)"),
    partial_index("uq_keepings_label_key", "label_key", condition=IN_USE, unique=True),
)


class KeptForecastColumns(TypedColumns):
    """One event of one cycle of one system as it was forecast.

    ``quantiles`` are dates at evenly spaced shares, ``inputs`` what of the catalogue was used, ``notes`` the
    notes that stood beside it. The reference is the last date plus whole periods.
    """

    id = identity()
    keeping_id = reference("keepings.id")
    system_id = reference("systems.id")
    event = choice(*EVENT_NAMES)
    cycle = maybe_whole()
    basis = choice("orbit", "episodes")
    solution = prose()
    rule = maybe_line(32)
    status = choice(*STATUSES)
    probability = maybe_number()
    probability_in_window = maybe_number()
    probability_per_yr = maybe_number()
    disagreement_sigma = maybe_number()
    is_observed = whole()
    is_phase_lost = whole()
    median_bmjd_tdb = maybe_number()
    sigma_d = maybe_number()
    lo68_bmjd_tdb = maybe_number()
    hi68_bmjd_tdb = maybe_number()
    lo95_bmjd_tdb = maybe_number()
    hi95_bmjd_tdb = maybe_number()
    quantiles = maybe_document()
    reference_bmjd_tdb = maybe_number()
    reference_sigma_d = maybe_number()
    inputs = document()
    notes = document()
    withdrawn_at = maybe_instant()


kept_forecasts = Table(
    "kept_forecasts",
    metadata,
    KeptForecastColumns,
    check("probability", "probability >= 0 AND probability <= 1"),
    Index("ix_kept_forecasts_keeping_id", "keeping_id"),
    Index("ix_kept_forecasts_system_id", "system_id"),
)
