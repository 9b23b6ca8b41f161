"""Stacked tables with ratios to the first, on histories with known closed forms."""

import io

import numpy as np
import pytest
from astropy.table import Column, MaskedColumn, Table

from twofluid.files import table_bytes
from twofluid.products import catchup_table, course_table, difference_table, evolution_table, joined_table, lag_table
from twofluid.quantities import QUANTITIES


@pytest.fixture
def histories(make_history, curves):
    """Return two runs: baryons at 0.9 of the dark matter, and all amplitudes different in the second."""
    first = make_history([curves.power(1), curves.power(1, 2.0)], [curves.power(1, 0.9), curves.power(1, 1.8)])
    second = make_history([curves.power(1, 1.1), curves.power(1)], [curves.power(1, 0.66), curves.power(1, 0.9)])
    return first, second


def test_rows_stand_one_scenario_after_the_other(histories):
    table = joined_table([evolution_table(history) for history in histories], ["one", "two"])
    assert table["scenario"].tolist() == ["one"] * 4 + ["two"] * 4
    assert table["wavenumber"].tolist() == [1, 1, 2, 2] * 2
    assert table["redshift"].tolist() == [9, 0] * 4
    assert np.array_equal(table["delta_baryon"][4:], histories[1].delta_baryon.ravel())
    assert str(table["theta_baryon"].unit) == "1 / Mpc"
    assert "redshift_over_first" not in table.colnames


def test_ratios_are_to_the_first_at_the_same_place(histories):
    table = joined_table([evolution_table(history) for history in histories], ["one", "two"])
    assert table["delta_dark_over_first"].tolist() == pytest.approx([1, 1, 1, 1, 1.1, 1.1, 0.5, 0.5], rel=1e-14)
    assert table["theta_baryon_over_first"][4:].tolist() == pytest.approx([0.66 / 0.9] * 2 + [0.5] * 2, rel=1e-14)
    assert table["theta_baryon_over_first"].unit is None
    assert table["delta_dark_over_first"].description.startswith("delta_dark over that of the first scenario")


def test_rows_are_matched_by_place_not_by_order():
    first = Table({"redshift": [1.0, 2.0, 2.0], "size": [10.0, 20.0, 30.0]})
    second = Table({"redshift": [2.0, 5.0, 2.0, 1.0], "size": [2.0, 5.0, 6.0, 4.0]})
    for table in (first, second):
        table["size"].description = "size"
    ratio = joined_table([first, second], ["one", "two"])["size_over_first"]
    assert ratio.tolist() == [1, 1, 1, 0.1, None, 0.2, 0.4]


def test_there_is_no_ratio_to_nothing():
    first = Table({"value": MaskedColumn([1.0, 0.0, np.inf, 3.0], mask=[0, 0, 0, 1]), "verdict": list("abcd")})
    second = Table({"value": Column([2.0, 1.0, 1.0, 1.0]), "verdict": list("abce")})
    table = joined_table([first, second], ["one", "two"])
    assert table["value_over_first"].tolist() == [1, None, None, None, 2, None, None, None]
    assert table["value"].tolist() == [1, 0, np.inf, None, 2, 1, 1, 1]
    assert table["verdict"].tolist() == list("abcdabce")
    assert "verdict_over_first" not in table.colnames


def test_the_header_holds_what_is_common_once_and_the_rest_by_scenario(histories):
    tables = [catchup_table(history, [0.5]) for history in histories]
    tables[1].meta["certificate"] = "another"
    meta = joined_table(tables, ["one", "two"], ["a note"]).meta
    assert meta["fractions"] == {"redshift_at_50_percent": 0.5}
    assert meta["scenario"] == {"title": "Saltmarsh test"}  # the same for both here
    assert meta["notes"] == ["a note"]
    own = {"one": {"certificate": tables[0].meta["certificate"]}, "two": {"certificate": "another"}}
    assert meta["scenarios"] == own


def test_differences(histories):
    table = difference_table(joined_table([evolution_table(history) for history in histories], ["one", "two"]))
    assert table.colnames[:3] == ["scenario", "wavenumber", "redshift"]
    assert set(table["scenario"]) == {"two"}
    assert table["delta_dark_difference"].tolist() == pytest.approx([0.1, 0.1, -0.5, -0.5], rel=1e-13)
    assert table["delta_baryon_difference"].tolist() == pytest.approx([-4 / 15] * 2 + [-0.5] * 2, rel=1e-13)
    # 0.66/1.1 less 0.9, and 0.9 less 0.9.
    assert table["ratio_difference"].tolist() == pytest.approx([-0.3, -0.3, 0, 0], rel=1e-13, abs=1e-15)
    assert {name for name in table.colnames if name not in QUANTITIES} == set()


@pytest.mark.parametrize("bare", [0, 1])
def test_without_dark_matter_only_the_baryons_are_compared(make_history, curves, bare):
    histories = [
        make_history([curves.power(1)], [curves.power(1)], has_dark_matter=number != bare) for number in range(2)
    ]
    table = joined_table([evolution_table(history) for history in histories], ["one", "two"])
    assert table["delta_dark"].mask.tolist() == [bare == 0] * 2 + [bare == 1] * 2
    assert table["delta_dark_over_first"].mask[2:].all()
    differences = difference_table(table)
    assert differences["delta_dark_difference"].mask.all()
    assert differences["ratio_difference"].mask.all()
    assert differences["delta_baryon_difference"].tolist() == [0, 0]
    lag = joined_table([lag_table(history) for history in histories], ["one", "two"])
    assert lag["ratio_over_first"].mask[2:].all()
    assert "no dark matter" in lag.meta["scenarios"][["one", "two"][bare]]["no_dark_matter"]


def test_the_course_tells_every_step_from_its_start_on(histories):
    table = course_table(histories[0], 1)
    assert (np.diff(table["redshift"]) < 0).all()
    assert 2900 < table["redshift"][0] <= 3000
    assert table["redshift"][-1] == 0
    # delta_b = 1.8 a in the second mode.
    assert table["delta_baryon"] * (1 + table["redshift"]) == pytest.approx(np.full(len(table), 1.8), rel=1e-13)


def test_reading_back_gives_the_same_table_in_one_line(histories):
    table = joined_table([lag_table(history) for history in histories], ["no dark matter", "two"], ["a note"])
    again = Table.read(io.BytesIO(table_bytes(table)), format="ascii.ecsv")
    assert again[again["scenario"] == "no dark matter"]["ratio"].tolist() == pytest.approx([0.9] * 4, rel=1e-14)
    assert again.colnames == table.colnames
    for name in table.colnames:
        assert again[name].description == table[name].description
        assert np.ma.allequal(np.ma.asarray(again[name]), np.ma.asarray(table[name]))  # every bit
