"""The invented demo campaign that travels with the program, found in a wheel or in a checkout."""

from __future__ import annotations

import importlib.util
import sys
from collections.abc import Mapping
from functools import lru_cache
from pathlib import Path
from types import ModuleType
from typing import TYPE_CHECKING, Any, Protocol, cast

import campaign
from campaign.errors import NotFound

if TYPE_CHECKING:
    from campaign.model.arrays import PhotometryArrays
    from campaign.model.observations import Observation
    from campaign.model.records import SystemRecord
    from campaign.model.systems import Site

_MODULE = "campaign._sample_catalog"


class SampleCampaign(Protocol):
    """What the generator hands over: the campaign as known at its own date, and the truth behind it."""

    @property
    def as_of_bmjd_tdb(self) -> float: ...
    @property
    def sites(self) -> tuple[Site, ...]: ...
    @property
    def records(self) -> tuple[SystemRecord, ...]: ...
    @property
    def photometry(self) -> Mapping[int, PhotometryArrays]: ...
    @property
    def truth(self) -> Any: ...
    def observations(self) -> tuple[Observation, ...]: ...


def sample_folder() -> Path:
    """Where the sample's generator stands.

    Returns
    -------
    pathlib.Path
        The package inside the wheel, else the folder of the checkout.

    Raises
    ------
    NotFound
        If neither is there.

    Notes
    -----
    Accuracy: exact (no numbers).

    Source: project convention (layout of wheel and checkout).
    """
    here = Path(campaign.__file__).resolve().parent
    for folder in (here / "_sample_catalog", here.parent / "sample_catalog"):
        if (folder / "__init__.py").is_file():
            return folder
    raise NotFound(
        "The sample campaign is not installed.",
        why=f"Neither '_sample_catalog' in {here} nor 'sample_catalog' beside it holds the generator.",
        hint="Install the program again from its wheel, or run it from a complete checkout.",
        code="sample-missing",
    )


@lru_cache(maxsize=1)
def sample_package() -> ModuleType:
    """The generator's package, loaded by its path.

    Returns
    -------
    module
        With ``make_sample``, ``write_truth``, ``SAMPLE_AS_OF`` and ``AS_OF_BMJD_TDB`` (MJD, TDB).

    Raises
    ------
    NotFound
        If the sample is not installed.

    Notes
    -----
    Accuracy: exact (no numbers).

    Source: project convention.
    """
    loaded = sys.modules.get(_MODULE)
    if loaded is not None:
        return loaded
    folder = sample_folder()
    spec = importlib.util.spec_from_file_location(
        _MODULE, folder / "__init__.py", submodule_search_locations=[str(folder)]
    )
    assert spec is not None and spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    sys.modules[_MODULE] = module
    try:
        spec.loader.exec_module(module)
    except BaseException:
        del sys.modules[_MODULE]
        raise
    return module


@lru_cache(maxsize=1)
def load_sample() -> SampleCampaign:
    """The invented demo campaign of the default seed.

    Returns
    -------
    SampleCampaign
        Sites, records, light curves by system id, and the truth; instants are ``bmjd_tdb`` (days).

    Raises
    ------
    NotFound
        If the sample is not installed.

    Notes
    -----
    Accuracy: invented; estimates scatter about the truth by their stated errors.

    Source: invented for this project.
    """
    return cast(SampleCampaign, sample_package().make_sample())
