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
    Quantity("theta_dark", r"\theta_\mathrm{c}", "1/Mpc",
             "divergence of the velocity of dark matter with pressure, relative to the frame as that of the baryons, "
             "per unit comoving curvature"),
    Quantity("delta_neutrino", r"\delta_\nu", "",
             "contrast of the rest mass of all neutrinos that have mass (3/4 of that of their energy while they are "
             "as fast as light) per unit comoving curvature"),
    Quantity("delta_matter", r"\delta_\mathrm{m}", "",
             "contrast of all rest mass (dark matter, baryons, neutrinos with mass) per unit comoving curvature"),
    Quantity("delta_cold", r"\delta_\mathrm{cb}", "",
             "contrast of dark matter and baryons together per unit comoving curvature"),
)

_MIXTURE = (
    Quantity("part", r"\mathrm{part}", "", "initial modes that follow one random field, joined by plus signs"),
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

_GROWTH = (
    Quantity("growth_dark", r"D_\mathrm{c}", "", "dark-matter contrast over that at the reference epoch"),
    Quantity("growth_baryon", r"D_\mathrm{b}", "", "baryon contrast over that at the reference epoch"),
    Quantity("growth_matter", r"D_\mathrm{m}", "", "matter contrast over that at the reference epoch"),
    Quantity("rate_dark", r"f_\mathrm{c}", "", "growth rate of the dark-matter contrast, d ln delta/d ln a"),
    Quantity("rate_baryon", r"f_\mathrm{b}", "", "growth rate of the baryon contrast, d ln delta/d ln a"),
    Quantity("rate_matter", r"f_\mathrm{m}", "", "growth rate of the matter contrast, d ln delta/d ln a"),
    Quantity("exponent_dark", r"p_\mathrm{c}", "",
             "power of a with the growth of the dark matter since the reference epoch; empty: sign changed"),
    Quantity("exponent_baryon", r"p_\mathrm{b}", "",
             "power of a with the growth of the baryons since the reference epoch; empty: sign changed"),
    Quantity("exponent_matter", r"p_\mathrm{m}", "",
             "power of a with the growth of matter since the reference epoch; empty: sign changed"),
    Quantity("suppression", r"D_\mathrm{m}/D_\mathrm{cold}", "",
             "growth of matter since the reference epoch over that of a cold fluid in its place"),
)

_SPHERES = (
    Quantity("sphere_radius", "R", "Mpc", "comoving radius of a sphere"),
    Quantity("sphere_mass", "M", "solMass", "mean mass of matter in the sphere"),
    Quantity("sigma_dark", r"\sigma_\mathrm{c}", "", "rms dark-matter contrast in spheres"),
    Quantity("sigma_dark_error", r"\Delta\sigma_\mathrm{c}", "",
             "error of it: sampling in wavenumber, quadrature, and what may lie beyond the run's wavenumbers"),
    Quantity("sigma_baryon", r"\sigma_\mathrm{b}", "", "rms baryon contrast in spheres"),
    Quantity("sigma_baryon_error", r"\Delta\sigma_\mathrm{b}", "",
             "error of it: sampling in wavenumber, quadrature, and what may lie beyond the run's wavenumbers"),
    Quantity("sigma_matter", r"\sigma_\mathrm{m}", "", "rms matter contrast in spheres"),
    Quantity("sigma_matter_error", r"\Delta\sigma_\mathrm{m}", "",
             "error of it: sampling in wavenumber, quadrature, and what may lie beyond the run's wavenumbers"),
)

_SHORTFALL = (
    Quantity("fluid", r"\mathrm{fluid}", "", "dark matter, baryons, or matter: all that has mass, weighted by it"),
    Quantity("rms_dark", r"\Delta_\mathrm{c}", "", "rms dark-matter contrast per unit ln k"),
    Quantity("rms_baryon", r"\Delta_\mathrm{b}", "", "rms baryon contrast per unit ln k"),
    Quantity("rms_matter", r"\Delta_\mathrm{m}", "", "rms matter contrast per unit ln k"),
    Quantity("rms_at_decoupling", r"\Delta(z_\mathrm{drag})", "",
             "rms contrast at the drag epoch, of a wave per unit ln k, of a sphere inside it"),
    Quantity("rms_needed", r"\Delta_\mathrm{needed}", "",
             "rms contrast at the drag epoch from which a cold fluid in place of all matter reaches 1 at the "
             "target redshift"),
    Quantity("shortfall", r"\Delta_\mathrm{needed}/\Delta(z_\mathrm{drag})", "",
             "factor between the contrast needed and the one there was; below 1: it was enough"),
    Quantity("rms_at_target", r"\Delta(z_\mathrm{target})", "", "rms contrast at the target redshift"),
    Quantity("unity_redshift", r"z_1", "",
             "redshift at which the rms first reaches 1; empty: never by today; inf: before the run"),
    Quantity("unity_age", r"t_1", "Gyr", "age of the universe when the rms first reaches 1"),
    Quantity("collapse_redshift", r"z_{1.69}", "",
             "redshift at which the rms first reaches 1.686, the linear contrast of a collapsing sphere; empty: "
             "never by today; inf: before the run"),
    Quantity("collapse_age", r"t_{1.69}", "Gyr", "age of the universe when the rms first reaches 1.686"),
    Quantity("greatest_rms", r"\Delta_\mathrm{max}", "", "largest rms contrast by today"),
    Quantity("greatest_redshift", r"z_\mathrm{max}", "",
             "redshift of the largest rms contrast, where growth stops; 0: it grows to this day"),
    Quantity("matter_era_age", r"t_\mathrm{matter}", "Gyr",
             "age at which the contrast at the drag epoch would reach 1 by growing as t^(2/3) alone"),
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
    Quantity("dark_sound_speed", r"c_\mathrm{c}", "km/s", "effective sound speed of dark matter with pressure"),
    Quantity("dark_jeans_wavenumber", r"k_\mathrm{Jc}", "1/Mpc",
             "comoving Jeans wavenumber (a/c) sqrt(4 pi G rho) of dark matter with pressure, rho of it and baryons"),
    Quantity("verdict", r"\mathrm{verdict}", "",
             "what the mode is doing: larger than the horizon, oscillates with the plasma, damped, held up by "
             "pressure, falls in, grows; empty: the steps of the run are too long to follow the wave"),
    Quantity("agrees_with_jeans", r"\mathrm{agrees}", "",
             "whether the mode withstands gravity (oscillates, damped, held up) exactly where its wavenumber is "
             "above jeans_wavenumber; empty: no verdict"),
)

_NO_WIND = "empty: no dark matter"
_NOT_TOLD = "empty: no dark matter, before the patches start, or error above that in the header"
_STREAMING = (
    Quantity("rms_velocity", r"\sigma_\mathrm{bc}", "km/s",
             "rms velocity of baryons relative to dark matter, all three components together; " + _NO_WIND),
    Quantity("rms_velocity_error", r"\Delta\sigma_\mathrm{bc}", "km/s",
             "error of it: sampling in wavenumber, and what lies beyond the wavenumbers in the header; " + _NO_WIND),
    Quantity("mach_number", r"\mathcal{M}", "",
             "rms_velocity over the sound speed of the gas; empty: before the drag epoch, or no dark matter"),
    Quantity("half_variance_wavenumber", r"k_{50}", "1/Mpc",
             "wavenumber up to which waves hold half of the variance of the velocity; " + _NO_WIND),
    Quantity("most_variance_wavenumber", r"k_{90}", "1/Mpc",
             "wavenumber up to which waves hold 90 per cent of the variance of the velocity; " + _NO_WIND),
    Quantity("coherence_length", r"r_\mathrm{v}", "Mpc",
             "comoving distance over which the velocities keep a correlation of 0.95; " + _NO_WIND),
    Quantity("streaming_wavenumber", r"k_\mathrm{v}", "1/Mpc",
             "a H/rms_velocity, whose wave the stream crosses in an expansion time; " + _NO_WIND),
    Quantity("velocity_spectrum", r"\Delta_\mathrm{v}", "km/s",
             "rms velocity of baryons relative to dark matter per unit ln k; " + _NO_WIND),
    Quantity("velocity", r"v/\sigma_\mathrm{bc}", "",
             "streaming velocity of the patch over its rms; empty: average over all patches"),
    Quantity("suppression_dark", r"P_\mathrm{c}/P_\mathrm{c}(0)", "",
             "power of dark matter where gas streams over that where it does not; " + _NOT_TOLD),
    Quantity("suppression_baryon", r"P_\mathrm{b}/P_\mathrm{b}(0)", "",
             "power of baryons where gas streams over that where it does not; " + _NOT_TOLD),
    Quantity("suppression_matter", r"P_\mathrm{m}/P_\mathrm{m}(0)", "",
             "power of matter where gas streams over that where it does not; " + _NOT_TOLD),
    Quantity("error", r"\Delta[P/P(0)]", "",
             "numerical error of the suppressions, the largest; empty: no dark matter, or before the patches start"),
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

_GROUPS = (
    _AXES, _AMPLITUDES, _MIXTURE, _LAG, _GROWTH, _SPHERES, _SHORTFALL, _SCALES, _STREAMING, _COMPARISON, _LANDMARKS,
)  # fmt: skip

QUANTITIES = {quantity.name: quantity for group in _GROUPS for quantity in group}


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
