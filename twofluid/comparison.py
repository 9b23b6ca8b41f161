"""The same wavenumbers and redshifts, and the same products, in several scenarios."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from math import isclose
from pathlib import Path

from .evolution import evolve_many
from .history import History
from .scenario import Sampling, Scenario

SAME = 1e-9  # relative: wavenumbers and redshifts closer than this count as one (units were converted)
UNCOMPARED = ("title", "sampling", "products")  # sections of a scenario that are no input of the physics


@dataclass(frozen=True)
class Alignment:
    """Scenarios made to ask for the same.

    Attributes
    ----------
    labels : tuple of str
        A name for each, all different: titles, else names of files.
    scenarios : tuple of Scenario
        The scenarios with the common sampling and the common products.
    notes : tuple of str
        Sentences that say what had to be left out.
    """

    labels: tuple[str, ...]
    scenarios: tuple[Scenario, ...]
    notes: tuple[str, ...]


@dataclass(frozen=True)
class Comparison:
    """Scenarios solved side by side; all ratios are to the first.

    Attributes
    ----------
    labels : tuple of str
        A name for each scenario.
    histories : tuple of History
        The runs, at the same wavenumbers and redshifts.
    notes : tuple of str
        Sentences that say what had to be left out.
    """

    labels: tuple[str, ...]
    histories: tuple[History, ...]
    notes: tuple[str, ...]


def align(scenarios: Sequence[Scenario]) -> Alignment:
    """Find what several scenarios have in common to ask for.

    The wavenumbers are those of the first scenario that lie within the range of every other, the redshifts
    those of the first that every other asks for too, the products those of the first that every other
    makes too, with the options of the first.

    Parameters
    ----------
    scenarios : sequence of Scenario
        Two or more.

    Returns
    -------
    Alignment

    Raises
    ------
    ValueError
        If there are fewer than two, one is given twice, or they have no wavenumber or no redshift in common.
    """
    if len(scenarios) < 2:
        raise ValueError("a comparison needs at least two scenarios")
    labels = _labels(scenarios)
    samplings = [scenario.sampling for scenario in scenarios]
    sampling = Sampling(_common_wavenumbers(labels, samplings), _common_redshifts(labels, samplings))
    products = _common_products(scenarios)
    aligned = tuple(replace(scenario, sampling=sampling, products=products) for scenario in scenarios)
    return Alignment(labels, aligned, _notes(labels[0], samplings, sampling, scenarios, products))


def compare(
    scenarios: Sequence[Scenario], *, progress: Callable[[int, int], None] | None = None
) -> Comparison:
    """Solve several scenarios at what they have in common.

    Parameters
    ----------
    scenarios : sequence of Scenario
        Two or more; the first is what the others are measured against.
    progress : callable, optional
        Called with (done, total) as the integrations advance.

    Returns
    -------
    Comparison

    Raises
    ------
    ValueError
        If they have nothing in common, see `align`.
    UniverseError
        If the smooth universe of a scenario cannot be.
    SolverFailure
        If a solution fails; names scenario, wavenumber and redshift.
    """
    alignment = align(scenarios)
    histories = evolve_many(alignment.scenarios, progress=progress)
    return Comparison(alignment.labels, tuple(histories), alignment.notes)


def input_differences(scenarios: Sequence[Scenario]) -> dict[str, tuple]:
    """Find the inputs in which scenarios differ; titles, samplings and products do not count.

    Parameters
    ----------
    scenarios : sequence of Scenario

    Returns
    -------
    dict of str to tuple
        Dotted key, and what each scenario says there: None where it is left to be filled.
    """
    inputs = [_flat({k: v for k, v in s.to_mapping().items() if k not in UNCOMPARED}) for s in scenarios]
    keys = dict.fromkeys(key for said in inputs for key in said)
    values = {key: tuple(said.get(key) for said in inputs) for key in keys}
    return {key: said for key, said in values.items() if any(value != said[0] for value in said)}


def _labels(scenarios):
    """Return titles if they tell the scenarios apart, else names of files, else their paths."""
    sources = [scenario.source or scenario.title for scenario in scenarios]
    titles = [scenario.title for scenario in scenarios]
    for labels in (titles, [Path(source).stem for source in sources], sources):
        if len(set(labels)) == len(labels):
            return tuple(labels)
    twice = next(source for number, source in enumerate(sources) if source in sources[:number])
    raise ValueError(f"{twice} is given twice; compare it with another scenario, or give each a title")


def _common_wavenumbers(labels, samplings):
    low = max(min(sampling.wavenumbers) for sampling in samplings) * (1 - SAME)
    high = min(max(sampling.wavenumbers) for sampling in samplings) * (1 + SAME)
    common = tuple(k for k in samplings[0].wavenumbers if low <= k <= high)
    if not common:
        ranges = _each(labels, [f"{min(s.wavenumbers):g} to {max(s.wavenumbers):g} 1/Mpc" for s in samplings])
        raise ValueError(f"no wavenumber of {labels[0]!r} lies within the range of every scenario: {ranges}")
    return common


def _common_redshifts(labels, samplings):
    common = tuple(
        z for z in samplings[0].redshifts
        if all(any(isclose(z, other, rel_tol=SAME) for other in s.redshifts) for s in samplings[1:])
    )  # fmt: skip
    if not common:
        asked = _each(labels, [", ".join(f"{z:g}" for z in s.redshifts[:8]) for s in samplings])
        raise ValueError(f"no redshift of {labels[0]!r} is asked for by every scenario: {asked}")
    return common


def _each(labels, texts):
    return "; ".join(f"{label!r} {text}" for label, text in zip(labels, texts, strict=True))


def _common_products(scenarios):
    first, *others = (scenario.products for scenario in scenarios)
    return {name: options for name, options in first.items() if all(name in other for other in others)}


def _notes(first, samplings, common, scenarios, products):
    """Say what the common request leaves out, and whose options hold."""
    asked, notes = samplings[0], []
    if any(sampling.wavenumbers != asked.wavenumbers for sampling in samplings):
        notes.append(
            f"{len(common.wavenumbers)} of the {len(asked.wavenumbers)} wavenumbers of {first!r} are compared: "
            "those within the range of every scenario"
        )
    if any(sampling.redshifts != asked.redshifts for sampling in samplings):
        shown = ", ".join(f"{z:g}" for z in common.redshifts)
        notes.append(f"the redshifts compared are those every scenario asks for: {shown}")
    left = sorted({name for scenario in scenarios for name in scenario.products} - set(products))
    if left:
        notes.append(f"products not every scenario asks for are left out: {', '.join(left)}")
    for name, options in products.items():
        if any(scenario.products[name] != options for scenario in scenarios):
            notes.append(f"the options of {name} are those of {first!r}")
    return tuple(notes)


def _flat(mapping, path=""):
    """Return a nested mapping as one of dotted keys."""
    flat = {}
    for name, value in mapping.items():
        flat |= _flat(value, f"{path}{name}.") if isinstance(value, dict) else {f"{path}{name}": value}
    return flat
