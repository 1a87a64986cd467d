"""All tables of the catalogue under one roof. Built by the migrations, never by ``create_all``."""

from __future__ import annotations

from campaign.catalogue.columns import metadata
from campaign.catalogue.tables_forecasts import keepings, kept_forecasts
from campaign.catalogue.tables_history import campaign_info, changes, column_mappings, lapses, operations
from campaign.catalogue.tables_knowledge import adoptions, dust_rules, episodes, solutions
from campaign.catalogue.tables_observations import observations
from campaign.catalogue.tables_systems import sites, sources, stars, system_names, systems

__all__ = [
    "adoptions",
    "campaign_info",
    "changes",
    "column_mappings",
    "dust_rules",
    "episodes",
    "keepings",
    "kept_forecasts",
    "lapses",
    "metadata",
    "observations",
    "operations",
    "sites",
    "solutions",
    "sources",
    "stars",
    "system_names",
    "systems",
]
