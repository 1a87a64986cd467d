"""Put the sample together: truth first, then what is known of it, then the photometry."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

from campaign.model.arrays import PhotometryArrays
from campaign.model.observations import Observation
from campaign.model.records import SystemRecord
from campaign.model.systems import Site

from .estimates import make_record
from .instants import AS_OF_BMJD_TDB
from .lightcurves import LightCurve, draw_light_curve
from .stations import SITES
from .systems import SYSTEMS
from .truth import DEFAULT_SEED, CampaignTruth, draw_truth


@dataclass(frozen=True, slots=True, eq=False)
class SampleCampaign:
    """The invented campaign as known at ``as_of_bmjd_tdb``, and the truth behind it.

    ``photometry`` maps each system's id to its light curve; ``observations()`` writes out every
    observation of every kind, which a forecast does not need and a database does.
    """

    seed: int
    as_of_bmjd_tdb: float
    sites: tuple[Site, ...]
    records: tuple[SystemRecord, ...]
    photometry: Mapping[int, PhotometryArrays]
    truth: CampaignTruth
    light_curves: tuple[LightCurve, ...]

    def observations(self) -> tuple[Observation, ...]:
        """All observations, in order of time within each kind; ids agree with ``photometry``."""
        from .observations import make_observations

        return make_observations(self.seed, self.truth, self.light_curves)


def make_sample(seed: int = DEFAULT_SEED) -> SampleCampaign:
    """Draw the whole campaign; the same seed gives the same campaign."""
    truth = draw_truth(seed)
    records: list[SystemRecord] = []
    curves: list[LightCurve] = []
    solution_id = episode_id = observation_id = 1
    for spec, one in zip(SYSTEMS, truth.systems, strict=True):
        record = make_record(seed, spec, one, solution_id, episode_id)
        curve = draw_light_curve(seed, spec, one, truth, observation_id)
        solution_id += len(record.solutions)
        episode_id += len(record.episodes)
        observation_id += curve.photometry.id.size
        records.append(record)
        curves.append(curve)
    return SampleCampaign(
        seed=seed,
        as_of_bmjd_tdb=AS_OF_BMJD_TDB,
        sites=SITES,
        records=tuple(records),
        photometry={
            one.system_id: curve.photometry for one, curve in zip(truth.systems, curves, strict=True)
        },
        truth=truth,
        light_curves=tuple(curves),
    )
