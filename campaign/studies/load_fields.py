"""How the fields of a table become columns of the catalogue, kind by kind."""

from __future__ import annotations

from dataclasses import dataclass

from campaign.model.loading import LoadKind
from campaign.reading.expected import Expected

# Fields of words; each fills the column of its name.
WORD_FIELDS = (
    "band", "photometric_system", "comparison_star", "star", "species", "feature", "measured_at", "observer",
    "instrument", "source", "quality", "text",
)  # fmt: skip


@dataclass(frozen=True, slots=True)
class NumberColumn:
    """A field of plain numbers: the column that it fills, its unit, and where it may lie."""

    column: str
    unit: str
    low: float | None = None
    high: float | None = None
    low_open: bool = False
    high_open: bool = False

    def expected(self, name: str) -> Expected:
        return Expected(self.unit, name, self.low, self.high, self.low_open, self.high_open, with_error=False)


NUMBER_COLUMNS: dict[str, NumberColumn] = {
    "frequency": NumberColumn("frequency_ghz", "ghz", low=0.0, low_open=True),
    "energy_low": NumberColumn("energy_low_kev", "kev", low=0.0, low_open=True),
    "energy_high": NumberColumn("energy_high_kev", "kev", low=0.0, low_open=True),
    "correlation": NumberColumn("correlation", "", low=-1.0, high=1.0, low_open=True, high_open=True),
    "plate_scale_error": NumberColumn("plate_scale_error", "fraction", low=0.0, high=1.0),
    "shell_index": NumberColumn("shell_index", "", low=1.0, high=1e6),
}

# Unit that each kind is kept in and where its values may lie, as at the terminal.
_VALUES: dict[LoadKind, NumberColumn] = {
    "photometry": NumberColumn("value", "mag", low=-30.0, high=40.0),
    "velocity": NumberColumn("value", "kms", low=-1e5, high=1e5),
    "position": NumberColumn("value", "mas", low=0.0),
    "shell": NumberColumn("value", "arcsec", low=0.0, low_open=True),
    "line": NumberColumn("value", "angstrom"),
    "flux": NumberColumn("value", "jy"),
}
ANGLE = NumberColumn("position_angle_deg", "deg", low=-360.0, high=360.0)


def value_column(kind: LoadKind, *, has_energies: bool) -> NumberColumn:
    """The unit that values of a kind are kept in, and where they may lie.

    Parameters
    ----------
    kind : str
        A kind of observation.
    has_energies : bool
        Whether fluxes belong to ranges of energy: they are kept in erg/s/cm2 then, else in Jy.

    Returns
    -------
    NumberColumn
        Its unit is a family of ``campaign.reading.units``.

    Notes
    -----
    Accuracy: exact. Source: project convention.
    """
    return NumberColumn("value", "erg/s/cm2") if has_energies else _VALUES[kind]
