"""Catalogues: what data sheets say comes out in SI, and every fault is told by its place.

`bad` holds one file for each fault; the comment at its top says what the message must hold.
"""

import re
from pathlib import Path

import pytest

from problems import CaseError
from problems.fans.catalogue import read_catalogue, ready_made_catalogues
from problems.fans.motors import read_motor

HERE = Path(__file__).parent
BAD = sorted((HERE / "bad").glob("*.csv"))
HEAD = "fan,speed rpm,density kg/m3,flow m3/h,static pressure Pa,shaft power W"
POINTS = ("0,200,80", "500,190,90", "1000,140,100", "1500,40,95")


def written(tmp_path, header, points, fan="Wren,1400,1.2", name="fans.csv"):
    text = "\n".join((header, *(f"{fan},{point}" for point in points)))
    (tmp_path / name).write_text(text, "utf-8")
    return tmp_path / name


def only(path):
    (fan,) = read_catalogue(path).fans
    return fan


@pytest.mark.parametrize("path", BAD, ids=lambda path: path.stem)
def test_a_fault_is_told_with_file_row_column_value_and_what_is_allowed(path):
    says = re.findall(r"^# says: (.+)$", path.read_text("utf-8"), re.M)[0].split(" | ")
    with pytest.raises(CaseError) as caught:
        read_catalogue(path)
    message = str(caught.value)
    assert message.startswith(f"{path}: ")
    for part in says:
        assert part in message
    assert message.count("\n") + (len(says) == 1 or "faults" in says[0]) >= len(says)
    assert not re.search(r"traceback|could not convert|<class|keyerror|pint", message, re.I)


def test_what_the_data_sheet_says_comes_out_in_si(tmp_path):
    fan = only(written(tmp_path, HEAD, POINTS))
    assert fan.name == "Wren"
    assert fan.speed == pytest.approx(1400.0 / 60.0)
    assert fan.flow == pytest.approx([0.0, 500 / 3600, 1000 / 3600, 1500 / 3600])
    assert fan.pressure == (200.0, 190.0, 140.0, 40.0)
    assert fan.power == (80.0, 90.0, 100.0, 95.0)
    assert fan.highest_speed == fan.speed
    assert fan.lowest_speed == pytest.approx(0.3 * fan.speed)
    assert not fan.electrical


@pytest.mark.parametrize(
    ("header", "points"),
    [
        ("fan,speed 1/s,density kg/m3,flow l/s,static pressure kPa,shaft power kW",
         ("0,.2,.08", "138.8889,.19,.09", "277.7778,.14,.1", "416.6667,.04,.095")),
        ("Fan,Speed [Hz],Density (kg/m3),Flow [m³/min],Static pressure [mbar],Shaft power [W]",
         ("0,2,80", "8.333333,1.9,90", "16.66667,1.4,100", "25,.4,95")),
        ("fan,speed rps,density kg/m3,flow cfm,static pressure mmH2O,shaft power hp",
         ("0,20.39432,.1072818", "294.2889,19.37461,.120692", "588.5778,14.27603,.1341022",
          "882.8667,4.078865,.1273971")),
    ],
)  # fmt: skip
def test_any_common_unit_gives_the_same_fan(tmp_path, header, points):
    fan = only(written(tmp_path, header, points, fan="Wren,23.333333333333332,1.2"))
    plain = only(written(tmp_path, HEAD, POINTS))
    for name in ("speed", "flow", "pressure", "power"):
        assert getattr(fan, name) == pytest.approx(getattr(plain, name), rel=1e-6)


def test_semicolons_and_decimal_commas_are_understood(tmp_path):
    path = tmp_path / "fans.csv"
    rows = [f"Wren;1400;1,2;{point.replace(',', ';')},0" for point in POINTS]
    path.write_text("\n".join((HEAD.replace(",", ";"), *rows)), "utf-8")
    assert only(path) == only(written(tmp_path, HEAD, POINTS))


def test_what_is_the_same_for_a_whole_fan_may_stand_in_its_first_row_only(tmp_path):
    path = tmp_path / "fans.csv"
    rows = [f"Wren,1400,1.2,{POINTS[0]},90", *(f"Wren,,,{point}," for point in POINTS[1:])]
    path.write_text("\n".join((f"{HEAD},price GBP", *rows)), "utf-8")
    catalogue = read_catalogue(path)
    assert catalogue.currency == "GBP"
    assert catalogue.prices == (90.0,)
    assert catalogue.unpriced == ()
    assert catalogue.fans[0].speed == pytest.approx(1400.0 / 60.0)


def test_total_pressure_loses_the_velocity_pressure_in_the_outlet(tmp_path):
    # 0.4 m3/s through 0.1 m2: 4 m/s, 0.5 x 1.25 x 16 = 10 Pa
    header = "fan,speed rpm,density kg/m3,outlet area m2,flow m3/s,total pressure Pa,shaft power W"
    points = ("0,200,80", "0.2,150,90", "0.4,110,100", "0.5,60,95")
    fan = only(written(tmp_path, header, points, fan="Wren,1400,1.25,0.1"))
    assert fan.pressure == pytest.approx([200.0, 147.5, 100.0, 60.0 - 15.625])


@pytest.mark.parametrize(
    ("column", "power"),
    [("efficiency", 0.4 * 110.0), ("total efficiency", 44.0), ("static efficiency", 40.0)],
)
def test_an_efficiency_gives_the_power_on_its_own_basis(tmp_path, column, power):
    header = f"fan,speed rpm,density kg/m3,outlet area m2,flow m3/s,total pressure Pa,{column} %"
    points = ("0.1,200,20", "0.2,150,40", "0.4,110,50", "0.5,60,30")
    fan = only(written(tmp_path, header, points, fan="Wren,1400,1.25,0.1"))
    assert fan.power[2] == pytest.approx(power / 0.5)


def test_electrical_power_is_kept_apart_from_shaft_power(tmp_path):
    assert only(written(tmp_path, HEAD.replace("shaft", "electrical"), POINTS)).electrical


def test_a_folder_is_one_catalogue(tmp_path):
    written(tmp_path, HEAD, POINTS, name="a.csv")
    written(tmp_path, HEAD, POINTS, fan="Teal,900,1.2", name="b.csv")
    assert [fan.name for fan in read_catalogue(tmp_path).fans] == ["Wren", "Teal"]
    assert read_catalogue(tmp_path).place("Teal") == 1
    with pytest.raises(CaseError, match="fan Taal: unknown; the nearest: Teal"):
        read_catalogue(tmp_path).place("Taal")


def test_faults_of_all_files_of_a_folder_come_in_one_message(tmp_path):
    written(tmp_path, HEAD, POINTS[:3], name="a.csv")
    written(tmp_path, HEAD, POINTS[::-1], fan="Teal,900,1.2", name="b.csv")
    with pytest.raises(CaseError) as caught:
        read_catalogue(tmp_path)
    assert "a.csv: 1 fault" in str(caught.value)
    assert "b.csv: 3 faults" in str(caught.value)


def test_one_fan_in_two_files_is_refused(tmp_path):
    written(tmp_path, HEAD, POINTS, name="a.csv")
    written(tmp_path, HEAD, POINTS, name="b.csv")
    with pytest.raises(CaseError, match=r"fan Wren: is in .*a\.csv too"):
        read_catalogue(tmp_path)


def test_prices_in_two_currencies_are_refused(tmp_path):
    for name, currency in (("Wren", "EUR"), ("Teal", "GBP")):
        header = HEAD.replace("fan,", f"fan,price {currency},")
        written(tmp_path, header, POINTS, fan=f"{name},90,1400,1.2", name=f"{name}.csv")
    with pytest.raises(CaseError, match="prices in EUR and GBP -- one currency"):
        read_catalogue(tmp_path)


def test_a_missing_file_names_the_ready_made_catalogues(tmp_path):
    with pytest.raises(
        CaseError, match=r"no such file or folder of fans; ready-made: workshop-fans"
    ):
        read_catalogue("nowhere.csv", beside=tmp_path)
    (tmp_path / "empty").mkdir()
    with pytest.raises(CaseError, match="a folder without CSV files"):
        read_catalogue("empty", beside=tmp_path)


def test_files_that_are_no_tables_are_refused(tmp_path):
    (tmp_path / "blank.csv").write_text("\n# nothing\n", "utf-8")
    (tmp_path / "binary.csv").write_bytes(b"\xff\xfe\x00")
    with pytest.raises(CaseError, match="empty -- a line of headers"):
        read_catalogue(tmp_path / "blank.csv")
    with pytest.raises(CaseError, match="not UTF-8 text"):
        read_catalogue(tmp_path / "binary.csv")


@pytest.mark.parametrize("name", ready_made_catalogues())
def test_ready_made_catalogues_are_read_by_name_with_or_without_their_ending(name):
    assert read_catalogue(name) == read_catalogue(f"{name}.csv")
    assert read_catalogue(name).unpriced == ()


def test_a_motor_of_the_user_is_read_and_checked(tmp_path):
    path = tmp_path / "motor.csv"
    path.write_text("shaft power kW;motor efficiency %\n0,5;80\n1;82\n2;84,5\n", "utf-8")
    assert read_motor(path)([1000.0, 10.0, 1e6]) == pytest.approx([0.82, 0.8, 0.845], abs=1e-4)
    path.write_text("shaft power kW,motor efficiency %\n1,80\n0.5,82\n2,120\n", "utf-8")
    with pytest.raises(CaseError) as caught:
        read_motor(path)
    assert 'row 3, column "shaft power kW": 0.5 -- above 1' in str(caught.value)
    assert 'row 4, column "motor efficiency %": 120' in str(caught.value)
