"""Invented entries of every shape, drawn at random, and a way to bring an exported table back."""

from __future__ import annotations

import io
import unicodedata
from collections.abc import Iterable
from dataclasses import replace
from datetime import UTC, datetime
from pathlib import Path
from typing import Any

from hypothesis import strategies as st

from campaign.catalogue import episodes, observations, rules, sites, solutions, store, systems, upgrade
from campaign.catalogue import tables as t
from campaign.catalogue.naming import name_key
from campaign.model.exchange_columns import exchange_columns
from campaign.model.exported import (
    ExchangedEpisode,
    ExchangedSolution,
    ExchangedSystem,
    ExchangeForm,
    OutgoingTable,
)
from campaign.model.instants import Moment
from campaign.model.measured import Covariance, Limit, Measured, Range
from campaign.model.observations import Observation
from campaign.model.systems import DatedEvent, DustRule, Episode, Site, Solution, Star, System
from campaign.output.exchange import table_text
from campaign.reading.exchange import HEAD_BYTES, read_exchange, recognise
from campaign.reading.exchange_models import (
    episode_from_row,
    observation_from_row,
    solution_from_row,
    system_from_row,
)
from campaign.studies.exchange_rows import in_order
from campaign.studies.export import Asked, outgoing_table

UNITS = ("mag", "jy", "kms", "angstrom", "mas", "arcsec", "erg/s/cm2")
CLOCK = datetime(2031, 4, 7, 3, 12, 10, tzinfo=UTC)
_FROM_ROW = {
    "observations": observation_from_row,
    "systems": system_from_row,
    "solutions": solution_from_row,
    "episodes": episode_from_row,
}

# ----------------------------------------------------------------------------------------- entries at random

# Everything that the catalogue takes: commas, quotes, markup, signs of formulas, letters of any script.
_ALPHABET = st.characters(
    exclude_categories=("Cc", "Cf", "Cs", "Zl", "Zp", "Cn", "Co"), include_characters=",\"'=+-@<&>\\# "
)
lines = st.text(_ALPHABET, min_size=1, max_size=12)
# As the catalogue tidies names: single spaces inside, and something to compare by.
names = lines.map(lambda text: " ".join(text.split())).filter(lambda text: text and _is_name(text))
prose = st.text(_ALPHABET | st.sampled_from("\n\t"), max_size=20)
numbers = st.floats(allow_nan=False, allow_infinity=False)
sizes = st.floats(min_value=0, allow_nan=False, allow_infinity=False)
positive = st.floats(min_value=5e-324, allow_nan=False, allow_infinity=False)
wholes = st.integers(-(2**31), 2**31 - 1)


def _is_name(text: str) -> bool:
    return bool("".join(unicodedata.normalize("NFKC", text).casefold().split()))


def maybe(strategy: st.SearchStrategy[Any]) -> st.SearchStrategy[Any]:
    return st.none() | strategy


def measured(values: st.SearchStrategy[float] = numbers) -> st.SearchStrategy[Measured]:
    return st.builds(Measured, values, maybe(sizes), maybe(sizes))


moments = st.builds(
    Moment, numbers, maybe(sizes), maybe(sizes), st.just("") | lines,
    st.sampled_from(["utc", "tt", "tdb", "tai", "ut"]),
    st.sampled_from(["observatory", "geocentre", "heliocentre", "barycentre"]),
)  # fmt: skip
sites_at_random = st.builds(
    Site, st.just(0), names, st.just("ground"), st.floats(-90, 90), st.floats(-180, 360),
    maybe(st.floats(-500, 1e5)), maybe(st.floats(-90, 90)), st.none(), st.none(), maybe(lines),
)  # fmt: skip


@st.composite
def observation(draw: Any) -> tuple[Observation, Site | None]:
    """An observation that the catalogue takes, and its site."""
    kind = draw(st.sampled_from(["photometry", "flux", "velocity", "position", "shell", "line", "remark"]))
    value = None if kind == "remark" else draw(measured())
    side = None if value is None else draw(st.sampled_from([None, "above", "below"]))
    site = draw(maybe(sites_at_random))
    return Observation(
        id=0, uid=draw(st.uuids().map(str)), system_id=0, kind=kind, moment=draw(moments), value=value,
        unit=None if value is None else draw(st.sampled_from(UNITS)),
        limit_side=side, limit_sigma=None if side is None else draw(positive), band=draw(maybe(lines)),
        photometric_system=draw(maybe(lines)), frequency_ghz=draw(maybe(positive)),
        star=draw(maybe(st.sampled_from("AB"))), species=draw(maybe(lines)),
        position_angle_deg=draw(maybe(measured())), correlation=draw(maybe(st.floats(-1, 1))),
        feature=draw(maybe(lines)), measured_at=draw(st.sampled_from([None, "edge", "peak"])),
        plate_scale_error=draw(maybe(sizes)), shell_index=draw(maybe(st.integers(1, 2**31 - 1))),
        site=None if site is None else site.name, observer=draw(maybe(lines)), instrument=draw(maybe(lines)),
        comparison_star=draw(maybe(lines)), source=draw(maybe(names)),
        quality=draw(st.sampled_from(["good", "doubtful", "bad"])), text=draw(prose),
    ), site  # fmt: skip


def stars(name: str) -> st.SearchStrategy[Star]:
    sized = maybe(measured(positive))
    return st.builds(Star, st.just(name), maybe(lines), sized, sized, sized, sized, sized, sized)


systems_at_random = st.builds(
    System, id=st.just(0), name=names, ra_deg=st.floats(0, 360, exclude_max=True), dec_deg=st.floats(-90, 90),
    position_epoch_jyr=numbers, pm_ra_cosdec_mas_yr=maybe(numbers), pm_dec_mas_yr=maybe(numbers),
    distance_pc=maybe(measured(positive)), parallax_mas=maybe(measured()),
    state=st.sampled_from(["episodic", "persistent", "candidate", "retired"]), priority=st.integers(1, 9),
    notes=prose, aliases=st.lists(names, max_size=2).map(tuple), star_a=stars("A"), star_b=stars("B"),
    cycle_anchor_bmjd_tdb=maybe(numbers), cycle_anchor_period_d=maybe(positive),
)  # fmt: skip
rules_at_random = st.builds(
    DustRule, id=st.just(0), system_id=st.just(0),
    kind=st.sampled_from(["phase", "lag", "separation", "learned"]),
    onset=maybe(measured()), maximum=maybe(measured()), end=maybe(measured()),
    critical_separation_au=maybe(measured(positive)), condensation_distance_au=maybe(measured(sizes)),
    flow_speed_kms=maybe(measured(positive)), maximum_lag_d=maybe(measured()), scatter_onset_d=maybe(sizes),
    scatter_maximum_d=maybe(sizes), scatter_end_d=maybe(sizes), note=prose,
)  # fmt: skip
periods = (
    st.none()
    | measured(positive)
    | st.builds(Limit, positive, st.sampled_from(["above", "below"]), positive)
    | st.tuples(st.floats(1e-9, 1e9), st.floats(1.5, 10)).map(lambda two: Range(two[0], two[0] * two[1]))
)
covariances = st.lists(st.lists(numbers, min_size=2, max_size=2), min_size=2, max_size=2).map(
    lambda matrix: Covariance(("period_d", "epoch"), tuple(map(tuple, matrix)))
)


@st.composite
def solution(draw: Any) -> Solution:
    adopted = draw(st.booleans())
    return Solution(
        id=0, system_id=0, label=draw(names), period_d=draw(periods), epoch=draw(maybe(moments)),
        epoch_marks=draw(st.sampled_from(["periastron", "A in front", "B in front", "onset", "maximum"])),
        eccentricity=draw(maybe(measured(st.floats(0, 1, exclude_max=True)))),
        omega_deg=draw(maybe(measured(st.floats(-360, 360)))), omega_of=draw(st.sampled_from("AB")),
        inclination_deg=draw(maybe(measured(st.floats(0, 180)))),
        node_deg=draw(maybe(measured(st.floats(-360, 360)))), k_a_kms=draw(maybe(measured(sizes))),
        k_b_kms=draw(maybe(measured(sizes))), gamma_kms=draw(maybe(measured())),
        a_au=draw(maybe(measured(positive))), a_arcsec=draw(maybe(measured(positive))),
        covariance=draw(maybe(covariances)), source=draw(st.just("") | names),
        data_until_bmjd_tdb=draw(maybe(numbers)), adopted=adopted,
        weight=draw(positive) if adopted else None, epoch_cycle=draw(maybe(wholes)),
        published_cycle_offset=draw(maybe(wholes)), note=draw(prose),
    )  # fmt: skip


events = maybe(st.builds(DatedEvent, moments, maybe(lines), maybe(lines)))
episodes_at_random = st.builds(
    Episode, id=st.just(0), system_id=st.just(0), cycle=maybe(wholes),
    state=st.sampled_from(["proposed", "confirmed", "rejected"]), onset=events, maximum=events, end=events,
    source=st.just("") | names, note=prose,
)  # fmt: skip


# ------------------------------------------------------------------------------------------- there and back


def exported(db: Path | str, kind: Any, form: ExchangeForm, **asked: Any) -> bytes:
    with outgoing_table(str(db), Asked(kind, **asked)) as table:
        return "".join(table_text(table, form)).encode()


def entries(data: bytes) -> list[Any]:
    """The entries of an exported table, as dataclasses."""
    form = recognise(data[:HEAD_BYTES])
    assert form is not None
    table = read_exchange(io.BytesIO(data), form)
    found = []
    for row in table.rows:
        assert row.faults == ()
        found.append(_FROM_ROW[table.kind](row.cells))
    return found


def text_of(kind: Any, form: ExchangeForm, cells: list[Any]) -> bytes:
    """A table of rows given column by column."""
    columns = exchange_columns(kind)
    rows = in_order(columns, iter(cells))
    return "".join(table_text(OutgoingTable(kind, columns, rows, len(cells)), form)).encode()


def observe(db: Path, drawn: Iterable[tuple[Observation, Site | None]]) -> None:
    """Enter observations of the one system of a catalogue; two spellings of a name are one site."""
    site_of: dict[str, int] = {}
    with store.writing(db, at=CLOCK, who="Ida Vik", command="campaign test") as writing:
        (system,) = systems.list_systems(writing.connection, include_retired=True)
        for entry, site in drawn:
            place = None
            if site is not None:
                key = name_key(site.name)
                place = site_of.get(key) or sites.add_site(writing, site)
                site_of[key] = place
            observations.add_observation(writing, replace(entry, system_id=system.id, site_id=place))


def begin(path: Path) -> Path:
    upgrade.begin_database(path, at=CLOCK)
    return path


def bring(db: Path, tables: Iterable[bytes]) -> None:
    """Enter exported tables into a catalogue with the plain means of the catalogue."""
    with store.writing(db, at=CLOCK, who="Ida Vik", command="campaign test") as writing:
        number_of: dict[str, int] = {}
        site_of: dict[str, int] = {}
        observed = []
        for each in [entry for data in tables for entry in entries(data)]:
            if isinstance(each, ExchangedSystem):
                number_of[each.system.name] = _enter_system(writing, each)
            elif isinstance(each, ExchangedSolution):
                _enter_solution(writing, number_of[each.system], each.solution)
            elif isinstance(each, ExchangedEpisode):
                number = number_of[each.system]
                episodes.add_episode(writing, replace(each.episode, system_id=number))
            else:
                if each.site is not None and each.site.name not in site_of:
                    site_of[each.site.name] = sites.add_site(writing, each.site)
                place = None if each.site is None else site_of[each.site.name]
                number = number_of[each.system]
                observed.append(replace(each.observation, system_id=number, site_id=place))
        observations.add_observations(writing, observed)


def _enter_system(writing: store.Writing, each: ExchangedSystem) -> int:
    number = systems.add_system(writing, each.system)
    if each.rule is not None:
        rules.set_rule(writing, replace(each.rule, system_id=number))
    return number


def _enter_solution(writing: store.Writing, number: int, each: Solution) -> None:
    own = solutions.add_solution(writing, replace(each, system_id=number))
    if each.adopted:
        row = {"system_id": number, "solution_id": own, "weight": each.weight, "adopted_at": writing.at}
        writing.insert(t.adoptions, row)


def every_export(db: Path | str, form: ExchangeForm, **asked: Any) -> list[bytes]:
    return [
        exported(db, kind, form, **asked) for kind in ("systems", "solutions", "episodes", "observations")
    ]
