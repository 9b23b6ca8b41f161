"""What the terminal shows: landmarks, a short summary of each product, progress."""

from __future__ import annotations

from dataclasses import asdict

import numpy as np

from twofluid.quantities import QUANTITIES
from twofluid.scenario import thermal_sentence

SCALES_SHOWN = 5  # wavenumbers in a summary
COLUMNS_SHOWN = 6  # redshifts or fractions in a summary
SCALES_COMPARED, REDSHIFTS_COMPARED, FRACTIONS_COMPARED = 3, 3, 2  # in the summary of a comparison
FILLING_DIGIT = 1e-6  # shares of the critical density that differ by less are the same
FILLINGS = {  # keys whose value may be left to be filled, and the component that fills
    "cosmology.curvature_fraction": "curvature",
    "cosmology.cosmological_constant_fraction": "constant",
}
BAR_LENGTH = 40  # of the progress bar [characters]
LANDMARKS_IN_SUMMARY = (
    "last_scattering_redshift",
    "drag_redshift",
    "drag_sound_horizon",
    "thermal_decoupling_redshift",
)


def aligned(rows, gap="  "):
    """Return lines in which the cells of each column start at the same place.

    Parameters
    ----------
    rows : list of tuple of str
        Rows of equal length.
    gap : str
        What stands between two columns.

    Returns
    -------
    list of str
        One line a row.
    """
    widths = [max(map(len, cells)) for cells in zip(*rows, strict=True)]
    padded = [[cell.ljust(width) for cell, width in zip(row, widths, strict=True)] for row in rows]
    return [gap.join(cells).rstrip() for cells in padded]


def landmark_lines(landmarks):
    """Return the landmarks of a universe: name, symbol, value with unit, meaning.

    Parameters
    ----------
    landmarks : Landmarks
        The landmarks.

    Returns
    -------
    list of str
        One line a landmark.
    """
    rows = []
    present = {name: value for name, value in asdict(landmarks).items() if value is not None}
    for name, value in present.items():
        quantity = QUANTITIES[name]
        rows.append((name, quantity.plain_symbol, f"{value:.6g}", quantity.unit, quantity.meaning))
    return aligned(rows)


def check_lines(scenario, universe):
    """Return what `check` prints: what is asked, what was assumed, the landmarks.

    Parameters
    ----------
    scenario : Scenario
        The request.
    universe : Universe
        Its smooth universe.

    Returns
    -------
    list of str
        Lines.
    """
    assumed = scenario.assumptions()
    return [
        scenario.title,
        f"  asks for  {_request(scenario)}; {', '.join(scenario.products) or 'no products'}",
        *(f"  {'assumes' if number == 0 else '':7}   {text}" for number, text in enumerate(assumed)),
        "",
        *(f"  {line}" for line in landmark_lines(universe.landmarks)),
    ]


def run_lines(history):
    """Return the head of the summary of a run: what was solved, in which universe.

    Parameters
    ----------
    history : History
        The run.

    Returns
    -------
    list of str
        Lines.
    """
    landmarks = asdict(history.universe.landmarks)
    marks = [
        f"{QUANTITIES[name].plain_symbol} = {landmarks[name]:.6g} {QUANTITIES[name].unit}".rstrip()
        for name in LANDMARKS_IN_SUMMARY
    ]
    lines = [history.scenario.title, f"  {_request(history.scenario)}", f"  {', '.join(marks)}"]
    if sentence := thermal_sentence(history.scenario.cosmology):
        lines.append(f"  {sentence}")
    if history.certificate is not None:
        lines += [f"  {part}" for part in history.certificate.sentence().split("; ", maxsplit=2)]
    return lines


def lag_lines(tables):
    """Return the summary of the lag: ratio and redshift of catching up at a few scales.

    Parameters
    ----------
    tables : mapping of str to astropy.table.Table
        The tables of the product, under "lag" and "catchup".

    Returns
    -------
    list of str
        Lines.
    """
    lag, catchup = tables["lag"], tables["catchup"]
    if np.all(np.ma.getmaskarray(np.ma.asarray(lag["ratio"]))):
        return [f"  lag: {lag.meta['no_dark_matter']}"]
    modes = _few(len(catchup), SCALES_SHOWN)
    wavenumbers = [f"{catchup['wavenumber'][mode]:.4g}" for mode in modes]
    redshifts = np.asarray(lag["redshift"]).reshape(len(catchup), -1)[0]
    ratio = np.ma.asarray(lag["ratio"]).reshape(len(catchup), -1)
    unit = QUANTITIES["wavenumber"].unit
    shown = _few(len(redshifts), COLUMNS_SHOWN)
    ratio_rows = [("  ratio", *(f"z = {redshifts[i]:g}" for i in shown))]
    ratio_rows += [
        (f"    k = {k} {unit}", *(f"{ratio[mode, i]:.4f}" for i in shown))
        for k, mode in zip(wavenumbers, modes, strict=True)
    ]
    fractions = list(catchup.meta["fractions"].items())
    fractions = [fractions[i] for i in _few(len(fractions), COLUMNS_SHOWN)]
    catchup_rows = [("  caught up at redshift", *(f"{100 * fraction:g} %" for _, fraction in fractions))]
    catchup_rows += [
        (f"    k = {k} {unit}", *(_redshift_text(catchup[name][mode]) for name, _ in fractions))
        for k, mode in zip(wavenumbers, modes, strict=True)
    ]
    return aligned(ratio_rows) + aligned(catchup_rows)


def scales_lines(tables):
    """Return the summary of the scales: masses at a few redshifts, and the verdict on a few wavenumbers.

    Parameters
    ----------
    tables : mapping of str to astropy.table.Table
        The tables of the product, under "scales" and "verdict".

    Returns
    -------
    list of str
        Lines; a dash where there is no value.
    """
    scales, verdict = tables["scales"], tables["verdict"]
    shown = _few(len(scales), COLUMNS_SHOWN)
    redshifts = [f"z = {scales['redshift'][i]:g}" for i in shown]
    mass_rows = [(f"  mass [{QUANTITIES['jeans_mass'].unit}]", *redshifts)]
    mass_rows += [
        (f"    {words}", *(_dash_or(scales[name][i], "{:.3g}") for i in shown))
        for words, name in (("Jeans", "jeans_mass"), ("filtering", "filtering_mass_two_fluids"))
    ]
    words = np.ma.asarray(verdict["verdict"]).reshape(-1, len(scales))
    wavenumbers = np.asarray(verdict["wavenumber"]).reshape(-1, len(scales))[:, 0]
    verdict_rows = [("  verdict", *redshifts)]
    verdict_rows += [
        (f"    k = {wavenumbers[mode]:.4g} {QUANTITIES['wavenumber'].unit}",
         *(_dash_or(words[mode, i], "{}").split()[0] for i in shown))
        for mode in _few(len(wavenumbers), SCALES_SHOWN)
    ]  # fmt: skip
    agrees = np.ma.asarray(verdict["agrees_with_jeans"])
    agreement = f"  the Jeans criterion agrees with {np.ma.filled(agrees, False).sum()} of {agrees.count()} verdicts"
    return [*aligned(mass_rows), *aligned(verdict_rows), agreement]


def comparison_lines(comparison):
    """Return the head of the summary of a comparison: the scenarios, and what differs in what was put in.

    Parameters
    ----------
    comparison : Comparison
        The runs.

    Returns
    -------
    list of str
        Lines.
    """
    histories = comparison.histories
    sources = [history.scenario.source or "" for history in histories]
    numbered = [(f"  {number}", *names) for number, names in enumerate(zip(comparison.labels, sources, strict=True), 1)]
    return [
        f"{len(histories)} scenarios compared, every ratio to the first",
        *aligned(numbered),
        f"  {_request(histories[0].scenario)}",
        *(f"  note: {note}" for note in comparison.notes),
        *aligned([("  inputs that differ", *_numbers(len(histories))), *_input_rows(histories)]),
    ]


def compared_evolution_lines(tables):
    """Return what a comparison does to the amplitude of the baryons, at a few scales.

    Parameters
    ----------
    tables : mapping of str to astropy.table.Table
        Stacked tables, under "evolution".

    Returns
    -------
    list of str
        Lines.
    """
    return _compared_lines(tables["evolution"], "delta_baryon_over_first", "baryon contrast over the first")


def compared_lag_lines(tables):
    """Return what a comparison does to the lag: ratio and redshift of catching up at a few scales.

    Parameters
    ----------
    tables : mapping of str to astropy.table.Table
        Stacked tables of the product, under "lag" and "catchup".

    Returns
    -------
    list of str
        Lines.
    """
    catchup = tables["catchup"]
    lines = _compared_lines(tables["lag"], "ratio", "baryon over dark-matter contrast")
    fractions = list(catchup.meta["fractions"].items())
    for name, fraction in [fractions[i] for i in _few(len(fractions), FRACTIONS_COMPARED)]:
        lines += _compared_lines(catchup, name, f"caught up to {100 * fraction:g} % at redshift")
    return lines


def _input_rows(histories):
    """Return a row for each input that differs; what fills the universe is shown with its value."""
    from twofluid.comparison import input_differences

    said = input_differences([history.scenario for history in histories])
    for key, component in FILLINGS.items():
        shares = [history.universe.density_fraction(component, 1.0) for history in histories]
        if key in said or np.ptp(shares) > FILLING_DIGIT:
            given = [getattr(h.scenario.cosmology, key.rpartition(".")[2]) for h in histories]
            said[key] = [f"{share:.4g}{' (fills)' if value is None else ''}"
                         for share, value in zip(shares, given, strict=True)]  # fmt: skip
    return [(f"    {key}", *map(_short, values)) for key, values in said.items()]


def _short(value):
    """Return an input for a terminal: a dash if there is none, a long list by its ends."""
    if value is None:
        return "-"
    if isinstance(value, list) and len(value) > COLUMNS_SHOWN:
        return f"{len(value)} values, {value[0]} to {value[-1]}"
    return str(value)


def _compared_lines(table, name, heading):
    """Return a column at a few wavenumbers and redshifts, one scenario beside the other."""
    labels = list(dict.fromkeys(table["scenario"].tolist()))
    columns = [table[table["scenario"] == label] for label in labels]
    rows = [(f"  {heading}", *_numbers(len(labels)))]
    wavenumbers = np.unique(table["wavenumber"])
    for k in wavenumbers[_few(len(wavenumbers), SCALES_COMPARED)]:
        for row in _rows_shown(columns[0], k):
            place = f"    k = {k:.4g} {QUANTITIES['wavenumber'].unit}"
            if "redshift" in table.colnames:
                place += f", z = {columns[0]['redshift'][row]:g}"
            rows.append((place, *(_value_text(part[row], name) for part in columns)))
    return aligned(rows)


def _rows_shown(table, wavenumber):
    """Return the rows of one wavenumber that a summary shows."""
    rows = np.flatnonzero(np.asarray(table["wavenumber"]) == wavenumber)
    return rows[_few(len(rows), REDSHIFTS_COMPARED)]


def _value_text(row, name):
    """Return an entry for a terminal; a dash where it has no meaning."""
    if "ratio_today" in row.colnames:  # a redshift of catching up
        return "-" if np.ma.is_masked(row["ratio_today"]) else _redshift_text(row[name])
    return "-" if np.ma.is_masked(row[name]) else f"{row[name]:.4g}"


def _numbers(count):
    return map(str, range(1, count + 1))


def progress_bar(stream):
    """Return a function that shows progress on a terminal, or None if the stream is none.

    Parameters
    ----------
    stream : text stream
        Where to draw.

    Returns
    -------
    callable or None
        Function (done, total); draws over itself and wipes itself out when all is done.
    """
    if not stream.isatty():
        return None

    def show(done, total):
        filled = BAR_LENGTH * done // total
        bar = f"\r[{'=' * filled}{' ' * (BAR_LENGTH - filled)}] {100 * done // total:3d} %"
        stream.write(bar if done < total else "\r" + " " * len(bar) + "\r")
        stream.flush()

    return show


def _request(scenario):
    wavenumbers, redshifts = scenario.sampling.wavenumbers, scenario.sampling.redshifts
    return (
        f"{_counted(len(wavenumbers), 'wavenumber')} "
        f"from {min(wavenumbers):g} to {max(wavenumbers):g} {QUANTITIES['wavenumber'].unit}, "
        f"{_counted(len(redshifts), 'redshift')} from {max(redshifts):g} to {min(redshifts):g}"
    )


def _counted(number, noun):
    return f"{number} {noun}{'' if number == 1 else 's'}"


def _few(count, most):
    """Return indices of at most `most` entries, spread over all, first and last among them."""
    return sorted(set(np.linspace(0, count - 1, min(count, most)).round().astype(int).tolist()))


def _redshift_text(value):
    if np.ma.is_masked(value):
        return "never"
    return f"{value:.5g}" if np.isfinite(value) else "always"


def _dash_or(value, form):
    return "-" if np.ma.is_masked(value) else form.format(value)
