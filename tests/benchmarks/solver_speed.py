"""How fast the solver is: against a general stiff solver, by number of modes, by wavenumber, and above the floor.

Run by hand on one core: ``OMP_NUM_THREADS=1 python tests/benchmarks/solver_speed.py``. All figures of one run are
measured side by side; quote their ratios, not the seconds of a noisy machine.
"""

import resource
import time
import warnings

import numpy as np
from scipy.integrate import solve_ivp

from twofluid import evolve, evolve_many
from twofluid.evolution import _request
from twofluid.fluids import KineticSystem, resolution_for, start_time
from twofluid.scenario import Cosmology, Primordial, Sampling, Scenario
from twofluid.solver import Elimination, blocks, rate_matrix
from twofluid.solver.blocks import FULL
from twofluid.universe import Universe, build_universes

REPEATS = 5
COSMOLOGY = Cosmology(67.5, 0.0223, 0.1195)  # Saltmarsh
MANY, ONE = (np.geomspace(1e-3, 1e3, count) for count in (64, 512))  # wavenumbers of many universes, and of one
LONGEST_GENERAL_RUN = 120.0  # [s] beyond which a general solver is given up


def scenario(cosmology=COSMOLOGY):
    """Return a request for this universe."""
    return Scenario("Saltmarsh benchmark", cosmology, Primordial(), Sampling((0.1,), (0.0,)))


def best(function, repeats=REPEATS):
    """Return the shortest of several processor times [s]."""
    times = []
    for _ in range(repeats):
        start = time.process_time()
        function()
        times.append(time.process_time() - start)
    return min(times)


def ratio(first, second, repeats=REPEATS):
    """Return the shortest time of one function over that of another, measured in turns on a noisy machine."""
    pairs = [(best(first, 1), best(second, 1)) for _ in range(repeats)]
    return min(one for one, _ in pairs) / min(other for _, other in pairs)


def run(wavenumbers, universe):
    """Return a run to z = 0 as a function, the smooth universe being there."""
    return lambda: evolve(scenario(), wavenumbers=wavenumbers, redshifts=[0.0], universe=universe)


def ours(wavenumbers, universe, repeats=REPEATS):
    """Return the time of a run to z = 0, the smooth universe being there [s]."""
    return best(run(wavenumbers, universe), repeats)


def general(universe, k, method):
    """Solve one mode of the same equations with a general solver: time [s], relative error of delta_dark."""
    resolution = resolution_for(universe)
    system = KineticSystem(universe, np.array([k]), resolution.chains)
    start = start_time(universe, system.wavenumber)
    began = time.process_time()

    class TooLongError(Exception):
        pass

    def matrix(log_time):
        if time.process_time() - began > LONGEST_GENERAL_RUN:
            raise TooLongError
        return np.exp(log_time) * rate_matrix(system, 0, np.exp(log_time))

    first = system.first_state(start)[:, 0]
    span = np.log([start[0], universe.conformal_time(1.0)])
    try:
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")  # a solver that gives up is told by its flag
            solution = solve_ivp(
                lambda t, y: matrix(t) @ y, span, first, method=method, rtol=1e-6, atol=1e-13,
                jac=lambda t, y: matrix(t),
            )
    except TooLongError:
        return LONGEST_GENERAL_RUN, np.nan
    elapsed = time.process_time() - began
    if not solution.success:
        return np.nan, np.nan
    finest = evolve(
        scenario(), wavenumbers=[k], redshifts=[0.0], universe=universe, resolution=resolution.refined().refined()
    )
    return elapsed, solution.y[system.unknowns.index("delta_dark"), -1] / finest.delta_dark[0, 0] - 1.0


def against_general_solvers(universe):
    """Print our time per mode against two general solvers."""
    wavenumbers = np.geomspace(1e-4, 1e4, 256)
    per_mode = ours(wavenumbers, universe) / len(wavenumbers)
    print(f"\n256 modes, 1e-4 to 1e4/Mpc: {1e3 * per_mode:.2f} ms a mode\n")
    print("| k [1/Mpc] | solver | time over ours per mode | error of its delta_dark | error of ours |")
    print("| --- | --- | --- | --- | --- |")
    for k in (0.01, 0.1, 1.0, 10.0):
        resolution = resolution_for(universe)
        pair = [
            evolve(scenario(), wavenumbers=[k], redshifts=[0.0], universe=universe, resolution=r).delta_dark[0, 0]
            for r in (resolution, resolution.refined().refined())
        ]
        for method in ("BDF", "LSODA"):
            elapsed, error = general(universe, k, method)
            own = abs(pair[0] / pair[1] - 1)
            ratio = "gives up" if np.isnan(elapsed) else f"{elapsed / per_mode:.0f}"
            if elapsed == LONGEST_GENERAL_RUN:
                ratio = f"stopped at {ratio}"
            print(f"| {k:g} | {method} | {ratio} | {abs(error):.0e} | {own:.0e} |", flush=True)


def scaling(universe):
    """Print how the time grows with the number of modes and with the wavenumber."""
    all_scales = run(np.geomspace(1e-4, 1e4, 256), universe)
    print(f"\n256 modes take {best(all_scales):.2f} s here; the same with other numbers and wavenumbers:\n")
    print("| modes | wavenumbers [1/Mpc] | time over that of 256 modes | a mode over a mode |")
    print("| --- | --- | --- | --- |")
    for count in (16, 64, 1024, 2048):
        over = ratio(run(np.geomspace(1e-4, 1e4, count), universe), all_scales)
        print(f"| {count} | 0.0001 to 10000 | {over:.2f} | {over * 256 / count:.2f} |")
    acoustic, smallest = (run(k * np.geomspace(0.999, 1.001, 256), universe) for k in (0.1, 1e4))
    for name, one in (("0.1", acoustic), ("10000", smallest)):
        over = ratio(one, all_scales)
        print(f"| 256 | all at {name} | {over:.2f} | {over:.2f} |")
    print(f"\na mode at 10000/Mpc over one at 0.1/Mpc: {ratio(smallest, acoustic, 3 * REPEATS):.2f}")
    print(f"\nlargest memory so far: {resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024:.0f} MB")


def many_universes():
    """Print what stacking universes costs."""
    cosmologies = [Cosmology(67.5, 0.0223 * (1 + 0.001 * n), 0.1195 * (1 - 0.0005 * n)) for n in range(200)]
    requests = [scenario(cosmology) for cosmology in cosmologies]
    eight = build_universes(cosmologies[:8])
    print("\n| eight universes of 64 modes over one of 512 | |\n| --- | --- |")
    for label, one, many in (("universes there", eight[0], eight), ("universes built as well", None, None)):
        over = ratio(
            lambda many=many: evolve_many(requests[:8], wavenumbers=MANY, redshifts=[0.0], universes=many),
            lambda one=one: evolve(requests[0], wavenumbers=ONE, redshifts=[0.0], universe=one),
            2 * REPEATS,
        )
        print(f"| {label} | {over:.2f} |")
    alone = best(lambda: complete(Universe(COSMOLOGY)))
    together = best(lambda: [complete(universe) for universe in build_universes(cosmologies)], 1) / len(cosmologies)
    print(f"\na universe with landmarks and tables: {1e3 * alone:.0f} ms, {1e3 * together:.0f} ms each of 200")
    start = time.process_time()
    evolve_many(requests, wavenumbers=MANY, redshifts=[0.0])
    print(f"200 universes of 64 modes: {time.process_time() - start:.1f} s")


def complete(universe):
    """Work out landmarks and tables of a universe."""
    return universe.landmarks, universe.conditions(1.0)


def operations(elimination, lanes):
    """Count multiplications and additions a step and mode, in elimination and substitution."""
    count = 0
    for call, _, kinds, out in elimination.program.bind(lanes).calls:
        size = out.size // lanes
        if isinstance(call, blocks.PivotInverse):
            count += 51
        elif call is blocks.multiply:
            count += 45 if kinds[0] == kinds[1] == FULL else size
        elif call is blocks.add:
            count += 9 if kinds[0] == kinds[1] == FULL else 3
        elif call is blocks.start_alone:
            count += 15
    for pivot in elimination.pivots:
        blocks_beside = [*pivot.below, *(pivot.right if pivot.leaf else pivot.response)]
        if pivot.leaf:
            count += 6 * len(blocks_beside)
        else:
            count += 15 + sum(18 if elimination.kind(block) == FULL else 6 for block in blocks_beside)
    for family in elimination.families:
        size = family.kind.size  # complex coordinates: polynomials, their quotients, and what is made of the state
        count += len(family.factors.blocks) * (220 + 160 * size) + len(family.tails) * 32 * size
    return count


def floor(universe):
    """Print how far the integration is above what this core does on plain arrays."""
    wavenumbers = np.geomspace(1e-4, 1e4, 256)
    request = _request(scenario(), universe, wavenumbers, [0.0], None)
    system = request.system
    tau = np.full((3, 256), 1.0)
    rates = system.step_rates(np.arange(256), tau, np.full(256, 0.1))
    tails = sum(len(tail.rows) for tail in system.tails)
    elimination = Elimination(len(system.unknowns) - tails, rates, system.tails)
    flops = operations(elimination, 256)
    lanes = evolve(scenario(), wavenumbers=wavenumbers, redshifts=[0.0], universe=universe).counts["lanes"]
    x, y, out = np.random.default_rng(1).normal(size=(3, 9, 1024))

    def kernel():
        for _ in range(2000):
            np.multiply(x, y, out=out)
            np.add(out, x, out=out)

    rate = 2 * 2000 * x.size / best(kernel)
    elapsed = ours(wavenumbers, universe)
    print(f"\n{flops} operations a step and mode, {lanes} steps and modes: {1e-9 * flops * lanes:.2f} Gflop")
    print(f"plain arrays on this core: {1e-9 * rate:.2f} Gflop/s, so the floor is {flops * lanes / rate:.3f} s")
    print(f"the run takes {elapsed:.3f} s, {elapsed * rate / (flops * lanes):.1f} times the floor")


def main():
    """Print everything."""
    universe = Universe(COSMOLOGY)
    universe.conditions(1.0)
    against_general_solvers(universe)
    scaling(universe)
    many_universes()
    floor(universe)


if __name__ == "__main__":
    main()
