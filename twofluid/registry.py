"""The products: one row each. A new product is a module in products/, one in drawing/, and a row here."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass

from twofluid.drawing import growth_figure, lag_figure, shortfall_figure, spheres_figure
from twofluid.files import FIGURE_FORMATS, figure_bytes, table_bytes
from twofluid.products import (
    catchup_table,
    contrast_table,
    evolution_table,
    growth_table,
    lag_table,
    shortfall_table,
    spheres_table,
)
from twofluid.report import growth_lines, lag_lines, shortfall_lines, spheres_lines

EVOLUTION = "evolution"  # the amplitudes, written whatever products are asked for


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
    """

    tables: Mapping[str, Callable]
    figure: Callable
    summary: Callable


PRODUCTS = {
    "lag": Product(
        tables={
            "lag": lambda history, options: lag_table(history),
            "catchup": lambda history, options: catchup_table(history, **options),
        },
        figure=lag_figure,
        summary=lag_lines,
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
    names = [f"{EVOLUTION}.ecsv"]
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
    summary = []
    for name, options in scenario.products.items():
        product = PRODUCTS[name]
        tables = {stem: make(history, options) for stem, make in product.tables.items()}
        outputs |= {f"{stem}.ecsv": table_bytes(table) for stem, table in tables.items()}
        figure = product.figure(tables)
        if figure is not None:
            outputs |= {f"{name}.{form}": figure_bytes(figure, form, scenario) for form in FIGURE_FORMATS}
        summary += product.summary(tables)
    return outputs, summary
