"""The invented demo campaign: sixteen dust-making binaries that do not exist, and the truth behind them.

Everything here is invented: systems, names, positions, stations, observers, sources, dates. Positions
were chosen at odd places of the sky, away from every system of this kind that we know.

``make_sample(seed)`` draws a truth (elements, every dust episode, star levels, offsets between
sources), then what an imaginary network knows of it at ``SAMPLE_AS_OF``: estimates scattered about the
truth by their stated errors, dated episodes, up to forty years of observations. ``truth.json`` is the
truth of the default seed; ``write_truth`` writes it again.

The package needs numpy and ``campaign.model`` only, and does not care from which folder it is loaded.
"""

from .generator import SampleCampaign, make_sample
from .instants import AS_OF_BMJD_TDB, SAMPLE_AS_OF
from .truth import DEFAULT_SEED, write_truth

__all__ = [
    "AS_OF_BMJD_TDB",
    "DEFAULT_SEED",
    "SAMPLE_AS_OF",
    "SampleCampaign",
    "make_sample",
    "write_truth",
]
