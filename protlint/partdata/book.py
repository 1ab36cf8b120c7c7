"""The book of part data: ratings and models by part number, each figure with where it comes from."""

from __future__ import annotations

import math
import re
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field, replace
from functools import cache
from itertools import pairwise
from pathlib import Path

from protlint.limits import pin_roles
from protlint.partdata.identities import Contradiction, careful
from protlint.partdata.ratings import MODEL_OF, RATINGS, RATINGS_OF, Figure
from protlint.toml.file import load_toml
from protlint.toml.tables import Table

__all__ = ["Book", "Contradiction", "Figure", "HfePoint", "PartEntry", "SafeArea", "TransientPoint", "load_book"]

SEMICONDUCTORS = (
    "npn", "pnp", "npn-darlington", "pnp-darlington", "nmos", "pmos", "diode", "zener", "thyristor", "ic",
)  # fmt: skip


@dataclass(frozen=True, slots=True)
class SafeArea:
    """One curve of a safe operating area: how long it may last (``inf`` for dc) and its (V, A) corners at 25 degC case."""

    lasts_s: float
    points: tuple[tuple[float, float], ...]
    source: str


@dataclass(frozen=True, slots=True)
class TransientPoint:
    """How much each watt has warmed a junction above its case after a time (transient thermal impedance)."""

    lasts_s: float
    K_per_W: float
    source: str


@dataclass(frozen=True, slots=True)
class HfePoint:
    """Current gain at one collector current; ``most`` None where the data sheet guarantees only the least."""

    ic_A: float
    least: float
    most: float | None = None


@dataclass(frozen=True, slots=True)
class PartEntry:
    """All that is known of one part type.

    ``ratings`` is keyed by the rating's name in the part-data file (``vceo``, ``power``, ``hfe_min`` ...); ``model`` holds
    published model parameters in SI units at 27 degC (empty where none are known) and ``model_source`` where they come
    from; ``pins`` maps a pin name or number to its role, on the word of ``pins_source``. ``hfe_points`` are gains at several
    currents, rising. ``footprints`` are the sizes a generic entry stands for (``0603``). ``contradictions`` are the thermal
    ratings that could not all be true, of which the careful ones were kept. ``file`` is None for protlint's own entries.
    """

    part_number: str
    kind: str
    pins: Mapping[str, str] = field(default_factory=dict)
    ratings: Mapping[str, Figure] = field(default_factory=dict)
    model: Mapping[str, float] = field(default_factory=dict)
    model_source: str | None = None
    safe_area: tuple[SafeArea, ...] = ()
    source: str = "memory"
    file: str | None = None
    pins_source: str = "memory"
    hfe_points: tuple[HfePoint, ...] = ()
    footprints: tuple[str, ...] = ()
    contradictions: tuple[Contradiction, ...] = ()
    transient: tuple[TransientPoint, ...] = ()
    """The transient thermal impedance to the case, rising in time."""

    def gains_at(self, ic_A: float) -> dict[str, float]:
        """Return ``hfe_min`` and, where a greatest gain is known, ``hfe_max`` at a collector current; empty without points.

        Between points the gain runs straight on logarithmic scales, as data sheets draw it; beyond the last it falls on as
        it did before, below the first it stays. Where the greatest gain is stated at one current only, it is taken to move
        as the least does.
        """
        if not self.hfe_points:
            return {}
        least = self._least_at(ic_A)
        known = [(point.ic_A, point.most) for point in self.hfe_points if point.most is not None]
        if not known and {"hfe_max", "hfe_at"} <= self.ratings.keys():
            known = [(self.ratings["hfe_at"].value, self.ratings["hfe_max"].value)]
        if not known:
            return {"hfe_min": least}
        at_A, most = min(known, key=lambda one: abs(math.log(one[0] / ic_A)))
        return {"hfe_min": least, "hfe_max": max(least, most * least / self._least_at(at_A))}

    def _least_at(self, ic_A: float) -> float:
        points = self.hfe_points
        if ic_A <= points[0].ic_A or len(points) == 1:
            return points[0].least
        low, high = next(((one, two) for one, two in pairwise(points) if ic_A <= two.ic_A), points[-2:])
        slope = math.log(high.least / low.least) / math.log(high.ic_A / low.ic_A)
        slope = min(slope, 0.0) if ic_A > high.ic_A else slope
        start = high if ic_A > high.ic_A else low
        return start.least * math.pow(ic_A / start.ic_A, slope)


@dataclass(frozen=True, slots=True)
class Book:
    """Part entries by part number; look-ups fold case and try the user's files before protlint's own.

    ``remarks`` are about the user's files: a part number in two of them, ratings that contradict each other.
    """

    entries: Mapping[str, PartEntry]
    remarks: tuple[str, ...] = ()
    sizes: Mapping[tuple[str, str], PartEntry] = field(default_factory=dict)
    """Generic entries by kind and size code."""

    def find(self, part_number: str) -> PartEntry | None:
        """Return the entry for a part number, or None."""
        return self.entries.get(part_number.strip().casefold())

    def find_size(self, kind: str, footprint: str) -> PartEntry | None:
        """Return the generic entry for a footprint's size (``R0603``, ``RESC1608X55N``, ``R_0603_1608Metric``), or None.

        A name that holds no size, or two, has none.
        """
        found = {code: self.sizes[kind, code] for code in _size_codes(footprint) if (kind, code) in self.sizes}
        return next(iter(found.values())) if len(found) == 1 else None


_METRIC = {
    "0402": "01005", "0603": "0201", "1005": "0402", "1608": "0603", "2012": "0805", "3216": "1206", "3225": "1210",
    "5025": "2010", "6332": "2512",
}  # fmt: skip
"""IPC-7351 names (``RESC1608X55N``) give a body in tenths of a millimetre; the size code is in hundredths of an inch."""
_METRIC_NAME = re.compile(r"(?:RES|CAP|IND)[CM](\d{4})X", re.IGNORECASE)
_SIZE = re.compile(r"(?<!\d)(?:\d{4}|01005)(?!\d)(?!_?metric)", re.IGNORECASE)


def _size_codes(footprint: str) -> tuple[str, ...]:
    named = _METRIC_NAME.search(footprint)
    if named:
        return (_METRIC[named[1]],) if named[1] in _METRIC else ()
    return tuple(dict.fromkeys(_SIZE.findall(footprint)))


def load_book(paths: Iterable[str | Path] = ()) -> Book:
    """Return the book of the user's part-data files, the first over the later ones, and protlint's own below them.

    Raises
    ------
    FileError : a file cannot be read.
    InputError : not TOML, an unknown key, a wrong unit or an impossible figure, with file, line and column.
    """
    entries: dict[str, PartEntry] = {}
    remarks: list[str] = []
    for path in paths:
        for entry in _entries(path):
            known = entries.get(entry.part_number.casefold())
            if known is not None:
                remarks.append(f"{entry.part_number} stands in {known.file} and again in {entry.file}: the first counts")
                continue
            entries[entry.part_number.casefold()] = entry
            remarks += [f"{entry.file}: {entry.part_number}: {one.says}" for one in entry.contradictions]
    for entry in _own_entries():
        entries.setdefault(entry.part_number.casefold(), entry)
    sizes: dict[tuple[str, str], PartEntry] = {}
    for entry in entries.values():
        for code in entry.footprints:
            sizes.setdefault((entry.kind, code), entry)
    return Book(entries, tuple(remarks), sizes)


@cache
def _own_entries() -> tuple[PartEntry, ...]:
    paths = sorted(Path(__file__).parent.glob("*.toml"))
    return tuple(replace(entry, file=None) for path in paths for entry in _entries(path))


def _entries(path: str | Path) -> Iterable[PartEntry]:
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
