"""Suspected onsets on the screen: since when, how strong, and how to decide."""

from __future__ import annotations

from collections.abc import Sequence

from campaign.model.suspicion import Suspicion
from campaign.output.console import Screen

_MOST = 10


def render_suspicions(screen: Screen, suspicions: Sequence[Suspicion]) -> None:
    """Write each suspected onset, the latest first, and how many more there are."""
    ordered = sorted(suspicions, key=lambda each: -each.since_bmjd_tdb)
    for each in ordered[:_MOST]:
        points = "1 point" if each.points == 1 else f"{each.points} points"
        screen.wrapped(
            f"{each.system}: onset suspected since {each.since_utc[:10]} ({', '.join(each.bands)}, {points}, "
            f"up to {each.excess_sigma:.1f} sigma)",
            hang=2,
            style="bold yellow",
        )
        screen.wrapped(f"confirm it with: {each.confirm}", label="  ", hang=4)
        screen.wrapped(f"or reject it with: {each.reject}", label="  ", hang=4)
    if len(ordered) > _MOST:
        screen.wrapped(f"and {len(ordered) - _MOST} more systems with a suspected onset")
