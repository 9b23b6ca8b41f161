"""What the tables look like on disk, and that every column stands in the nomenclature."""

import io

import numpy as np
import pytest
from astropy.table import Table
from astropy.units import Unit

from twofluid import __version__
from twofluid.files import table_bytes
from twofluid.products import catchup_table, evolution_table, lag_table
from twofluid.quantities import QUANTITIES, nomenclature_markdown

MAKERS = [evolution_table, lag_table, catchup_table]


@pytest.fixture
def history(make_history, curves):
    # The second mode never gets to its half; the third has always been there.
    return make_history(
        [curves.power(1)] * 3,
        [curves.power(1.05, 0.9), curves.power(1, -0.25), curves.power(1)],
        redshift=[9.0, 0.0],
    )


def header_of(table):
    lines = table_bytes(table).decode().splitlines()
    return [line for line in lines if line.startswith("# ")]


def test_lag_file_has_exactly_this_header(history):
    assert header_of(lag_table(history)) == [
        "# %ECSV 1.0",
        "# ---",
        "# datatype:",
        "# - {name: wavenumber, unit: 1 / Mpc, datatype: float64, description: comoving wavenumber}",
        "# - {name: redshift, datatype: float64, description: redshift}",
        "# - {name: ratio, datatype: float64, description: 'baryon over dark-matter density contrast; "
        "empty: no dark matter'}",
        "# - {name: delay, unit: Myr, datatype: float64, description: "
        "'time since the dark matter last had the amplitude the baryons have at this",
        "#     redshift; empty: it never had it, or the baryons are not behind'}",
        "# meta: !!omap",
        f"# - {{program: twofluid {__version__}}}",
        "# - scenario: {title: Saltmarsh test}",
        "# - assumed: [primordial.tilt = 0.965]",
        "# - {closure: kinetic}",
        "# - {frame: 'synchronous, at rest with the dark matter (without dark matter: "
        "carried by massless dust); amplitudes per unit comoving curvature,",
        "#     signed so that densities grow positive'}",
        "# - landmarks: {drag_redshift: 1060.12, drag_sound_horizon: 147.05 Mpc}",
        "# - {certificate: 'none: the numerical error of this run was not estimated'}",
        "# - warnings: [a sentence of warning]",
        "# schema: astropy-2.0",
    ]


def test_catchup_rows_on_disk(history):
    rows = table_bytes(catchup_table(history, [0.5])).decode().splitlines()[-4:]
    assert rows[0] == "wavenumber redshift_at_50_percent ratio_today"
    assert [row.split(" ")[1] for row in rows[2:]] == ['""', "inf"]


@pytest.mark.parametrize("make", MAKERS)
def test_reading_back_gives_the_same_table(history, make):
    table = make(history)
    again = Table.read(io.BytesIO(table_bytes(table)), format="ascii.ecsv")
    assert again.colnames == table.colnames
    for name in table.colnames:
        assert again[name].unit == table[name].unit
        assert again[name].description == table[name].description
        assert np.array_equal(np.ma.getmaskarray(np.ma.asarray(again[name])), masked_in(table, name))
        assert np.ma.allequal(np.ma.asarray(again[name]), np.ma.asarray(table[name]))  # every bit
    assert dict(again.meta) == table.meta


def masked_in(table, name):
    return np.ma.getmaskarray(np.ma.asarray(table[name]))


@pytest.mark.parametrize("make", MAKERS)
def test_every_column_stands_in_the_nomenclature(history, make):
    table = make(history)
    for name in table.colnames:
        key = "redshift_at_N_percent" if name.startswith("redshift_at_") else name
        assert table[name].unit == (Unit(QUANTITIES[key].unit) if QUANTITIES[key].unit else None)
        assert table[name].description


def test_every_landmark_stands_in_the_nomenclature():
    from dataclasses import fields

    from twofluid.universe import Landmarks

    assert {part.name for part in fields(Landmarks)} <= set(QUANTITIES)


def test_evolution_holds_the_amplitudes(history):
    table = evolution_table(history)
    assert table.colnames == [
        "wavenumber", "redshift", "delta_dark", "delta_baryon", "theta_baryon", "delta_gas_temperature",
        "delta_matter",
    ]  # fmt: skip
    assert str(table["theta_baryon"].unit) == "1 / Mpc"
    row = table[(table["wavenumber"] == 2) & (table["redshift"] == 9)]
    # delta_c = a and delta_b = -a/4 at a = 1/10.
    assert row["delta_dark"][0] == pytest.approx(0.1, rel=1e-14)
    assert row["delta_baryon"][0] == pytest.approx(-0.025, rel=1e-14)
    assert row["theta_baryon"][0] == pytest.approx(0.025, rel=1e-14)
    assert row["delta_gas_temperature"][0] == pytest.approx(-0.0125, rel=1e-14)


def test_evolution_without_dark_matter_leaves_out_the_dust_of_the_frame(make_history, curves):
    table = evolution_table(make_history([curves.power(1)], [curves.power(1)], has_dark_matter=False))
    assert table["delta_dark"].mask.all()
    assert not np.ma.is_masked(table["delta_baryon"])


def test_nomenclature_names_each_quantity_once():
    lines = nomenclature_markdown().splitlines()
    names = [line.split("`")[1] for line in lines[2:]]
    assert names == list(QUANTITIES)
    assert "| `delay` | $\\Delta t$ | Myr | " in nomenclature_markdown()


@pytest.mark.parametrize("name", QUANTITIES)
def test_units_can_be_read_and_symbols_printed(name):
    quantity = QUANTITIES[name]
    Unit(quantity.unit)  # raises ValueError for what is no unit
    assert quantity.name == name
    assert quantity.plain_symbol.isascii()
    assert not set(quantity.plain_symbol) & set("\\{}$")
