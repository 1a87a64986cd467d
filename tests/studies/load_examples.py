"""A small catalogue to load into, and loading as the command does it."""

from __future__ import annotations

import io
from pathlib import Path
from typing import Any

from studies_examples import CLOCK, stamp

from campaign.catalogue import observations, sites, store, systems, upgrade
from campaign.model.loading import Loaded, LoadWanted, MappingRequest
from campaign.model.observations import Observation
from campaign.model.systems import Site, System
from campaign.studies.load import load_table

SYSTEMS = (
    System(0, "Lantern 3", 270.63125, -45.2083, aliases=("Lamp C",)),
    System(0, "Keel 9", 161.26, -59.68),
)
SITES = (
    Site(0, "Cold Mesa", latitude_deg=-31.25, longitude_deg_east=-70.75, height_m=2450.0),
    Site(0, "High Kite", kind="space", elongation_min_deg=85.0, elongation_max_deg=135.0),
)


def begin(path: Path) -> Path:
    upgrade.begin_database(path, at=CLOCK)
    with store.writing(path, at=CLOCK, who="Ida Vik", command="campaign test") as writing:
        for system in SYSTEMS:
            systems.add_system(writing, system)
        for site in SITES:
            sites.add_site(writing, site)
    return path


def load(db: Path, text: str | bytes, **asked: Any) -> Loaded:
    """Load a table given as text; ``kind``, ``columns``, ``constants``, ``missing`` say what it holds."""
    data = text.encode() if isinstance(text, str) else text
    said = {name: asked.pop(name) for name in ("kind", "columns", "constants", "missing") if name in asked}
    wanted = LoadWanted(MappingRequest(**said), keeps_rejected=True, **asked)
    shown: list[Any] = []
    loaded = load_table(
        str(db), stamp("campaign load"), "-", io.BytesIO(data), wanted, shown.append, lambda *told: None
    )
    assert shown == [loaded.understood]
    return loaded


def kept(db: Path) -> list[Observation]:
    with store.reading(db) as connection:
        return observations.observations_of(connection)


def codes(loaded: Loaded) -> list[tuple[int, str | None, str]]:
    return [(cell.line, cell.column, cell.code) for cell in loaded.bad]
