"""What a valid scenario reads as."""

import pytest
from astropy import units
from scenario_texts import NO_MIXTURE, NO_PRODUCTS, VALUES, full_text, wavenumber_text

from twofluid.scenario import (
    Cosmology,
    DarkMatter,
    Method,
    Mixture,
    Neutrinos,
    Primordial,
    Reionization,
    Sampling,
    Scenario,
    Share,
    ThermalTable,
    parse_scenario,
    values,
)
from twofluid.scenario.keys import GAS_SECTIONS

MINIMAL = """
cosmology: {hubble_constant: 70 km/(s Mpc), baryon_density: 0.02, dark_matter_density: 0.1}
sampling: {wavenumbers: 0.1 1/Mpc, redshifts: [20]}
"""


def reread(changes):
    return parse_scenario(full_text(changes))


def test_every_key_reaches_its_field():
    scenario = parse_scenario(full_text())
    wavenumbers = scenario.sampling.wavenumbers
    assert scenario == Scenario(
        title="Saltmarsh test",
        cosmology=Cosmology(
            hubble_constant=67.5,
            baryon_density=0.0223,
            dark_matter_density=0.1195,
            photon_temperature=2.7,
            helium_mass_fraction=0.25,
            neutrinos=Neutrinos(effective_number=3.0, masses=()),
            curvature_fraction=0.01,
            cosmological_constant_fraction=0.7,
            thermal=ThermalTable(
                redshift=(0.0, 0.6, 1.5, 3.0, 5.5, 9.0, 14.0, 21.0, 33.0),
                gas_temperature=(8e3, 9e3, 1e4, 1e4, 9e3, 500.0, 60.0, 15.0, 22.0),
                electron_fraction=(1.0, 1.0, 1.0, 1.0, 0.9, 0.1, 0.01, 5e-4, 2e-4),
                below_redshift=30.0,
                joining_width=0.2,
            ),
            reionization=Reionization(redshift=7.7, width=0.6, gas_temperature=12000.0),
            dark_matter=DarkMatter(sound_speed=0.002, at_redshift=100.0, scaling=0.5),
        ),
        primordial=Primordial(
            amplitude=2e-9,
            tilt=0.96,
            pivot=0.002,
            mixture=Mixture(
                adiabatic=0.5,
                baryon=Share(0.0, correlation=-0.5, tilt=0.9),
                dark_matter=Share(0.0, correlation=-0.25, tilt=1.0),
                neutrino_density=Share(0.0, correlation=0.0, tilt=1.1),
                neutrino_velocity=Share(0.0, correlation=0.25, tilt=1.2),
                compensated=Share(0.0, correlation=0.5, tilt=1.3),
            ),
        ),
        sampling=Sampling(wavenumbers=wavenumbers, redshifts=(1000.0, 100.0, 10.0)),
        products={
            "lag": {"fractions": (0.5, 0.9)},
            "scales": {"mass_radius": 1.0, "together": 0.95, "map_from": 3e4},
            "growth": {"reference_redshift": 100.0},
            "spheres": {"radii": (1.0, 3.0), "masses": (1e6,)},
            "shortfall": {"target_redshift": 7.0, "radii": (2.0,), "masses": (1e9,)},
            "streaming": {"from_redshift": 900.0, "velocities": (0.5, 1.0)},
        },
        method=Method("kinetic", "reference", True),
    )
    assert len(wavenumbers) == 21  # four decades, five points each, both ends
    assert scenario.assumed == ()
    assert scenario.source is None


def test_defaults_fill_what_is_left_out_and_are_named():
    scenario = parse_scenario(MINIMAL)
    cosmology = scenario.cosmology
    assert scenario.title == "untitled"
    assert (cosmology.photon_temperature, cosmology.helium_mass_fraction) == (2.7255, 0.2454)
    assert cosmology.neutrinos == Neutrinos(3.046, ())
    assert cosmology.dark_matter == DarkMatter(0.0, 0.0, 1.0)
    assert cosmology.curvature_fraction is None
    assert cosmology.cosmological_constant_fraction is None
    assert scenario.primordial == Primordial(2.1e-9, 0.965, 0.05)
    assert scenario.products == {"lag": {"fractions": (0.5, 0.9, 0.95, 0.99)}}
    required = {
        "cosmology.hubble_constant",
        "cosmology.baryon_density",
        "cosmology.dark_matter_density",
        "sampling.redshifts",
    }
    not_made = set(NO_PRODUCTS) - {"products.lag.fractions"}
    leaves = {path for path, value in VALUES.items() if value} - required - not_made - set(NO_MIXTURE)
    leaves = {path for path in leaves if not path.startswith(tuple(GAS_SECTIONS))} | set(GAS_SECTIONS)
    assert set(scenario.assumed) == {path for path in leaves if "wavenumbers" not in path}
    assert len(scenario.assumed) == len(set(scenario.assumed))


def test_assumptions_say_the_values():
    lines = parse_scenario(MINIMAL).assumptions()
    assert "title = untitled" in lines
    assert "cosmology.photon_temperature = 2.7255 K" in lines
    assert "cosmology.neutrinos.masses = []" in lines
    assert "products.lag.fractions = [0.5, 0.9, 0.95, 0.99]" in lines
    assert any(line.startswith("cosmology.curvature_fraction = 0 (flat)") for line in lines)
    assert not any("None" in line for line in lines)


def test_one_key_left_out_is_the_only_assumption():
    assert reread({"cosmology.photon_temperature": None}).assumed == ("cosmology.photon_temperature",)


def test_dataclass_defaults_are_those_of_the_reader():
    built = Scenario(
        title="untitled",
        cosmology=Cosmology(70.0, 0.02, 0.1),
        primordial=Primordial(),
        sampling=Sampling([0.1], [20]),
    )
    assert built == parse_scenario(MINIMAL)


@pytest.mark.parametrize("empty", ["", "{}", "null", "~"])
@pytest.mark.parametrize("section", ["primordial", "cosmology.neutrinos", "products.lag"])
def test_an_empty_section_stands_at_its_defaults(section, empty):
    inner = dict.fromkeys(path for path in VALUES if path.startswith(section + "."))
    scenario = reread({section: empty, **inner})
    assert set(scenario.assumed) == set(inner) - set(NO_MIXTURE)
    written = parse_scenario(full_text()).primordial
    assert scenario.primordial == (Primordial() if section == "primordial" else written)


def test_products_may_be_none_at_all():
    scenario = reread({"products": "{}"} | NO_PRODUCTS)
    assert scenario.products == {}
    assert scenario.assumed == ()


@pytest.mark.parametrize(
    ("written", "expected"),
    [
        ("67.5 km/s/Mpc", 67.5),
        ("67.5 km s-1 Mpc-1", 67.5),
        ("67.5 km s^-1 Mpc^-1", 67.5),
        ("67.5km/(s Mpc)", 67.5),
        ('"67.5 km/(s Mpc)"', 67.5),
        ("0.0675 km/(s kpc)", 67.5),
        ("67500 m/(s Mpc)", 67.5),
        # Mpc = 3.0856775814913673e22 m exactly (IAU 2015 resolution B2), Gyr = 3.15576e16 s (Julian year)
        ("0.069 1/Gyr", 0.069 * 3.0856775814913673e19 / 3.15576e16),
    ],
)
def test_hubble_constant_in_other_units(written, expected):
    value = reread({"cosmology.hubble_constant": written}).cosmology.hubble_constant
    assert value == pytest.approx(expected, rel=1e-13)  # round-off of one multiplication


@pytest.mark.parametrize("written", ["67.5 km/(s Mpc)", "67.5 km s-1 Mpc-1", "67.5 Mpc-1 km/s"])
def test_same_unit_written_otherwise_changes_no_digit(written):
    assert reread({"cosmology.hubble_constant": written}).cosmology.hubble_constant == 67.5


@pytest.mark.parametrize(
    ("number", "unit"),
    [("0.05", "1/Mpc"), ("5e-5", "1/kpc"), ("50", "1/Gpc"), ("1.5e-8", "1/lyr"), (".05", "/Mpc")],
)
def test_wavenumber_units_agree_with_astropy(number, unit):
    expected = (float(number) * units.Unit(unit)).to_value(units.Mpc**-1)
    pivot = reread({"primordial.pivot": f"{number} {unit}"}).primordial.pivot
    assert pivot == pytest.approx(expected, rel=1e-13)


def test_radii_and_masses_in_other_units():
    spheres = reread({"products.spheres.radii": "[8 kpc]", "products.spheres.masses": "[1e6 Msun, 2e36 kg]"})
    assert spheres.products["spheres"]["radii"] == pytest.approx((0.008,), rel=1e-13)
    expected = (2e36 * units.kg).to_value(units.solMass)
    assert spheres.products["spheres"]["masses"] == pytest.approx((1e6, expected), rel=1e-13)


def test_temperature_in_millikelvin():
    cosmology = reread({"cosmology.photon_temperature": "2725.5 mK"}).cosmology
    assert cosmology.photon_temperature == pytest.approx(2.7255, rel=1e-15)  # one rounding


@pytest.mark.parametrize("written", ["2e-9", "2E-9", "2.0e-9", "+2e-9", "0.000000002", "0.2e-08"])
def test_every_usual_way_to_write_a_number(written):
    assert reread({"primordial.amplitude": written}).primordial.amplitude == 2e-9


def test_numbers_without_a_point_are_numbers():
    # YAML 1.1 resolves 1e5 to text; a scenario must not care.
    assert reread({"sampling.redshifts": "[1e5, 1000]"}).sampling.redshifts == (1e5, 1000.0)


def test_values_are_plain_floats():
    scenario = reread({"cosmology.dark_matter_density": "0", "cosmology.hubble_constant": "67.5 km/s/Mpc"})
    assert type(scenario.cosmology.dark_matter_density) is float
    assert type(scenario.cosmology.hubble_constant) is float
    sampling = scenario.sampling
    assert {type(value) for value in sampling.wavenumbers + sampling.redshifts} == {float}


def test_limits_themselves_are_allowed_also_after_conversion():
    text = wavenumber_text("[1e-7 1/kpc, 100 1/kpc]")  # the second one is 1e5 and a bit after conversion
    assert parse_scenario(text).sampling.wavenumbers == pytest.approx((1e-4, 1e5), rel=1e-12)
    assert reread({"sampling.redshifts": "[0, 1e6]"}).sampling.redshifts == (0.0, 1e6)
    assert reread({"cosmology.dark_matter_density": "0"}).cosmology.dark_matter_density == 0.0
    assert reread({"cosmology.helium_mass_fraction": "0"}).cosmology.helium_mass_fraction == 0.0


def test_lists_keep_their_order():
    assert reread({"sampling.redshifts": "[10, 1000, 20]"}).sampling.redshifts == (10.0, 1000.0, 20.0)
    text = wavenumber_text("[5 1/Mpc, 0.1 1/Mpc, 1e-3 1/kpc]")
    assert parse_scenario(text).sampling.wavenumbers == pytest.approx(
        (5.0, 0.1, 1.0), rel=1e-15
    )  # one rounding


def test_a_single_wavenumber_needs_no_list():
    assert parse_scenario(wavenumber_text("0.1 1/Mpc")).sampling.wavenumbers == (0.1,)


@pytest.mark.parametrize("title", ["Gezeiten und Größe", "'2026'", "'null'", '"true: no"', "x" * 500])
def test_titles_are_kept_as_written(title):
    assert reread({"title": title}).title == title.strip("'\"")


def test_scenarios_are_hashable_and_equal_by_content():
    first, second = parse_scenario(full_text()), parse_scenario(full_text({"primordial.amplitude": "2.0e-9"}))
    assert first == second
    assert hash(first) == hash(second)
    assert first != reread({"primordial.amplitude": "2.1e-9"})


def test_units_as_in_the_key_table_need_no_conversion(monkeypatch):
    def convert(unit, expected):
        raise AssertionError(f"{unit} to {expected}")

    # Importing astropy.units takes most of the time of reading, and these files do without it.
    monkeypatch.setattr(values, "_conversion_factor", convert)
    assert parse_scenario(full_text()).primordial.pivot == 0.002
    with pytest.raises(AssertionError, match="mK to K"):
        reread({"cosmology.photon_temperature": "2725.5 mK"})
