"""The products: one row each. A new product is a module in products/, one in drawing/, and a row here."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, field

import numpy as np

from twofluid.drawing import (
    difference_figure,
    evolution_comparison_figure,
    growth_figure,
    lag_comparison_figure,
    lag_figure,
    matter_comparison_figure,
    scales_figure,
    shortfall_figure,
    spheres_figure,
    streaming_figure,
)
from twofluid.files import FIGURE_FORMATS, figure_bytes, table_bytes
from twofluid.products import (
    catchup_table,
    contrast_table,
    course_table,
    difference_table,
    evolution_table,
    growth_table,
    joined_table,
    lag_table,
    map_redshifts,
    parts_table,
    scales_table,
    shortfall_table,
    spheres_table,
    streaming_spectrum_table,
    streaming_table,
    streaming_velocity_table,
    verdict_table,
)
from twofluid.report import (
    compared_evolution_lines,
    compared_lag_lines,
    growth_lines,
    lag_lines,
    scales_lines,
    shortfall_lines,
    spheres_lines,
    streaming_lines,
)
from twofluid.scenario import parts
from twofluid.streaming import stream

EVOLUTION = "evolution"  # the amplitudes, written whatever products are asked for
PARTS = "parts"  # those of every independent part of a mixture, where there are several

COMPARISON = "comparison-{}"  # what the file names of a comparison look like


@dataclass(frozen=True)
class Product:
    """One product.

    Attributes
    ----------
    tables : mapping of str to callable
        File name without ending, and the function (history, options) -> Table that makes the table.
    figure : callable
        Function (mapping of file name to Table) -> Figure, or None where there is nothing to draw; saved
        under the name of the product.
    summary : callable
        Function (mapping of file name to Table) -> list of lines for the terminal.
    comparison_figure, comparison_summary : callable, optional
        The same for the tables of several scenarios, stacked by `joined_table`; without them the comparison
        of the product consists of its tables.
    drawn : mapping of str to callable
        As `tables`, for tables that only the figure is made from; they are not written.
    prepare : callable
        Function (history, options) -> what the tables are made from in place of the history, worked out once; for a
        product that has to solve more than the run holds.
    """

    tables: Mapping[str, Callable]
    figure: Callable
    summary: Callable
    comparison_figure: Callable | None = None
    comparison_summary: Callable | None = None
    drawn: Mapping[str, Callable] = field(default_factory=dict)
    prepare: Callable = lambda history, options: history


def _given(options, *names):
    """Return those of the named options that the scenario holds."""
    return {name: options[name] for name in names if name in options}


def _scales(history, options, redshift=None):
    return scales_table(history, redshift, **_given(options, "mass_radius"))


def _verdict(history, options, redshift=None):
    return verdict_table(history, redshift, **_given(options, "together"))


def _on_map(make):
    """Return the function that makes a table on the redshifts of the map."""
    return lambda history, options: make(history, options, map_redshifts(**_given(options, "map_from")))


PRODUCTS = {
    "lag": Product(
        tables={
            "lag": lambda history, options: lag_table(history),
            "catchup": lambda history, options: catchup_table(history, **options),
        },
        figure=lag_figure,
        summary=lag_lines,
        comparison_figure=lag_comparison_figure,
        comparison_summary=compared_lag_lines,
    ),
    "scales": Product(
        tables={"scales": _scales, "verdict": _verdict},
        figure=scales_figure,
        summary=scales_lines,
        drawn={"scales_map": _on_map(_scales), "verdict_map": _on_map(_verdict)},
    ),
    "growth": Product(
        tables={"growth": lambda history, options: growth_table(history, **options)},
        figure=growth_figure,
        summary=growth_lines,
    ),
    "spheres": Product(
        tables={"spheres": lambda history, options: spheres_table(history, **options)},
        figure=spheres_figure,
        summary=spheres_lines,
    ),
    "shortfall": Product(
        tables={
            "shortfall": lambda history, options: shortfall_table(history, **options),
            "contrast": lambda history, options: contrast_table(history),
        },
        figure=shortfall_figure,
        summary=shortfall_lines,
    ),
    "streaming": Product(
        tables={
            "streaming-velocity": lambda streaming, options: streaming_velocity_table(streaming),
            "streaming-spectrum": lambda streaming, options: streaming_spectrum_table(streaming),
            "streaming": lambda streaming, options: streaming_table(streaming),
        },
        figure=streaming_figure,
        summary=streaming_lines,
        prepare=lambda history, options: stream(history, **options),
    ),
}


def output_names(scenario):
    """Return the names of all files a run of this scenario can write.

    Parameters
    ----------
    scenario : Scenario
        The request.

    Returns
    -------
    list of str
        File names; a figure with nothing to show is not written.

    Raises
    ------
    ValueError
        If a product of that name does not exist.
    """
    independent = parts(scenario.primordial, scenario.sampling.wavenumbers)
    names = [f"{EVOLUTION}.ecsv", *([f"{PARTS}.ecsv"] if len(independent) > 1 else [])]
    return names + _product_names(scenario)


def _product_names(scenario):
    names = []
    for name in scenario.products:
        if name not in PRODUCTS:
            raise ValueError(f"products: there is no product {name!r}; there is {', '.join(PRODUCTS)}")
        names += [f"{stem}.ecsv" for stem in PRODUCTS[name].tables]
        names += [f"{name}.{form}" for form in FIGURE_FORMATS]
    return names


def make_outputs(history):
    """Make everything the scenario of a run asks for, in memory.

    Parameters
    ----------
    history : History
        The run.

    Returns
    -------
    outputs : dict of str to bytes
        Content of each file by its name.
    summary : list of str
        Lines for the terminal.
    """
    scenario = history.scenario
    outputs = {f"{EVOLUTION}.ecsv": table_bytes(evolution_table(history))}
    if len(history.parts) > 1:
        outputs[f"{PARTS}.ecsv"] = table_bytes(parts_table(history))
    summary = []
    for name, options in scenario.products.items():
        product = PRODUCTS[name]
        material = product.prepare(history, options)
        tables = {stem: make(material, options) for stem, make in product.tables.items()}
        outputs |= {f"{stem}.ecsv": table_bytes(table) for stem, table in tables.items()}
        drawn = {stem: make(material, options) for stem, make in product.drawn.items()}
        figure = product.figure(tables | drawn)
        if figure is not None:
            outputs |= {f"{name}.{form}": figure_bytes(figure, form, scenario) for form in FIGURE_FORMATS}
        summary += product.summary(tables)
    return outputs, summary


def comparison_names(alignment):
    """Return the names of all files a comparison can write.

    Parameters
    ----------
    alignment : Alignment
        What is to be compared.

    Returns
    -------
    list of str
        File names; a figure with nothing to show is not written.

    Raises
    ------
    ValueError
        If a product of that name does not exist.
    """
    figures = (EVOLUTION, "differences", *_matter_figure(alignment.scenarios), *alignment.scenarios[0].products)
    tables = (f"{EVOLUTION}.ecsv", *_product_names(alignment.scenarios[0]), "courses.ecsv", "differences.ecsv")
    names = dict.fromkeys(tables)
    names |= dict.fromkeys(f"{name}.{form}" for name in figures for form in FIGURE_FORMATS)
    return [COMPARISON.format(name) for name in names]


def _matter_figure(scenarios):
    """Return the figure that only a comparison with massive neutrinos has, by its name."""
    massive = any(any(scenario.cosmology.neutrinos.masses) for scenario in scenarios)
    return {"matter": matter_comparison_figure} if massive else {}


def comparison_tables(comparison):
    """Return the tables of a comparison, see `joined_table` for their layout.

    Parameters
    ----------
    comparison : Comparison
        The runs.

    Returns
    -------
    dict of str to astropy.table.Table
        "evolution", "courses" (one mode step by step), "differences" and every table of the common products.
    """
    histories, labels, notes = comparison.histories, comparison.labels, comparison.notes

    def joined(make, **options):
        return joined_table([make(history) for history in histories], labels, notes, **options)

    middle = int(np.argsort(histories[0].wavenumber)[histories[0].wavenumber.size // 2])
    tables = {EVOLUTION: joined(evolution_table)}
    tables["courses"] = joined(lambda history: course_table(history, middle), ratios=False)
    tables["differences"] = difference_table(tables[EVOLUTION])
    for name, options in histories[0].scenario.products.items():
        materials = [PRODUCTS[name].prepare(history, options) for history in histories]
        for stem, make in PRODUCTS[name].tables.items():
            tables[stem] = joined_table([make(material, options) for material in materials], labels, notes)
    return tables


def make_comparison(comparison):
    """Make everything a comparison consists of, in memory.

    Parameters
    ----------
    comparison : Comparison
        The runs.

    Returns
    -------
    outputs : dict of str to bytes
        Content of each file by its name.
    summary : list of str
        Lines for the terminal.
    """
    tables = comparison_tables(comparison)
    products = {name: PRODUCTS[name] for name in comparison.histories[0].scenario.products}
    scenarios = [history.scenario for history in comparison.histories]
    figures = {EVOLUTION: evolution_comparison_figure, "differences": difference_figure} | _matter_figure(scenarios)
    figures |= {name: product.comparison_figure for name, product in products.items() if product.comparison_figure}
    outputs = {COMPARISON.format(f"{stem}.ecsv"): table_bytes(table) for stem, table in tables.items()}
    for name, draw in figures.items():
        figure = draw(tables)
        if figure is not None:
            outputs |= {
                COMPARISON.format(f"{name}.{form}"): figure_bytes(figure, form, *scenarios) for form in FIGURE_FORMATS
            }
    summary = compared_evolution_lines(tables)
    for product in products.values():
        summary += product.comparison_summary(tables) if product.comparison_summary else []
    return outputs, summary
