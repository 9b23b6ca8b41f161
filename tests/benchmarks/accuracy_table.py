"""The measured error of each accuracy, as the table in DEVELOPERS.md.

Run by hand: ``python tests/benchmarks/accuracy_table.py``. Every accuracy is compared with refined
"reference" runs of very different universes; it takes some minutes. Given a number, it draws as many universes in
which there is more dark matter than a quarter, compares each accuracy with its own refined run, as the certificate
does, and prints those that break its promise, and the largest errors.
"""

import sys
import time

import numpy as np

from twofluid import evolve
from twofluid.certification import contrast_errors
from twofluid.fluids import ACCURACIES, resolution_for
from twofluid.scenario import Cosmology, Neutrinos, Primordial, Sampling, Scenario
from twofluid.universe import Universe

REDSHIFTS = np.array([1000.0, 800.0, 500.0, 200.0, 100.0, 50.0, 20.0, 10.0, 0.0])
FULL = np.concatenate([np.geomspace(1e-4, 0.02, 6), np.geomspace(0.03, 2.0, 16), np.geomspace(4.0, 1e5, 10)])
LARGE_SCALES = np.concatenate([np.geomspace(1e-4, 0.02, 6), np.geomspace(0.03, 10.0, 16)])
UNIVERSES = {
    "standard": (Cosmology(67.36, 0.02237, 0.12), FULL),
    "baryon-rich (0.06, 0.08)": (Cosmology(67.36, 0.06, 0.08), FULL),
    "half and half (0.07, 0.07)": (Cosmology(67.36, 0.07, 0.07), FULL),
    "high radiation (N_eff = 10)": (Cosmology(67.36, 0.02237, 0.12, neutrinos=Neutrinos(10.0)), FULL),
    "no dark matter": (Cosmology(67.36, 0.02237, 0.0), LARGE_SCALES),
    "baryons in its place (0.14, 0)": (Cosmology(67.36, 0.14, 0.0), LARGE_SCALES),
}


def run(cosmology, universe, wavenumbers, resolution):
    """Evolve one universe."""
    scenario = Scenario("Saltmarsh accuracy", cosmology, Primordial(), Sampling((0.1,), (0.0,)))
    return evolve(scenario, wavenumbers=wavenumbers, redshifts=REDSHIFTS, universe=universe, resolution=resolution)


def draw_cosmology(draw):
    """Draw a universe, most of them far from ours."""
    baryon, fraction = 10.0 ** draw.uniform(-2.5, -1.0), draw.uniform(0.25, 0.98)
    return Cosmology(
        hubble_constant=draw.uniform(50.0, 95.0),
        baryon_density=baryon,
        dark_matter_density=min(baryon * fraction / (1.0 - fraction), 0.4),
        photon_temperature=draw.uniform(2.0, 3.5),
        helium_mass_fraction=draw.uniform(0.0, 0.4),
        neutrinos=Neutrinos(draw.choice([0.0, 3.046, 8.0])),
    )


def survey(count):
    """Print the promises broken in universes drawn at random, and the largest errors."""
    draw, worst = np.random.default_rng(1), dict.fromkeys(ACCURACIES, (0.0, 0.0))
    for _ in range(count):
        cosmology = draw_cosmology(draw)
        universe = Universe(cosmology)
        for accuracy, settings in ACCURACIES.items():
            resolution = resolution_for(universe, accuracy)
            pair = [run(cosmology, universe, FULL, one) for one in (resolution, resolution.refined())]
            found = errors(*pair)
            worst[accuracy] = tuple(map(max, found, worst[accuracy]))
            if max(found) > settings.promise:
                print(f"{accuracy}: {found[0]:.1e}, {found[1]:.1e} in {cosmology}", flush=True)
    print("\n".join(f"{accuracy}: {dark:.1e}, ratio {ratio:.1e}" for accuracy, (dark, ratio) in worst.items()))


def errors(history, truth):
    """Return the largest errors of dark-matter contrast and of ratio, as the certificate measures them."""
    return tuple(float(error.max()) for error in contrast_errors(history, truth))


def main():
    """Print the table."""
    print("| universe | wavenumbers [1/Mpc] | accuracy | dark matter | ratio | steps a mode | time over standard |")
    print("| --- | --- | --- | --- | --- | --- | --- |")
    for name, (cosmology, wavenumbers) in UNIVERSES.items():
        universe = Universe(cosmology)
        truth = run(cosmology, universe, wavenumbers, resolution_for(universe, "reference").refined())
        rows = {}
        for accuracy in ACCURACIES:
            start = time.process_time()
            history = run(cosmology, universe, wavenumbers, resolution_for(universe, accuracy))
            elapsed = time.process_time() - start
            rows[accuracy] = (*errors(history, truth), history.counts["steps"] / len(wavenumbers), elapsed)
        for accuracy, (dark, ratio, steps, elapsed) in rows.items():
            print(
                f"| {name} | {wavenumbers[0]:g} to {wavenumbers[-1]:g} | {accuracy} | {dark:.0e} | {ratio:.0e} "
                f"| {steps:.0f} | {elapsed / rows['standard'][-1]:.1f} |",
                flush=True,
            )


if __name__ == "__main__":
    survey(int(sys.argv[1])) if sys.argv[1:] else main()
