"""What products ask of a universe, checked before anything is solved."""

from __future__ import annotations

import numpy as np

from twofluid.products.growth import REFERENCE_REDSHIFT
from twofluid.products.shortfall import TARGET_REDSHIFT, check_target


def check_products(scenario, universe):
    """Refuse product options that this universe cannot serve.

    Parameters
    ----------
    scenario : Scenario
        The request.
    universe : Universe
        Its smooth universe.

    Raises
    ------
    ValueError
        If an option does not fit; the text names it by its dotted key.
    """
    for name, options in scenario.products.items():
        if name in _CHECKS:
            try:
                _CHECKS[name](scenario, universe, options)
            except ValueError as problem:
                raise ValueError(f"products.{name}.{problem}") from None


def _check_shortfall(scenario, universe, options):
    check_target(universe, options.get("target_redshift", TARGET_REDSHIFT))


def _check_growth(scenario, universe, options):
    from twofluid.fluids import start_time

    latest = float(start_time(universe, np.asarray(scenario.sampling.wavenumbers)).max())
    earliest = 1.0 / float(universe.scale_factor(latest)) - 1.0
    reference = options.get("reference_redshift", REFERENCE_REDSHIFT)
    if not reference <= earliest:
        raise ValueError(
            f"reference_redshift = {reference:g} must be at most {earliest:.6g}: "
            "before, not every wave of this run has started"
        )


def _check_streaming(scenario, universe, options):
    from twofluid.fluids import check_dark_waves
    from twofluid.streaming import wind_wavenumbers

    try:
        check_dark_waves(universe, wind_wavenumbers())
    except ValueError as problem:
        raise ValueError(f"wind: {problem}") from None


_CHECKS = {"growth": _check_growth, "shortfall": _check_shortfall, "streaming": _check_streaming}
