"""What the terminal shows: landmarks, a short summary of each product, progress."""

from __future__ import annotations

from dataclasses import asdict

import numpy as np

from twofluid.quantities import QUANTITIES
from twofluid.scenario import mixture_lines, thermal_sentence

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
        *_mixture_lines(scenario.primordial),
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
    lines += _mixture_lines(history.scenario.primordial)
    if history.certificate is not None:
        lines += [f"  {part}" for part in history.certificate.sentence().split("; ", maxsplit=2)]
    return lines


def _mixture_lines(primordial):
    """Return a line for each initial mode of a mixture."""
    lines = mixture_lines(primordial)
    return [f"  {'starts' if number == 0 else '':7}   {text}" for number, text in enumerate(lines)]


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
    unit = QUANTITIES["wavenumber"].unit
    fractions = list(catchup.meta["fractions"].items())
    fractions = [fractions[i] for i in _few(len(fractions), COLUMNS_SHOWN)]
    catchup_rows = [("  caught up at redshift", *(f"{100 * fraction:g} %" for _, fraction in fractions))]
    catchup_rows += [
        (f"    k = {k} {unit}", *(_redshift_text(catchup[name][mode]) for name, _ in fractions))
        for k, mode in zip(wavenumbers, modes, strict=True)
    ]
    return _grid(lag, "wavenumber", "ratio", "ratio", ".4f") + aligned(catchup_rows)


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


def growth_lines(tables):
    """Return the summary of growth: that of matter, and its rate, at a few scales.

    Parameters
    ----------
    tables : mapping of str to astropy.table.Table
        The table of the product, under "growth".

    Returns
    -------
    list of str
        Lines.
    """
    table = tables["growth"]
    epoch = f"growth of matter since z = {table.meta['reference_redshift']:g}"
    lines = _grid(table, "wavenumber", epoch, "growth_matter", ".5g")
    lines += _grid(table, "wavenumber", "growth rate of matter", "rate_matter", ".4f")
    exponent = table.meta["exponent_with_smooth_baryons"]
    if "no_dark_matter" not in table.meta:
        lines.append(f"  power of a in the matter era while baryons stay smooth: {exponent:.4f}")
    return lines


def spheres_lines(tables):
    """Return the summary of spheres: the rms contrast of matter in a few of them.

    Parameters
    ----------
    tables : mapping of str to astropy.table.Table
        The table of the product, under "spheres".

    Returns
    -------
    list of str
        Lines.
    """
    table = tables["spheres"]
    lines = _grid(table, "sphere_radius", "rms of matter in spheres", "sigma_matter", ".4g")
    error = np.ma.asarray(table["sigma_matter_error"]) / np.ma.asarray(table["sigma_matter"])
    if error.count():
        percent = f"{100 * error.max():.2g} per cent"
        lines.append(f"  sampling, quadrature and range of wavenumbers leave up to {percent} open")
    if "not_covered" in table.meta:
        lines.append(f"  spheres: {table.meta['not_covered']}")
    return lines


def shortfall_lines(tables):
    """Return the summary of the shortfall: contrast at decoupling against the one needed, and what came of it.

    Parameters
    ----------
    tables : mapping of str to astropy.table.Table
        The tables of the product, under "shortfall" and "contrast".

    Returns
    -------
    list of str
        Lines.
    """
    table = tables["shortfall"]
    meta = table.meta
    needed = np.ma.asarray(table["rms_needed"]).compressed()
    lines = []
    if needed.size:
        lines.append(
            f"  order unity by z = {meta['target_redshift']:g} takes an rms contrast of {needed[0]:.3g} at "
            f"decoupling, z = {meta['decoupling_redshift']:.5g}"
        )
    rows = [("  rms contrast", "fluid", "at decoupling", "short by", "reaches 1", "by t^(2/3) alone")]
    scales = table[np.asarray(table["fluid"]) == "matter"]
    for scale in _few(len(scales), SCALES_SHOWN):
        for row in table[3 * scale : 3 * scale + 3]:
            if not np.ma.is_masked(row["rms_at_decoupling"]):
                rows.append((f"    {_scale_text(row)}", *_shortfall_cells(row)))
    lines += aligned(rows)
    return lines + [f"  shortfall: {meta[name]}" for name in ("no_dark_matter", "not_covered") if name in meta]


def _scale_text(row):
    if np.ma.is_masked(row["wavenumber"]):
        return f"R = {row['sphere_radius']:.4g} {QUANTITIES['sphere_radius'].unit}"
    return f"k = {row['wavenumber']:.4g} {QUANTITIES['wavenumber'].unit}"


def _shortfall_cells(row):
    if not np.ma.is_masked(row["unity_redshift"]):
        outcome = f"z = {row['unity_redshift']:.4g}, t = {row['unity_age']:.4g} Gyr"
    elif row["greatest_redshift"] == 0.0:
        outcome = f"never by today: {row['greatest_rms']:.3g}, still growing"
    else:
        outcome = f"never: growth stops at z = {row['greatest_redshift']:.4g}, at {row['greatest_rms']:.3g}"
    short = f"{row['shortfall']:.3g}" if row["shortfall"] > 1.0 else "nothing"
    return (row["fluid"], f"{row['rms_at_decoupling']:.3g}", short, outcome, f"{row['matter_era_age']:.3g} Gyr")


def _grid(table, scale, title, name, digits):
    """Return lines with one quantity at a few scales and redshifts."""
    redshifts = list(dict.fromkeys(np.asarray(table["redshift"]).tolist()))
    values = np.ma.asarray(table[name]).reshape(-1, len(redshifts))
    scales = np.asarray(table[scale])[:: len(redshifts)]
    shown = _few(len(redshifts), COLUMNS_SHOWN)
    quantity = QUANTITIES[scale]
    rows = [(f"  {title}", *(f"z = {redshifts[i]:g}" for i in shown))]
    for mode in _few(len(scales), SCALES_SHOWN):
        cells = ["-" if values[mode, i] is np.ma.masked else f"{values[mode, i]:{digits}}" for i in shown]
        rows.append((f"    {quantity.symbol} = {scales[mode]:.4g} {quantity.unit}", *cells))
    return aligned(rows)


def streaming_lines(tables):
    """Return the summary of the streaming: its velocity, and the power of matter it leaves, at a few scales.

    Parameters
    ----------
    tables : mapping of str to astropy.table.Table
        The tables of the product, under "streaming-velocity" and "streaming".

    Returns
    -------
    list of str
        Lines.
    """
    velocity, streaming = tables["streaming-velocity"], tables["streaming"]
    if "no_dark_matter" in velocity.meta:
        return [f"  streaming: {velocity.meta['no_dark_matter']}"]
    shown = _few(len(velocity), COLUMNS_SHOWN)
    rows = [("  streaming", *(f"z = {velocity['redshift'][i]:g}" for i in shown))]
    rows += [
        (f"    {words}", *(_dash_or(velocity[name][i], "{:.4g}") for i in shown))
        for words, name in (("rms velocity [km/s]", "rms_velocity"), ("Mach number", "mach_number"))
    ]
    averages = streaming[np.ma.getmaskarray(np.ma.asarray(streaming["velocity"]))]
    lines = aligned(rows) + _grid(averages, "wavenumber", "matter power over that without", "suppression_matter", ".4f")
    if "not_covered" in streaming.meta:
        lines.append(f"  streaming: {streaming.meta['not_covered']}")
    return lines


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
