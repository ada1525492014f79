import subprocess
import sys
import textwrap

import pytest

from cutblock.base.errors import InputError
from cutblock.catalog import load


@pytest.fixture(autouse=True)
def own_folder(tmp_path, monkeypatch):
    monkeypatch.setenv("XDG_CONFIG_HOME", str(tmp_path))
    folder = tmp_path / "cutblock"
    folder.mkdir()
    return folder


WIRE = textwrap.dedent("""
    [[wire]]
    name = "{name}"
    alloy = "NiCr80"
    diameter_mm = {diameter}
    resistivity_ohm_m = 1.08e-6
    density_kg_m3 = 8410.0
    clearance_mm = 0.2
""")


MACHINE = """
title = "Ours"
travel_mm = 5600.0
lift_mm = 1300.0
span_mm = 2600.0
near_gap_mm = 200.0
table_offset_mm = 300.0
table_height_mm = 50.0
speed_mm_s = 60.0
acceleration_mm_s2 = 200.0
air_speed_mm_s = 40.0
longest_wire_mm = 2900.0
setup_s = 150.0
turn_s = 180.0
axes = ["X", "Y", "U", "V"]
decimals = 3
header = ["G21", "G90", "G61"]
footer = ["M2"]
heater_on = "M3 S{power}"
heater_off = "M5"
"""


def test_every_shipped_entry_is_found_by_its_name():
    for listed, found in (
        (load.grades(), load.grade),
        (load.wires(), load.wire),
        (load.machines(), load.machine),
        (load.label_sheets(), load.label_sheet),
    ):
        assert len(listed) > 1
        assert all(found(entry.name) == entry for entry in listed)


def test_block_sizes_in_feet_are_whole_feet():
    by_name = {size.name: size for size in load.block_sizes()}
    size = by_name["8 x 4 x 4 ft"]
    assert (size.length_mm / 304.8, size.width_mm / 304.8, size.height_mm / 304.8) == pytest.approx((8, 4, 4))


def test_shipped_wire_diameters_are_those_in_their_names():
    for wire in load.wires():
        assert float(wire.name.split()[-1]) == wire.diameter_mm
        assert wire.name.startswith(wire.alloy)


def test_labels_of_shipped_sheets_lie_centred_across_the_page():
    for sheet in load.label_sheets():
        used = sheet.left_mm * 2 + (sheet.columns - 1) * sheet.pitch_x_mm + sheet.label_width_mm
        assert used == pytest.approx(sheet.page_width_mm, abs=0.11), sheet.name


def test_an_unknown_name_is_refused_with_the_near_ones():
    with pytest.raises(InputError, match='no foam grade called "eps100"') as caught:
        load.grade("eps100")
    assert '"EPS 100"' in caught.value.remedy
    with pytest.raises(InputError) as caught:
        load.machine("four axis 2600")
    assert '"four-axis-2600"' in caught.value.remedy


def test_a_hopeless_name_is_answered_with_what_there_is():
    with pytest.raises(InputError) as caught:
        load.label_sheet("###")
    assert "a4-3x7" in caught.value.remedy


def test_the_users_own_entry_adds_or_replaces_by_name(own_folder):
    text = WIRE.format(name="NiCr80 0.40", diameter=0.41) + WIRE.format(name="Mine", diameter=0.9)
    (own_folder / "wires.toml").write_text(text)
    assert load.wire("NiCr80 0.40").diameter_mm == 0.41
    assert load.wire("Mine").diameter_mm == 0.9
    assert load.wire("NiCr80 0.50").diameter_mm == 0.5
    assert [wire.name for wire in load.wires()].count("NiCr80 0.40") == 1


def test_a_machine_file_of_the_users_own_replaces_the_shipped_one(own_folder):
    assert load.machine("four-axis-1300").title != "Ours"
    (own_folder / "machines").mkdir()
    (own_folder / "machines" / "four-axis-1300.toml").write_text(MACHINE)
    assert load.machine("four-axis-1300").title == "Ours"
    assert [machine.name for machine in load.machines()].count("four-axis-1300") == 1


def test_a_machine_is_read_from_a_path_and_named_after_the_file(tmp_path):
    path = tmp_path / "ours.toml"
    path.write_text(MACHINE)
    machine = load.machine(str(path))
    assert machine.name == "ours"
    assert machine.span_mm == 2600.0


def test_a_machine_without_its_own_handling_gets_the_usual_one(tmp_path):
    path = tmp_path / "ours.toml"
    path.write_text(MACHINE)
    assert (load.machine(str(path)).block_handling_s, load.machine(str(path)).piece_handling_s) == (300.0, 60.0)
    path.write_text(MACHINE + "block_handling_s = 0\npiece_handling_s = 25\n")
    assert (load.machine(str(path)).block_handling_s, load.machine(str(path)).piece_handling_s) == (0.0, 25.0)


@pytest.mark.parametrize(
    ("old", "new", "what"),
    [
        ("span_mm = 2600.0", "span_mm = 2600.0\nspam = 1", "spam: no such key"),
        ("span_mm = 2600.0", "", "span_mm: is missing"),
        ("span_mm = 2600.0", 'span_mm = "wide"', "span_mm: wanted a number"),
        ("span_mm = 2600.0", "span_mm = nan", "span_mm: nan"),
        ("span_mm = 2600.0", "span_mm = -1.0", "span_mm: wanted a number > 0"),
        ("span_mm = 2600.0", "span_mm = 150.0", "near_gap_mm: 200 mm leaves nothing"),
        ("travel_mm = 5600.0", "travel_mm = 200.0", "table_offset_mm: 300 mm leaves no travel"),
        ("table_height_mm = 50.0", "table_height_mm = 1300.0", "table_height_mm: 1300 mm leaves no lift"),
        ("longest_wire_mm = 2900.0", "longest_wire_mm = 2500.0", "longest_wire_mm: 2500 mm is shorter"),
        ("air_speed_mm_s = 40.0", "air_speed_mm_s = 70.0", "air_speed_mm_s: 70 mm/s is over"),
        ('"U", "V"]', '"U", "X"]', "axes: an axis stands twice"),
        ('"U", "V"]', '"U"]', "axes: wanted a list of length 4"),
        ('"G61"', '"G64"', "header: G61 is missing"),
        ("M3 S{power}", "M3 S60", "heater_on: has no {power}"),
        ("M3 S{power}", "M3 S{power} {x}", "heater_on: has a brace"),
        ("decimals = 3", "decimals = 0", "decimals: wanted a whole number >= 2"),
        ("decimals = 3", "decimals = 3 3", "is not valid TOML"),
    ],
)
def test_a_wrong_machine_file_is_refused_naming_file_key_and_line(tmp_path, old, new, what):
    assert old in MACHINE
    path = tmp_path / "ours.toml"
    path.write_text(MACHINE.replace(old, new))
    with pytest.raises(InputError) as caught:
        load.machine(str(path))
    assert what in caught.value.message
    assert str(path) in caught.value.subject
    assert caught.value.remedy


def test_the_line_of_a_wrong_value_is_named(own_folder):
    text = WIRE.format(name="One", diameter=0.4) + WIRE.format(name="Two", diameter=-0.4)
    (own_folder / "wires.toml").write_text(text)
    with pytest.raises(InputError, match=r"wire\[2\]\.diameter_mm") as caught:
        load.wires()
    line = int(caught.value.subject.rsplit(":", 1)[1])
    assert text.splitlines()[line - 1] == "diameter_mm = -0.4"


def test_a_name_given_twice_in_one_file_is_refused(own_folder):
    (own_folder / "wires.toml").write_text(WIRE.format(name="One", diameter=0.4) * 2)
    with pytest.raises(InputError, match="stands twice"):
        load.wire("One")


def test_labels_that_overlap_or_leave_the_page_are_refused(own_folder):
    shipped = (load.assets_folder() / "labels.toml").read_text()
    for old, new, what in (
        ("pitch_x_mm = 66.0", "pitch_x_mm = 60.0", "pitch_x_mm: 60 mm is less"),
        ("rows = 10", "rows = 11", "page_height_mm: the labels end"),
    ):
        (own_folder / "labels.toml").write_text(shipped.replace(old, new))
        with pytest.raises(InputError, match=what):
            load.label_sheets()


def test_a_density_outside_its_own_range_is_refused(own_folder):
    text = (load.assets_folder() / "grades.toml").read_text().replace("density_kg_m3 = 13.5", "density_kg_m3 = 16.0")
    (own_folder / "grades.toml").write_text(text)
    with pytest.raises(InputError, match=r"grade\[1\]\.density_kg_m3: 16 kg/m3 does not lie between 12 and 15"):
        load.grade("EPS 50")


def test_a_missing_or_binary_file_is_refused(tmp_path):
    with pytest.raises(InputError, match="cannot be read"):
        load.machine(str(tmp_path / "none.toml"))
    (tmp_path / "binary.toml").write_bytes(b"\xff\xfe\x00")
    with pytest.raises(InputError, match="UTF-8"):
        load.machine(str(tmp_path / "binary.toml"))


def test_the_catalogue_loads_nothing_heavy():
    code = (
        "import sys; from cutblock.catalog import load; load.wire('NiCr80 0.40');"
        "print([m for m in ('scipy', 'trimesh', 'shapely', 'PySide6') if m in sys.modules])"
    )
    answer = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert answer.stdout.strip() == "[]"
