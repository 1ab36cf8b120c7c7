"""A part-data file read: each table to an entry, every figure checked."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from itertools import pairwise
from pathlib import Path

from protlint.limits_file import pin_roles
from protlint.partdata.entry import HfePoint, PartEntry, SafeArea, TransientPoint
from protlint.partdata.identities import Contradiction, careful
from protlint.partdata.ratings import MODEL_OF, RATINGS, RATINGS_OF, Figure
from protlint.toml.file import load_toml
from protlint.toml.tables import Table

SEMICONDUCTORS = (
    "npn", "pnp", "npn-darlington", "pnp-darlington", "nmos", "pmos", "diode", "zener", "thyristor", "ic",
)  # fmt: skip
"""Kinds whose thermal ratings are those of a junction."""


def entries_of(path: str | Path) -> Iterable[PartEntry]:
    """Yield the entries of a part-data file.

    Raises
    ------
    FileError : the file cannot be read.
    InputError : not TOML, an unknown key, a wrong unit or an impossible figure, with file, line and column.
    """
    root = Table.whole(load_toml(path))
    for name in root:
        table = root.table(name)
        assert table is not None
        yield _entry(name, table)


def _entry(name: str, table: Table) -> PartEntry:
    table.only(("kind", "pins", "pins_source", "source", "footprints", "ratings", "model", "safe_area", "transient"))
    kind = table.word("kind", RATINGS_OF)
    if kind is None:
        raise table.error(f'part {name} lacks its kind, such as kind = "npn"')
    source = table.text("source") or "memory"
    pins = table.table("pins")
    ratings_table, model_table = table.table("ratings"), table.table("model")
    ratings = _ratings(ratings_table, kind, source) if ratings_table is not None else {}
    contradictions: tuple[Contradiction, ...] = ()
    if kind in SEMICONDUCTORS:
        ratings, contradictions = careful(ratings)
    points = _hfe_points(ratings_table) if ratings_table is not None and "hfe" in ratings_table else ()
    return PartEntry(
        part_number=name,
        kind=kind,
        pins=pin_roles(pins) if pins is not None else {},
        ratings=ratings,
        model=_model(model_table, kind) if model_table is not None else {},
        model_source=(model_table.text("source") or source) if model_table is not None else None,
        safe_area=tuple(_safe_area(curve, source) for curve in table.tables("safe_area")),
        source=source,
        file=table.document.file,
        pins_source=table.text("pins_source") or source,
        hfe_points=points,
        footprints=table.texts("footprints"),
        contradictions=contradictions,
        transient=_transient(table, source),
    )


def _ratings(table: Table, kind: str, entry_source: str) -> dict[str, Figure]:
    known = RATINGS_OF[kind]
    gains = ("hfe",) if "hfe_min" in known else ()
    table.only(("source", *known, *gains), called=f"rating of a part of kind {kind}:")
    source = table.text("source") or entry_source
    ratings: dict[str, Figure] = {}
    for name in table:
        if name in ("source", "hfe"):
            continue
        inner = table.table(name) if isinstance(table.content[name], dict) else None
        if inner is None:
            ratings[name] = Figure(_figure(table, name, name), source)
        else:
            inner.only(("value", "source"))
            if "value" not in inner:
                raise inner.error(f'"{name}" lacks its value')
            ratings[name] = Figure(_figure(inner, "value", name), inner.text("source") or source)
    _check_order(table, ratings)
    return ratings


def _figure(table: Table, key: str, name: str) -> float:
    dimension = RATINGS[name].dimension
    value = table.number(key) if dimension == "number" else table.quantity(key, dimension)
    assert value is not None
    if not value < float("inf"):
        raise table.error(f'"{name}" has no end', key)
    if value <= 0.0 and dimension not in ("temperature", "voltage per kelvin"):
        raise table.error(f'"{name}" is a magnitude above zero, also for a P-type part', key)
    return value


def _check_order(table: Table, ratings: Mapping[str, Figure]) -> None:
    for low, high in (
        ("hfe_min", "hfe_max"), ("vbe_min", "vbe"), ("vbe", "vbe_max"), ("vbe_min", "vbe_max"), ("vgs_th_min", "vgs_th"),
        ("vgs_th", "vgs_th_max"), ("vgs_th_min", "vgs_th_max"), ("vz_min", "vz"), ("vz", "vz_max"), ("vf", "vf_max"),
        ("power_at", "tj_max"), ("power_case_at", "tj_max"), ("power_at", "zero_at"),
    ):  # fmt: skip
        if low in ratings and high in ratings and ratings[low].value > ratings[high].value:
            raise table.error(f'"{low}" is above "{high}"', low)
    if "tj_max" in ratings and ratings["tj_max"].value <= 25.0:
        raise table.error('"tj_max" is the highest junction temperature, above 25 degC', "tj_max")


def _hfe_points(table: Table) -> tuple[HfePoint, ...]:
    rows = table.content["hfe"]
    points = []
    for index, row in enumerate(rows if isinstance(rows, list) else [rows]):
        gains = row[1:] if isinstance(row, list) else []
        good = all(isinstance(gain, int | float) and not isinstance(gain, bool) and 0 < gain < 1e6 for gain in gains)
        if not isinstance(rows, list) or not 1 <= len(gains) <= 2 or not good or gains[0] > gains[-1]:
            example = '[["0.1 mA", 40], ["10 mA", 100, 300]]'
            raise table.error(
                f'"hfe" is a list of a collector current, the least gain and, where known, the most: {example}', "hfe"
            )
        currents = Table(table.document, (*table.path, "hfe", index), {"ic": row[0]})
        ic_A = currents.quantity("ic", "current", above=0.0)
        assert ic_A is not None
        points.append(HfePoint(ic_A, float(gains[0]), float(gains[1]) if len(gains) == 2 else None))
    return tuple(sorted(points, key=lambda point: point.ic_A))


def _model(table: Table, kind: str) -> dict[str, float]:
    known: Sequence[str] = MODEL_OF.get(kind, ())
    by_fold = {name.casefold(): name for name in known}
    model = {}
    for key in table:
        if key == "source":
            continue
        name = by_fold.get(key.casefold())
        if name is None:
            table.only(("source", *known), called=f"model parameter of a part of kind {kind}:")
            raise table.error(f'unknown model parameter "{key}"', key)
        value = table.number(key)
        assert value is not None
        model[name] = value
    return model


def _safe_area(table: Table, entry_source: str) -> SafeArea:
    table.only(("lasts", "points", "source"))
    lasts_s = table.quantity("lasts", "time", above=0.0)
    if lasts_s is None:
        raise table.error('a safe area says how long it lasts: lasts = "dc" or a time')
    points = tuple((volts, amperes) for volts, amperes in table.rows("points", "voltage", "current"))
    falling = all(one[0] < two[0] and one[1] >= two[1] for one, two in pairwise(points))
    if not falling or points[0][0] <= 0.0 or points[-1][1] <= 0.0:
        raise table.error("the points of a safe area rise in voltage and fall in current, all above zero", "points")
    return SafeArea(lasts_s, points, table.text("source") or entry_source)


def _transient(table: Table, entry_source: str) -> tuple[TransientPoint, ...]:
    points = []
    for point in table.tables("transient"):
        point.only(("lasts", "impedance", "source"))
        lasts_s = point.quantity("lasts", "time", above=0.0)
        impedance = point.quantity("impedance", "thermal resistance", above=0.0)
        if lasts_s is None or impedance is None or lasts_s == float("inf"):
            raise point.error('a transient impedance has a time and its value: lasts = "10 ms", impedance = "0.4 K/W"')
        points.append(TransientPoint(lasts_s, impedance, point.text("source") or entry_source))
    points.sort(key=lambda one: one.lasts_s)
    if any(before.lasts_s == after.lasts_s or before.K_per_W > after.K_per_W for before, after in pairwise(points)):
        raise table.error("a transient impedance rises with time, one value a time", "transient")
    return tuple(points)
