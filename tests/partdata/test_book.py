"""Part data: what a file can hold, whose entry counts, sizes found by footprint, and every mistake at its place."""

from __future__ import annotations

import math
from pathlib import Path

import pytest

from protlint.partdata.book import Figure, HfePoint, SafeArea, load_book
from protlint.partdata.ratings import MODEL_OF, RATINGS, RATINGS_OF
from protlint.quantities import DIMENSIONS
from protlint.sources import InputError
from tests.support.paths import FIXTURES

INVALID = sorted((FIXTURES / "partdata" / "invalid").glob("*.toml"))

EXAMPLE = """
[QXN1]
kind = "npn"
pins = { 1 = "collector", 2 = "base", 3 = "emitter" }
source = "an invented data sheet, revision 2"
[QXN1.ratings]
vceo = "40 V"
ic = { value = "800 mA", source = "memory" }
power = "0.5 W"
rth_ja = "250 K/W"
tj_max = "150 degC"
hfe_min = 100
hfe = [["150 mA", 100, 300], ["1 mA", 60]]
vbe_slope = "-2 mV/K"
[QXN1.model]
is = 1.4e-14
BF = 200
source = "fitted to curves of the data sheet"
[[QXN1.safe_area]]
lasts = "dc"
points = [["10 V", "5 A"], ["40 V", "2.87 A"]]
[[QXN1.safe_area]]
lasts = "10 ms"
points = [["40 V", "4 A"]]
source = "memory"
"""


@pytest.fixture
def parts_file(tmp_path: Path) -> Path:
    path = tmp_path / "parts.toml"
    path.write_text(EXAMPLE)
    return path


def test_an_entry_with_everything(parts_file: Path) -> None:
    entry = load_book([parts_file]).find(" qxn1 ")
    assert entry is not None
    assert entry.kind == "npn"
    assert entry.pins == {"1": "collector", "2": "base", "3": "emitter"}
    sheet = "an invented data sheet, revision 2"
    assert entry.ratings["vceo"] == Figure(40.0, sheet)
    assert entry.ratings["ic"] == Figure(0.8, "memory")
    assert entry.ratings["vbe_slope"] == Figure(-0.002, sheet)
    assert entry.hfe_points == (HfePoint(0.001, 60.0), HfePoint(0.15, 100.0, 300.0))
    assert entry.model == {"IS": 1.4e-14, "BF": 200.0}
    assert entry.model_source == "fitted to curves of the data sheet"
    assert entry.safe_area == (
        SafeArea(math.inf, ((10.0, 5.0), (40.0, 2.87)), sheet),
        SafeArea(0.01, ((40.0, 4.0),), "memory"),
    )
    assert entry.file == "parts.toml"
    assert entry.contradictions == ()


def test_what_has_no_source_is_from_memory(tmp_path: Path) -> None:
    path = tmp_path / "parts.toml"
    path.write_text('[Q9]\nkind = "pnp"\n[Q9.ratings]\nic = "1 A"\n')
    entry = load_book([path]).find("Q9")
    assert entry is not None
    assert (entry.source, entry.ratings["ic"].source, entry.model, entry.model_source) == ("memory", "memory", {}, None)


def test_the_users_entry_stands_over_the_built_in_one_and_the_first_file_over_the_second(tmp_path: Path) -> None:
    one, two = tmp_path / "one.toml", tmp_path / "two.toml"
    one.write_text('[2n3904]\nkind = "npn"\n[2n3904.ratings]\nic = "100 mA"\n')
    two.write_text('[2N3904]\nkind = "npn"\n[2N3904.ratings]\nic = "150 mA"\n')
    book = load_book([one, two])
    entry = book.find("2N3904")
    assert entry is not None
    assert entry.ratings["ic"].value == 0.1
    assert len(book.remarks) == 1
    assert load_book([two]).remarks == ()
    built_in = load_book().find("2N3904")
    assert built_in is not None
    assert built_in.file is None


def test_contradictions_of_the_users_ratings_are_remarked(tmp_path: Path) -> None:
    path = tmp_path / "parts.toml"
    path.write_text('[Q9]\nkind = "npn"\n[Q9.ratings]\npower = "0.5 W"\nrth_ja = "100 K/W"\ntj_max = "150 degC"\n')
    book = load_book([path])
    assert len(book.remarks) == 1
    assert "Q9" in book.remarks[0]


@pytest.mark.parametrize(
    ("footprint", "size"),
    [
        ("0603", "0603"),
        ("R0603", "0603"),
        ("SM/R_0603", "0603"),
        ("RESC1608X55N", "0603"),
        ("RESC3216X70", "1206"),
        ("R_0603_1608Metric", "0603"),
        ("R_0201_0603Metric", "0201"),
        ("res_0402_1005metric", "0402"),
        ("0805-HS", "0805"),
        ("R2512", "2512"),
        ("R_Axial_DIN0207_L6.3mm", "carbon film 0207"),
        ("SMD", None),
        ("10603", None),
        ("R0603 R0805", None),
        ("RESC9999X1", None),
    ],
)
def test_a_size_is_found_in_a_footprints_name(footprint: str, size: str | None) -> None:
    entry = load_book().find_size("resistor", footprint)
    assert (entry.part_number.removeprefix("chip resistor ") if entry else None) == size


def test_a_capacitors_footprint_finds_no_resistor() -> None:
    assert load_book().find_size("capacitor", "0603") is None


@pytest.mark.parametrize("path", INVALID, ids=lambda path: path.stem)
def test_each_mistake_is_one_clear_line_at_its_place(path: Path) -> None:
    expected = path.with_suffix(".expected").read_text(encoding="utf-8").strip()
    with pytest.raises(InputError) as caught:
        load_book([path])
    assert expected in str(caught.value)
    assert "\n" not in str(caught.value)


def test_there_are_mistakes_to_test() -> None:
    assert len(INVALID) >= 23


def test_every_rating_has_a_dimension_and_belongs_to_a_kind() -> None:
    assert {rating.dimension for rating in RATINGS.values()} <= {*DIMENSIONS, "number"}
    used = {name for names in RATINGS_OF.values() for name in names}
    assert used == set(RATINGS)
    assert set(MODEL_OF) <= set(RATINGS_OF)


def test_the_gain_at_a_current_runs_through_the_points_of_the_data_sheet() -> None:
    """2N3904 data sheet: 40 at 0.1 mA, 70 at 1 mA, 100 to 300 at 10 mA, 60 at 50 mA, 30 at 100 mA; 2N3055: 20 to 70 at 4 A,
    5 at 10 A."""
    book = load_book()
    small, power = book.find("2N3904"), book.find("2N3055")
    assert small is not None and power is not None
    for ic_A, least in ((1e-4, 40.0), (1e-3, 70.0), (1e-2, 100.0), (0.05, 60.0), (0.1, 30.0)):
        assert small.gains_at(ic_A)["hfe_min"] == pytest.approx(least)
    assert small.gains_at(0.01) == pytest.approx({"hfe_min": 100.0, "hfe_max": 300.0})
    assert small.gains_at(0.05)["hfe_max"] == pytest.approx(180.0)
    assert small.gains_at(0.03)["hfe_min"] == pytest.approx(100.0 * 3.0 ** (math.log(0.6) / math.log(5.0)))
    assert power.gains_at(1.0) == pytest.approx({"hfe_min": 20.0, "hfe_max": 70.0})
    assert power.gains_at(10.0)["hfe_min"] == pytest.approx(5.0)
    assert power.gains_at(12.0)["hfe_min"] < 5.0
