"""Tables of the gas beside a scenario, reionization, and what is wrong with them."""

from dataclasses import replace

import pytest
import yaml
from astropy.table import Table
from scenario_texts import full_text, line_of, refusal

from twofluid.scenario import (
    Reionization,
    ScenarioError,
    ThermalTable,
    parse_scenario,
    read_scenario,
    scenario_from_mapping,
    thermal_sentence,
)
from twofluid.scenario.document import LARGEST_SIZE
from twofluid.universe import Universe, UniverseError

HEAD = """# %ECSV 1.0
# ---
# datatype:
# - {name: redshift, datatype: float64}
# - {name: gas_temperature, unit: K, datatype: float64}
# - {name: electron_fraction, datatype: float64}
# schema: astropy-2.0
redshift gas_temperature electron_fraction
"""
ROWS = ["0 9e3 1.08", "0.5 9e3 1.08", "1.2 1e4 1.08", "2.4 1e4 1.08", "4.4 9e3 1", "7 900 0.1", "11 60 3e-3",
        "17 15 3e-4", "26 15 2e-4", "34 25 2e-4"]  # fmt: skip
BODY = """title: Saltmarsh heated
cosmology: {hubble_constant: 70 km/(s Mpc), baryon_density: 0.02, dark_matter_density: 0.1}
sampling: {wavenumbers: 0.1 1/Mpc, redshifts: [20]}
"""
SECTION = "thermal: {table: heating.ecsv, below_redshift: 30}\n"


def ecsv(rows=ROWS, head=HEAD):
    return head + "\n".join(rows) + "\n"


@pytest.fixture
def files(tmp_path):
    """Write a scenario and its table; return the path of the scenario."""

    def write(text=None, section=SECTION):
        (tmp_path / "heating.ecsv").write_text(ecsv() if text is None else text)
        path = tmp_path / "box.yaml"
        path.write_text(BODY + section)
        return path

    return write


def told(path):
    with pytest.raises(ScenarioError) as caught:
        read_scenario(path)
    assert str(caught.value).isprintable()
    return caught.value


# --- reading


def test_a_table_beside_the_file_is_read_whole(files):
    table = read_scenario(files()).cosmology.thermal
    assert table.redshift == (0.0, 0.5, 1.2, 2.4, 4.4, 7.0, 11.0, 17.0, 26.0, 34.0)
    assert table.gas_temperature[:2] == (9000.0, 9000.0)  # equal values are no repetition
    assert table.electron_fraction[-1] == 2e-4
    assert (table.below_redshift, table.joining_width) == (30.0, 0.1)


def test_falling_redshifts_give_the_same_scenario(files):
    scenario = read_scenario(files())
    assert read_scenario(files(ecsv(ROWS[::-1]))) == scenario
    assert hash(scenario.cosmology) == hash(read_scenario(files()).cosmology)


def test_other_units_are_converted(files):
    text = ecsv([f"{row.split()[0]} {float(row.split()[1]) / 1e3} {row.split()[2]}" for row in ROWS],
                HEAD.replace("unit: K", "unit: kK"))  # fmt: skip
    table = read_scenario(files(text)).cosmology.thermal
    assert table.gas_temperature == pytest.approx(read_scenario(files()).cosmology.thermal.gas_temperature, rel=1e-14)


def test_what_astropy_writes_is_read(files, tmp_path):
    path = files()
    table = Table.read(tmp_path / "heating.ecsv")
    table["redshift"] = table["redshift"].astype("float32")
    table["note"] = "as invented"  # further columns do no harm
    table.write(tmp_path / "heating.ecsv", overwrite=True, delimiter=",")
    assert read_scenario(path).cosmology.thermal.electron_fraction[0] == 1.08


def test_the_mapping_holds_the_rows_and_needs_no_file(files, tmp_path):
    scenario = read_scenario(files())
    (tmp_path / "heating.ecsv").unlink()
    mapping = yaml.safe_load(yaml.safe_dump(scenario.to_mapping()))
    assert mapping["thermal"]["table"]["gas_temperature"][0] == "9000.0 K"
    assert scenario_from_mapping(mapping) == scenario
    assert parse_scenario(yaml.safe_dump(mapping)) == scenario


def test_a_table_is_looked_for_beside_the_file_that_names_it(files, tmp_path):
    files()
    (tmp_path / "below").mkdir()
    child = tmp_path / "below" / "child.yaml"
    child.write_text("base: ../box.yaml\nthermal: {joining_width: 0.3}\n")
    thermal = read_scenario(child).cosmology.thermal
    assert (len(thermal.redshift), thermal.joining_width) == (10, 0.3)
    for nothing in ("null", "{}"):
        child.write_text(f"base: ../box.yaml\nthermal: {nothing}\n")
        assert read_scenario(child).cosmology.thermal is None


def test_off_by_default_and_said_to_be():
    scenario = parse_scenario(BODY)
    assert (scenario.cosmology.thermal, scenario.cosmology.reionization) == (None, None)
    assert {"thermal", "reionization"} <= set(scenario.assumed)
    assert any(text.startswith("reionization = none") for text in scenario.assumptions())
    assert thermal_sentence(scenario.cosmology) == ""


def test_reionization_leaves_its_temperature_open_and_says_what_that_means():
    scenario = parse_scenario(BODY + "reionization: {redshift: 7.7, width: 0.5}\n")
    assert scenario.cosmology.reionization == Reionization(7.7, 0.5, None)
    assert any("no heat from ionizing light" in text for text in scenario.assumptions())
    assert "no heat brought" in thermal_sentence(scenario.cosmology)


# --- errors in the table; the rows stand from line 9 on


def spoilt(row, text):
    return ecsv([*ROWS[:row], text, *ROWS[row + 1 :]])


@pytest.mark.parametrize(
    ("text", "line", "key", "value", "rule"),
    [
        (spoilt(3, "2.4 -5 1.08"), 12, "gas_temperature", "-5.0 K", "is out of range"),
        (spoilt(3, "2.4 0 1.08"), 12, "gas_temperature", "0.0 K", "is out of range"),
        (spoilt(3, "2.4 nan 1.08"), 12, "gas_temperature", "nan K", "must be a number with a unit"),
        (spoilt(3, '2.4 "" 1.08'), 12, "gas_temperature", None, "has no value"),
        (spoilt(4, "4.4 9e3 -1e-3"), 13, "electron_fraction", "-0.001", "is out of range"),
        (spoilt(4, "4.4 9e3 1.2"), 13, "electron_fraction", "1.2", "at most 1.164, full ionization with this helium"),
        (spoilt(4, "4.4 9e3 nan"), 13, "electron_fraction", "nan", "must be a finite number"),
        (spoilt(4, "2.4 9e3 1"), 13, "redshift", "2.4", "redshifts must rise, or fall, from row to row"),
        (spoilt(4, "2.3 9e3 1"), 13, "redshift", "2.3", "redshifts must rise, or fall, from row to row"),
        (spoilt(4, "inf 9e3 1"), 13, "redshift", "inf", "must be a finite number"),
        (spoilt(0, "0.1 9e3 1"), 9, "redshift", "0.1", "must reach redshift 0"),
        (ecsv(ROWS[:4] + ROWS[5:]), 13, "redshift", "7.0", "leaves a gap of more than 0.5 in ln(1 + z) down to 2.4"),
        (ecsv(ROWS[:-1]), 17, "redshift", "26.0", "the table ends below below_redshift, which is 30"),
        (ecsv([*ROWS[:0:-1], "0 9e3 1.9"]), 18, "electron_fraction", "1.9", "full ionization"),
    ],
)
def test_a_wrong_entry_is_told_with_its_line(files, text, line, key, value, rule):
    path = files(text)
    error = told(path)
    assert error.file == str(path.with_name("heating.ecsv"))
    assert (error.line, error.key, error.value) == (line, f"thermal.table.{key}", value)
    assert rule in error.rule
    assert error.remedy


@pytest.mark.parametrize(
    ("text", "line", "rule", "remedy"),
    [
        ("redshift,gas_temperature\n1,2\n", 1, "is not an ECSV table", "its first line must begin with # %ECSV"),
        ("", 1, "is not an ECSV table", "# %ECSV"),
        (ecsv(["0 9e3"]), None, "is not an ECSV table that can be read (", "write it anew"),
        (ecsv().replace("datatype:", "datatype: ["), None, "is not an ECSV table that can be read (", "write it anew"),
        (ecsv(head=HEAD.replace("gas_temp", "temp")), 8, "has no column gas_temperature",
         "rename or add it; there is redshift, temperature"),
        (ecsv(head=HEAD.replace(", unit: K", "")), 8, "needs a unit", "give it in K"),
        (ecsv(head=HEAD.replace("unit: K", "unit: Mpc")), 9, "has a unit that cannot be read or converted", "in K"),
        (ecsv(head=HEAD.replace("{name: redshift,", "{name: redshift, unit: Mpc,")), 8, "must have no unit", "plain"),
        (ecsv(head=HEAD.replace("redshift, datatype: float64", "redshift, datatype: string")), 8,
         "must be a column of plain numbers", "one number a row"),
        (ecsv(ROWS[:4]), None, "has too few rows, 4", "at least 5"),
        (ecsv([]), None, "must not be an empty list", "write for example"),
        (ecsv() + "#" * LARGEST_SIZE, None, "is larger than 1000000 bytes", "thin it out"),
    ],
)  # fmt: skip
def test_what_is_no_table_of_the_gas_is_refused(files, text, line, rule, remedy):
    error = told(files(text))
    assert rule in error.rule
    assert remedy in error.remedy
    assert line is None or error.line == line
    assert error.file.endswith("heating.ecsv") or error.key == "thermal.table.redshift"


def test_a_table_that_is_not_there_is_blamed_on_the_line_that_names_it(files):
    error = told(files(section=SECTION.replace("heating", "cooling")))
    assert (error.line, error.key, error.value) == (4, "thermal.table", "cooling.ecsv")
    assert "does not exist" in error.rule


def test_no_more_rows_than_a_header_should_hold(files):
    rows = [f"{number / 100} 9e3 1" for number in range(5001)]
    assert "at most 5000 entries" in told(files(ecsv(rows))).rule


@pytest.mark.parametrize(
    ("section", "key", "rule"),
    [
        ("thermal: {below_redshift: 30}\n", "thermal.table", "is required"),
        ("thermal: {table: heating.ecsv}\n", "thermal.below_redshift", "is required"),
        ("thermal: {table: 5, below_redshift: 30}\n", "thermal.table", "does not exist"),
        ("thermal: {table: [1], below_redshift: 30}\n", "thermal.table", "must be a file name or columns"),
        ("thermal:\n", "thermal.table", "is required"),
        ("thermal: heating.ecsv\n", "thermal", "must hold keys"),
        ("thermal: {table: heating.ecsv, below_redshift: 800}\n", "thermal.below_redshift", "is out of range"),
        ("thermal: {table: heating.ecsv, below_redshift: 1, joining_width: 0.8}\n", "thermal.joining_width",
         "would not be over by redshift 0"),
        ("reionization:\n", "reionization.redshift", "is required"),
        ("reionization: {redshift: 7.7}\n", "reionization.width", "is required"),
        ("reionization: {redshift: 7.7, width: 0.1}\n", "reionization.width", "must be from 0.174 to 1.925"),
        ("reionization: {redshift: 7.7, width: 2}\n", "reionization.width", "for a step at redshift 7.7"),
        ("reionization: {redshift: 7.7, width: 0.5, gas_temperature: 1e4}\n", "reionization.gas_temperature",
         "needs a unit"),
        ("method: {ionization_fluctuations: maybe}\n", "method.ionization_fluctuations", "must be true or false"),
        ("method: {ionization_fluctuations: 'true'}\n", "method.ionization_fluctuations", "must be true or false"),
        ("method: {ionization_fluctuations: true, closure: sound-speed}\n", "method.ionization_fluctuations",
         "needs the closure kinetic"),
    ],
)  # fmt: skip
def test_wrong_sections(files, section, key, rule):
    error = told(files(section=section))
    assert (error.key, error.line) == (key, 4)
    assert rule in f"{error.rule}"


def test_a_text_cannot_name_a_table():
    inner = dict.fromkeys(("redshift", "gas_temperature", "electron_fraction"))
    error = refusal(full_text({"thermal.table": "heating.ecsv"} | {f"thermal.table.{name}": None for name in inner}))
    assert (error.key, error.line) == ("thermal.table", line_of("thermal.table"))
    assert "no directory to look in" in error.rule


def test_columns_of_different_length():
    error = refusal(full_text({"thermal.table.electron_fraction": "[1, 1, 1]"}))
    assert (error.key, error.line) == ("thermal.table.redshift", line_of("thermal.table.redshift"))
    assert "redshift 9, gas_temperature 9, electron_fraction 3" in error.rule


def test_a_cosmology_built_by_hand_is_checked_when_its_universe_is_built():
    cosmology = parse_scenario(BODY).cosmology
    bad = ThermalTable((0, 1, 0.5, 2, 3), (1e4,) * 5, (1.0,) * 5, 2.0)
    with pytest.raises(UniverseError, match=r"thermal.table.redshift\[2\] = 0.5: redshifts must rise"):
        Universe(replace(cosmology, thermal=bad))
    with pytest.raises(UniverseError, match=r"reionization\.width = 9: must be from"):
        Universe(replace(cosmology, reionization=Reionization(8.0, 9.0)))
