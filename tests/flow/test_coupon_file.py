import pytest

from cutblock.base.errors import InputError
from cutblock.flow.coupon_file import read_coupons

HEAD = "coupon,power W/m,speed mm/min,density kg/m3,kerf mm,wire,machine,date"
ROW = "C1,60,180,20.1,1.05,NiCr80 0.40,four-axis-2600,2026-03-02"


@pytest.fixture
def sheet(tmp_path):
    def write(*lines, encoding="utf-8", end="\n"):
        path = tmp_path / "coupons.csv"
        path.write_bytes(end.join(lines).encode(encoding))
        return path

    return write


def only(path):
    (row,) = read_coupons(path).rows
    return row


def test_a_row_is_read_in_the_units_of_its_headings(sheet):
    row = only(sheet(HEAD, ROW))
    assert (row.name, row.power_w_m, row.speed_mm_s, row.density_kg_m3, row.kerf_mm) == ("C1", 60.0, 3.0, 20.1, 1.05)
    assert (row.wire, row.machine, row.date) == ("NiCr80 0.40", "four-axis-2600", "2026-03-02")
    assert row.place == "coupons.csv:2"
    assert not row.is_onset


@pytest.mark.parametrize(
    "head",
    [
        "power_W_per_m,speed_mm_per_s,density_kg_per_m3,kerf_mm",
        "Power (W/m),Speed [mm/s],Density (kg/m³),Kerf [mm]",
        '"power, W/m","speed, mm/s","density, kg/m3","kerf, mm"',
    ],
)
def test_headings_are_known_however_their_unit_is_written(sheet, head):
    row = only(sheet(head, "60,3,20,1"))
    assert (row.power_w_m, row.speed_mm_s, row.density_kg_m3, row.kerf_mm) == (60.0, 3.0, 20.0, 1.0)
    assert row.name == "line 2"


@pytest.mark.parametrize("encoding", ["utf-8", "utf-8-sig"])
@pytest.mark.parametrize("end", ["\n", "\r\n", "\r"])
def test_what_spreadsheets_leave_behind_is_passed_over(sheet, encoding, end):
    path = sheet(HEAD, "", ",,,,,,,", ROW, "# a note", ROW + ",,", "", encoding=encoding, end=end)
    rows = read_coupons(path).rows
    assert [row.place for row in rows] == ["coupons.csv:4", "coupons.csv:6"]
    assert rows[0].kerf_mm == rows[1].kerf_mm == 1.05


@pytest.mark.parametrize(("mark", "first"), [(";", []), (";", ["sep=;"]), (";", ["\ufeffsep=;"]), ("\t", [])])
def test_semicolons_and_tabs_allow_decimal_commas(sheet, mark, first):
    lines = [HEAD.replace(",", mark), ROW.replace(",", mark).replace(".05", ",05").replace("20.1", "20,1")]
    row = only(sheet(*first, *lines))
    assert (row.density_kg_m3, row.kerf_mm) == (20.1, 1.05)
    assert row.place == f"coupons.csv:{2 + len(first)}"


def test_weighed_coupons_take_their_loss_and_area_in_several_units(sheet):
    row = only(sheet("power W/m,speed mm/s,density kg/m3,mass loss kg,cut area m2", "60,3,20,0.00216,0.09"))
    assert (row.mass_loss_g, row.cut_area_cm2) == pytest.approx((2.16, 900.0))
    assert row.kerf_mm is None


def test_coupons_without_a_result_are_listed_and_left_out(sheet):
    head = HEAD + ",kind"
    path = sheet(head, ROW + ",", "C2,60,180", "C3,60,,20,,,,,onset", "C4,60,200,20,,,,,onset")
    found = read_coupons(path)
    assert [(row.name, row.is_onset) for row in found.rows] == [("C1", False), ("C4", True)]
    assert found.empty == ("C2", "C3")


def test_columns_that_mean_nothing_are_told(sheet):
    assert read_coupons(sheet(HEAD + ",weather", ROW + ",fair")).unused == ("weather",)


# What is wrong, and the words that must be in the message: line, column, what, remedy.
BAD = {
    "no column": ((HEAD.replace("speed mm/min,", ""), ROW), ("coupons.csv:1", "no column for speed", "coupons plan")),
    "no result column": ((HEAD.replace("kerf mm,", ""), ROW), ("coupons.csv:1", "kerf (or mass loss and cut area)")),
    "no unit": ((HEAD.replace("kerf mm", "kerf"), ROW), ("coupons.csv:1", 'column E ("kerf")', '"kerf mm"')),
    "unknown unit": ((HEAD.replace("mm/min", "in/min"), ROW), ("coupons.csv:1", "column C", '"speed mm/s"')),
    "two units": ((HEAD + ",kerf in", ROW + ",0.04"), ("coupons.csv:1", 'column I ("kerf in")', "mix units")),
    "unit in a cell": ((HEAD, ROW, ROW.replace("1.05", "0.05 in")), ("coupons.csv:3", "column E", "may not be mixed")),
    "text": ((HEAD, ROW.replace("60", "sixty")), ("coupons.csv:2", 'column B ("power W/m")', '"sixty"')),
    "negative": ((HEAD, ROW.replace("1.05", "-1.05")), ("coupons.csv:2", "column E", "not above 0")),
    "nothing": ((HEAD, ROW.replace("180", "0")), ("coupons.csv:2", "column C", "not above 0")),
    "not finite": ((HEAD, ROW.replace("1.05", "nan")), ("coupons.csv:2", "column E", '"nan"')),
    "huge": ((HEAD, ROW.replace("1.05", "1e999")), ("coupons.csv:2", "column E")),
    "out of range": ((HEAD, ROW.replace("20.1", "201")), ("coupons.csv:2", "column D", "outside 8 to 60 kg/m3")),
    "thousands": (
        (HEAD.replace(",", ";"), ROW.replace(",", ";").replace("180", "1.180,0")),
        ("column C", "decimal point"),
    ),
    "empty needed": ((HEAD, ROW.replace("20.1", "")), ("coupons.csv:2", "column D", "is empty")),
    "loss without area": (
        ("power W/m,speed mm/s,density kg/m3,mass loss g,cut area cm2", "60,3,20,2.1,"),
        ("coupons.csv:2", "column E", "is empty"),
    ),
    "decimal commas": (
        (HEAD, ROW.replace("1.05", "1,05")),
        ("coupons.csv:2", "9 cells under 8 headings", "semicolons"),
    ),
    "quoted comma": ((HEAD, ROW.replace("1.05", '"1,05"')), ("coupons.csv:2", "column E", "decimal point")),
    "date": ((HEAD, ROW.replace("2026-03-02", "2.3.2026")), ("coupons.csv:2", "column H", "no day")),
    "kind": ((HEAD + ",kind", ROW + ",slow"), ("coupons.csv:2", "column I", '"onset"')),
    "quote": ((HEAD, ROW.replace("C1", '"C1')), ("coupons.csv:",)),
    "empty": (("",), ("coupons.csv", "is empty")),
    "heading alone": ((HEAD,), ("coupons.csv", "no test cut that was measured")),
    "no heading": ((ROW, ROW), ("coupons.csv:1", "no column for power")),
}


@pytest.mark.parametrize("case", BAD)
def test_a_bad_sheet_is_refused_naming_line_and_column(sheet, case):
    lines, words = BAD[case]
    with pytest.raises(InputError) as refused:
        read_coupons(sheet(*lines))
    for word in words:
        assert word in str(refused.value)


def test_a_file_that_is_no_text_is_refused(sheet, tmp_path):
    with pytest.raises(InputError, match="UTF-8"):
        read_coupons(sheet(HEAD, ROW, encoding="utf-16"))
    with pytest.raises(InputError, match="cannot be read"):
        read_coupons(tmp_path / "none.csv")
    (tmp_path / "large.csv").write_bytes(b"x" * 1_000_001)
    with pytest.raises(InputError, match="larger than 1 MB"):
        read_coupons(tmp_path / "large.csv")
