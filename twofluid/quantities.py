"""One nomenclature: every quantity of every table, with its symbol, unit and meaning.

Table columns, axis labels, the terminal report and the documentation all read this table, so a
quantity is described in one place only.
"""

from __future__ import annotations

import re
from dataclasses import dataclass


@dataclass(frozen=True)
class Quantity:
    """One named quantity.

    Attributes
    ----------
    name : str
        Name in code and in table headers.
    symbol : str
        Symbol as mathtext, without the dollar signs.
    unit : str
        Unit as read by astropy.units; empty for none.
    meaning : str
        What it is, and what an empty or infinite entry says where a table can hold one.
    """

    name: str
    symbol: str
    unit: str
    meaning: str

    @property
    def plain_symbol(self) -> str:
        """The symbol for a terminal: mathtext commands and braces dropped."""
        return re.sub(r"\\mathrm|[\\{}]", "", self.symbol)


_AXES = (
    Quantity("wavenumber", "k", "1/Mpc", "comoving wavenumber"),
    Quantity("redshift", "z", "", "redshift"),
)

_AMPLITUDES = (
    Quantity("delta_dark", r"\delta_\mathrm{c}", "",
             "dark-matter density contrast per unit comoving curvature; empty: no dark matter"),
    Quantity("delta_baryon", r"\delta_\mathrm{b}", "", "baryon density contrast per unit comoving curvature"),
    Quantity("theta_baryon", r"\theta_\mathrm{b}", "1/Mpc",
             "divergence of the baryon velocity (conformal time) per unit comoving curvature"),
    Quantity("delta_gas_temperature", r"\delta_T", "",
             "relative contrast of the gas temperature per unit comoving curvature"),
)

_LAG = (
    Quantity("ratio", r"\delta_\mathrm{b}/\delta_\mathrm{c}", "",
             "baryon over dark-matter density contrast; empty: no dark matter"),
    Quantity("delay", r"\Delta t", "Myr",
             "time since the dark matter last had the amplitude the baryons have at this redshift; "
             "empty: it never had it, or the baryons are not behind"),
    Quantity("redshift_at_N_percent", r"z_N", "",
             "redshift at which the ratio last rises through N per cent; empty: never by today; "
             "inf: not below it at any time since the start of the run"),
    Quantity("ratio_today", r"(\delta_\mathrm{b}/\delta_\mathrm{c})_0", "",
             "baryon over dark-matter density contrast at redshift 0; empty: no dark matter"),
)

_COMPARISON = (
    Quantity("scenario", r"\mathrm{scenario}", "", "title of the scenario the row belongs to"),
    Quantity("X_over_first", r"X/X_1", "",
             "X over that of the first scenario at the same place; empty: one of the two is, or has no finite ratio"),
    Quantity("delta_dark_difference", r"\Delta\delta_\mathrm{c}/\delta_\mathrm{c}", "",
             "delta_dark less that of the first scenario, relative to it; empty: one of the two has no dark matter"),
    Quantity("delta_baryon_difference", r"\Delta\delta_\mathrm{b}/\delta_\mathrm{b}", "",
             "delta_baryon less that of the first scenario, relative to it"),
    Quantity("ratio_difference", r"\Delta(\delta_\mathrm{b}/\delta_\mathrm{c})", "",
             "baryon over dark-matter density contrast less that of the first scenario; "
             "empty: one of the two has no dark matter"),
)

_NO_FILTERING = "empty: before the drag epoch, no dark matter, or the wavenumbers of the run do not reach it"
_SCALES = (
    Quantity("hubble_radius", r"1/(aH)", "Mpc", "comoving Hubble radius"),
    Quantity("particle_horizon", r"\tau", "Mpc", "comoving way of light since the beginning, the conformal time"),
    Quantity("sound_horizon", r"r_\mathrm{s}", "Mpc",
             "comoving way of sound in the plasma since the beginning, up to the drag epoch at most"),
    Quantity("plasma_sound_speed", r"c_\mathrm{p}", "km/s",
             "sound speed of photons and baryons tied together; empty: after the drag epoch"),
    Quantity("gas_sound_speed", r"c_\mathrm{s}", "km/s",
             "sound speed of the gas alone, from its temperature and the slope of that with the scale factor"),
    Quantity("gas_temperature", r"T", "K", "temperature of the gas"),
    Quantity("silk_wavenumber", r"k_\mathrm{S}", "1/Mpc",
             "photon diffusion up to this redshift: waves are damped by exp[-(k/k_S)^2]; empty: after the drag epoch"),
    Quantity("jeans_wavenumber", r"k_\mathrm{J}", "1/Mpc",
             "comoving Jeans wavenumber (a/c) sqrt(4 pi G rho): of the plasma, with rho of all that clusters, before "
             "the drag epoch; of the gas, with rho of baryons and dark matter, after it"),
    Quantity("jeans_length", r"\lambda_\mathrm{J}", "Mpc", "comoving Jeans length 2 pi/k_J"),
    Quantity("jeans_mass", r"M_\mathrm{J}", "solMass",
             "baryons and dark matter in a sphere of radius mass_radius (see header) times the Jeans length"),
    Quantity("filtering_wavenumber", r"k_\mathrm{F}", "1/Mpc",
             "filtering integral of Gnedin & Hui 1998 with the growth of all matter in the run; " + _NO_FILTERING),
    Quantity("filtering_wavenumber_two_fluids", r"k_\mathrm{F2}", "1/Mpc",
             "filtering integral with the baryons' own growth and pressure in the run; " + _NO_FILTERING),
    Quantity("filtering_wavenumber_measured", r"k_\mathrm{Fm}", "1/Mpc",
             "k_F of exp(-k^2/k_F^2) where delta_baryon/delta_dark has fallen by exp(-0.02) below its plateau; "
             + _NO_FILTERING),
    Quantity("smoothed_wavenumber", r"k_\mathrm{e}", "1/Mpc",
             "where delta_baryon/delta_dark has fallen to 1/e of its plateau; " + _NO_FILTERING),
    Quantity("filtering_mass", r"M_\mathrm{F}", "solMass",
             "as jeans_mass, of the wavelength 2 pi over filtering_wavenumber; " + _NO_FILTERING),
    Quantity("filtering_mass_two_fluids", r"M_\mathrm{F2}", "solMass",
             "as jeans_mass, of the wavelength 2 pi over filtering_wavenumber_two_fluids; " + _NO_FILTERING),
    Quantity("filtering_mass_measured", r"M_\mathrm{Fm}", "solMass",
             "as jeans_mass, of the wavelength 2 pi over filtering_wavenumber_measured; " + _NO_FILTERING),
    Quantity("verdict", r"\mathrm{verdict}", "",
             "what the mode is doing: larger than the horizon, oscillates with the plasma, damped, held up by "
             "pressure, falls in, grows; empty: the steps of the run are too long to follow the wave"),
    Quantity("agrees_with_jeans", r"\mathrm{agrees}", "",
             "whether the mode withstands gravity (oscillates, damped, held up) exactly where its wavenumber is "
             "above jeans_wavenumber; empty: no verdict"),
)

_LANDMARKS = (
    Quantity("equality_redshift", r"z_\mathrm{eq}", "", "matter and radiation have equal density"),
    Quantity("equality_wavenumber", r"k_\mathrm{eq}", "1/Mpc", "conformal expansion rate at equality"),
    Quantity("last_scattering_redshift", r"z_*", "", "photon optical depth from today is one"),
    Quantity("last_scattering_sound_horizon", r"r_*", "Mpc", "comoving sound horizon at last scattering"),
    Quantity("last_scattering_age", r"t_*", "Myr", "age of the universe at last scattering"),
    Quantity("drag_redshift", r"z_\mathrm{drag}", "", "baryon drag depth from today is one"),
    Quantity("drag_sound_horizon", r"r_\mathrm{drag}", "Mpc", "comoving sound horizon at the drag epoch"),
    Quantity("diffusion_wavenumber", r"k_\mathrm{D}", "1/Mpc", "photon diffusion scale at last scattering"),
    Quantity("thermal_decoupling_redshift", r"z_T", "", "Compton heating of the gas falls below expansion"),
    Quantity("age_today", r"t_0", "Gyr", "age of the universe today"),
    Quantity("conformal_age", r"\tau_0", "Mpc", "conformal time today"),
    Quantity("reionization_optical_depth", r"\tau_\mathrm{re}", "",
             "photon optical depth of the electrons that a table or reionization adds; other landmarks are without"),
)

QUANTITIES = {
    quantity.name: quantity
    for quantity in (*_AXES, *_AMPLITUDES, *_LAG, *_SCALES, *_COMPARISON, *_LANDMARKS)
}


def nomenclature_markdown() -> str:
    """Return the nomenclature as a Markdown table, one row a quantity.

    Returns
    -------
    str
        The table with its header row, ending in a newline.
    """
    rows = ["| name | symbol | unit | meaning |", "| --- | --- | --- | --- |"]
    rows += [f"| `{q.name}` | ${q.symbol}$ | {q.unit or '-'} | {q.meaning} |" for q in QUANTITIES.values()]
    return "\n".join(rows) + "\n"
