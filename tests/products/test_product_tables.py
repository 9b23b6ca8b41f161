"""What the tables of growth, spheres and shortfall look like on disk, and that each column is described."""

import io

import numpy as np
import pytest
from astropy.table import Table
from astropy.units import Unit

from twofluid import evolve
from twofluid.files import table_bytes
from twofluid.products import contrast_table, growth_table, shortfall_table, spheres_table
from twofluid.quantities import QUANTITIES

MAKERS = [
    growth_table,
    contrast_table,
    lambda run: spheres_table(run, radii=[1.0, 400.0]),  # the second is not covered
    lambda run: shortfall_table(run, radii=[1.0, 400.0]),
]


@pytest.fixture(scope="module")
def small(scenario_with):
    return evolve(scenario_with(), wavenumbers=np.geomspace(0.05, 20.0, 30), redshifts=[20.0, 1000.0])


def empty(table, name):
    return np.ma.getmaskarray(np.ma.asarray(table[name]))


@pytest.mark.parametrize("make", MAKERS)
def test_reading_back_gives_the_same_table(small, make):
    table = make(small)
    again = Table.read(io.BytesIO(table_bytes(table)), format="ascii.ecsv")
    assert again.colnames == table.colnames
    for name in table.colnames:
        assert again[name].unit == table[name].unit
        assert again[name].description == table[name].description
        assert np.array_equal(empty(again, name), empty(table, name))
        assert np.all(np.ma.asarray(again[name] == table[name]).compressed())  # every bit
    assert dict(again.meta) == table.meta


@pytest.mark.parametrize("make", MAKERS)
def test_every_column_stands_in_the_nomenclature(small, make):
    table = make(small)
    for name in table.colnames:
        unit = QUANTITIES[name].unit
        assert table[name].unit == (Unit(unit) if unit else None)
        assert table[name].description == QUANTITIES[name].meaning


def test_rows_of_the_shortfall_on_disk(small):
    lines = table_bytes(shortfall_table(small, radii=[1.0])).decode().splitlines()
    rows = [line.split(" ") for line in lines if not line.startswith("#")]
    assert rows[0][:6] == ["wavenumber", "sphere_radius", "sphere_mass", "fluid", "rms_at_decoupling", "rms_needed"]
    assert rows[1][1:4] == ['""', '""', "dark"]
    assert rows[-1][0] == '""'
    assert rows[-1][3] == "matter"
    header = [line for line in lines if line.startswith("# ")]
    assert "# - {target_redshift: 7.5}" in header
    assert "# - {name: unity_age, unit: Gyr, datatype: float64, description: age of the universe when the rms " \
        "first reaches 1}" in header  # fmt: skip
    assert "# - {name: fluid, datatype: string, description: 'dark matter, baryons, or matter: all that has mass, " \
        "weighted by it'}" in header  # fmt: skip
