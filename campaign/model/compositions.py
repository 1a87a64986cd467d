"""Named mixes of elements that winds are made of, by mass. Rough on purpose: say better ones where known."""

from __future__ import annotations

from dataclasses import dataclass

from campaign.model.measured import Measured


@dataclass(frozen=True, slots=True)
class Composition:
    """Mass fractions by symbol; a fraction without an error belongs to the mix as stated."""

    name: str
    mass_fractions: tuple[tuple[str, Measured], ...]
    source: str = ""


def _mix(name: str, source: str, **fractions: float) -> Composition:
    return Composition(name, tuple((symbol, Measured(x)) for symbol, x in fractions.items()), source)


# Solar: Asplund et al. 2009 (memory), all metals as oxygen. The others are round numbers of the trade
# (common practice, no source); that of WC stars is He 0.5, C 0.4, O 0.1.
MIXES: dict[str, Composition] = {
    "solar": _mix("solar", "Asplund et al. 2009, metals as oxygen (memory)", H=0.7381, He=0.2485, O=0.0134),
    "WNh": _mix("WNh", "common practice, no source", H=0.4, He=0.585, N=0.015),
    "WN": _mix("WN", "common practice, no source", He=0.985, N=0.015),
    "WC": _mix("WC", "common practice, no source", He=0.5, C=0.4, O=0.1),
    "WO": _mix("WO", "common practice, no source", He=0.3, C=0.5, O=0.2),
}


def mix_for(spectral_type: str | None) -> Composition | None:
    """The mix that a spectral type suggests; None where it suggests none."""
    if spectral_type is None:
        return None
    plain = spectral_type.strip().lstrip("[( ")
    for start, name in (("WC", "WC"), ("WO", "WO"), ("WN", "WN")):
        if plain.upper().startswith(start):
            first = plain.split("+")[0]
            return MIXES["WNh" if name == "WN" and "h" in first else name]
    return MIXES["solar"] if plain[:1].upper() in {"O", "B", "A", "F", "L"} else None
