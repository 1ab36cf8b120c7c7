"""protlint's own part data against figures that were read apart from it, each with its published source."""

from __future__ import annotations

import pytest

from protlint.partdata.book import load_book
from tests.support.desk import the_one
from tests.support.judged import sink

BOOK = load_book()


@pytest.mark.parametrize(
    ("number", "rating", "value"),
    [
        ("2N3904", "rth_ja", 200.0),  # 2N3904 data sheet
        ("BC547B", "vbe", 0.66),  # BC547 data sheet, at 2 mA
        ("BC547B", "hfe_max", 450.0),
        ("2N5551", "vceo", 160.0),  # Fairchild data sheet
        ("BD139", "rth_jc", 10.0),  # BD135 series data sheet
        ("TIP41C", "rth_jc", 1.92),  # TIP41C data sheet
        ("TIP122", "vbe_max", 2.5),  # Usha data sheet, at 3 A
        ("2N3055", "power_case", 115.0),  # Usha data sheet
        ("MJ15003", "rth_jc", 0.70),
        ("MJE15032", "rth_jc", 2.5),
        ("IRF540", "vgs_th", 2.9),  # Motorola data sheet
        ("IRFP240", "rth_jc", 0.833),  # worked out from its slope, 1.2 W/K
        ("BS170", "rth_ja", 150.0),
    ],
)
def test_a_figure_of_a_data_sheet(number: str, rating: str, value: float) -> None:
    entry = BOOK.find(number)
    assert entry is not None
    assert entry.ratings[rating].value == pytest.approx(value, rel=2e-3)


def test_the_switch_example_stands_at_the_edge_of_its_package() -> None:
    """A published switch design with two 2N3904: 11.3 V at 50 mA, 0.565 W; 138 degC at 25 degC ambient."""
    entry = BOOK.find("2N3904")
    assert entry is not None
    junction_degC = 25.0 + 0.565 * entry.ratings["rth_ja"].value
    assert junction_degC == pytest.approx(138.0, abs=0.1)
    assert junction_degC < entry.ratings["tj_max"].value


@pytest.mark.parametrize(
    ("number", "lasts_s", "points"),
    [
        ("2N3055", 1.0, ((40.0, 2.87),)),
        ("MJ15003", 1.0, ((50.0, 5.0), (100.0, 1.0))),
        ("MJ15024", 0.5, ((50.0, 5.0), (80.0, 2.0))),
        ("MJL3281A", 1.0, ((50.0, 4.0), (100.0, 1.0))),
    ],
)
def test_guaranteed_second_breakdown_points(number: str, lasts_s: float, points: tuple[tuple[float, float], ...]) -> None:
    """The makers' data sheets of these types, each guaranteeing its points for the time given."""
    entry = BOOK.find(number)
    assert entry is not None
    assert [(curve.lasts_s, curve.points) for curve in entry.safe_area] == [(lasts_s, points)]


@pytest.mark.parametrize(
    ("size", "power_W", "voltage_V"),
    [("0201", 0.05, 15.0), ("0402", 0.0625, 50.0), ("0603", 0.1, 50.0), ("0805", 0.125, 150.0), ("1206", 0.25, 200.0),
     ("1210", 0.333, 200.0), ("2010", 0.75, 200.0), ("2512", 1.0, 200.0)],
)  # fmt: skip
def test_chip_resistors(size: str, power_W: float, voltage_V: float) -> None:
    """Yageo chip resistor catalogue: rated at 70 degC, in a straight line to nothing at 155 degC (0201: 125 degC)."""
    entry = BOOK.find_size("resistor", size)
    assert entry is not None
    figures = {name: figure.value for name, figure in entry.ratings.items()}
    zero_at = 125.0 if size == "0201" else 155.0
    assert figures == {"power": power_W, "power_at": 70.0, "zero_at": zero_at, "voltage_max": voltage_V}


def test_every_entry_has_a_source_for_every_figure_and_no_copied_model() -> None:
    assert len(BOOK.entries) >= 85
    for entry in BOOK.entries.values():
        assert entry.model == {}, entry.part_number
        assert all(figure.source.strip() for figure in entry.ratings.values()), entry.part_number


@pytest.mark.parametrize(
    ("npn", "pnp"),
    [
        ("TIP31C", "TIP32C"),
        ("TIP41C", "TIP42C"),
        ("2N3055", "MJ2955"),
        ("MJ15003", "MJ15004"),
        ("MJE15032", "MJE15033"),
        ("MJL3281A", "MJL1302A"),
        ("2SC5200", "2SA1943"),
        ("BC847B", "BC857B"),
        ("BD139", "BD140"),
        ("BC546B", "BC556B"),
        ("MJE3055T", "MJE2955T"),
    ],
)
def test_complementary_types_are_of_opposite_polarity_and_equal_strength(npn: str, pnp: str) -> None:
    first, second = BOOK.find(npn), BOOK.find(pnp)
    assert first is not None
    assert second is not None
    assert (first.kind, second.kind) == ("npn", "pnp")
    for rating in ("vceo", "ic", "tj_max"):
        assert first.ratings[rating].value == second.ratings[rating].value


def test_contradicting_data_sheets_are_known_by_name() -> None:
    told = {entry.part_number for entry in BOOK.entries.values() if entry.contradictions}
    assert told == {"2N2907A", "2N3791", "2N3792", "MJL3281A", "MJL1302A"}


def test_base_current_ratings_are_from_memory_and_such_as_the_collector_current_asks_for() -> None:
    """From memory, all: at most the collector current, and at least a fiftieth of it (of a Darlington a thousandth)."""
    rated = {name: entry for name, entry in BOOK.entries.items() if "ib" in entry.ratings}
    assert len(rated) > 80
    for name, entry in rated.items():
        base, collector = entry.ratings["ib"], entry.ratings["ic"]
        assert base.source == "memory", name
        least = 1000.0 if entry.kind.endswith("darlington") else 50.0
        assert collector.value / least <= base.value <= collector.value, name


@pytest.mark.parametrize(("carry", "gains"), [("10 mA", (100.0, 300.0)), ("50 mA", (60.0, 180.0)), ("0.1 A", (30.0, 90.0))])
def test_a_pass_device_has_the_gain_of_its_data_sheet_at_the_current_that_is_needed(
    carry: str, gains: tuple[float, float]
) -> None:
    """2N3904 data sheet: least gain 100 (to 300) at 10 mA, 60 at 50 mA, 30 at 100 mA."""
    circuit = the_one(sink().drawn(("QPN1", "2N3904")).stated(carry=carry).review()).circuit
    assert circuit is not None
    (device,) = [device for device in circuit.devices if device.name == "Q1"]
    assert device.hfe == pytest.approx(gains)
