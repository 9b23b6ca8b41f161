"""One valid scenario with every key on a line of its own, and ways to spoil it."""

import pytest

from twofluid.scenario import ScenarioError, parse_scenario

VALUES = {
    "title": "Saltmarsh test",
    "cosmology": "",
    "cosmology.hubble_constant": "67.5 km/(s Mpc)",
    "cosmology.baryon_density": "0.0223",
    "cosmology.dark_matter_density": "0.1195",
    "cosmology.photon_temperature": "2.7 K",
    "cosmology.helium_mass_fraction": "0.25",
    "cosmology.curvature_fraction": "0.01",
    "cosmology.cosmological_constant_fraction": "0.7",
    "cosmology.neutrinos": "",
    "cosmology.neutrinos.effective_number": "3",
    "cosmology.neutrinos.masses": "[]",
    "cosmology.dark_matter": "",
    "cosmology.dark_matter.sound_speed": "0.002 km/s",
    "cosmology.dark_matter.at_redshift": "100",
    "cosmology.dark_matter.scaling": "0.5",
    "thermal": "",
    "thermal.table": "",
    "thermal.table.redshift": "[0, 0.6, 1.5, 3, 5.5, 9, 14, 21, 33]",
    "thermal.table.gas_temperature": "[8e3 K, 9e3 K, 1e4 K, 1e4 K, 9e3 K, 500 K, 60 K, 15 K, 22 K]",
    "thermal.table.electron_fraction": "[1, 1, 1, 1, 0.9, 0.1, 0.01, 5e-4, 2e-4]",
    "thermal.below_redshift": "30",
    "thermal.joining_width": "0.2",
    "reionization": "",
    "reionization.redshift": "7.7",
    "reionization.width": "0.6",
    "reionization.gas_temperature": "12000 K",
    "primordial": "",
    "primordial.amplitude": "2e-9",
    "primordial.tilt": "0.96",
    "primordial.pivot": "0.002 1/Mpc",
    "primordial.mixture": "",
    "primordial.mixture.adiabatic": "0.5",
    "primordial.mixture.baryon": "",
    "primordial.mixture.baryon.ratio": "0",
    "primordial.mixture.baryon.correlation": "-0.5",
    "primordial.mixture.baryon.tilt": "0.9",
    "primordial.mixture.dark_matter": "",
    "primordial.mixture.dark_matter.ratio": "0",
    "primordial.mixture.dark_matter.correlation": "-0.25",
    "primordial.mixture.dark_matter.tilt": "1",
    "primordial.mixture.neutrino_density": "",
    "primordial.mixture.neutrino_density.ratio": "0",
    "primordial.mixture.neutrino_density.correlation": "0",
    "primordial.mixture.neutrino_density.tilt": "1.1",
    "primordial.mixture.neutrino_velocity": "",
    "primordial.mixture.neutrino_velocity.ratio": "0",
    "primordial.mixture.neutrino_velocity.correlation": "0.25",
    "primordial.mixture.neutrino_velocity.tilt": "1.2",
    "primordial.mixture.compensated": "",
    "primordial.mixture.compensated.ratio": "0",
    "primordial.mixture.compensated.correlation": "0.5",
    "primordial.mixture.compensated.tilt": "1.3",
    "sampling": "",
    "sampling.wavenumbers": "",
    "sampling.wavenumbers.from": "0.01 1/Mpc",
    "sampling.wavenumbers.to": "100 1/Mpc",
    "sampling.wavenumbers.per_decade": "5",
    "sampling.redshifts": "[1000, 100, 10]",
    "method": "",
    "method.closure": "kinetic",
    "method.accuracy": "reference",
    "method.ionization_fluctuations": "true",
    "products": "",
    "products.lag": "",
    "products.lag.fractions": "[0.5, 0.9]",
    "products.scales": "",
    "products.scales.mass_radius": "1",
    "products.scales.together": "0.95",
    "products.scales.map_from": "3e4",
    "products.growth": "",
    "products.growth.reference_redshift": "100",
    "products.spheres": "",
    "products.spheres.radii": "[1 Mpc, 3 Mpc]",
    "products.spheres.masses": "[1e6 solMass]",
    "products.shortfall": "",
    "products.shortfall.target_redshift": "7",
    "products.shortfall.radii": "[2 Mpc]",
    "products.shortfall.masses": "[1e9 solMass]",
    "products.streaming": "",
    "products.streaming.from_redshift": "900",
    "products.streaming.velocities": "[0.5, 1]",
}

NO_PRODUCTS = dict.fromkeys(path for path in VALUES if path.startswith("products."))  # as changes: all lines left out

NO_MIXTURE = dict.fromkeys(path for path in VALUES if path.startswith("primordial.mixture"))


def full_text(changes=None, names=None):
    """Write the scenario, some values or names changed; a value of None leaves the line out."""
    changes, names = changes or {}, names or {}
    lines = []
    for path, value in VALUES.items():
        spoilt = changes.get(path, value)
        if spoilt is not None:
            name = names.get(path, path.rpartition(".")[2])
            lines.append(f"{'  ' * path.count('.')}{name}: {spoilt}")
    return "\n".join(lines) + "\n"


def wavenumber_text(value):
    """Write the scenario with other wavenumbers, on one line."""
    parts = dict.fromkeys(path for path in VALUES if path.startswith("sampling.wavenumbers."))
    return full_text({"sampling.wavenumbers": value, **parts})


def line_of(path):
    """Return the line of a key, counted from 1."""
    return list(VALUES).index(path) + 1


def refusal(text, name="box.yaml"):
    """Return the error that the text causes."""
    with pytest.raises(ScenarioError) as caught:
        parse_scenario(text, name=name)
    return caught.value
