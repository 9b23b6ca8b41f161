"""The closures a scenario can ask for. A new one is a module with a system class, and a row here."""

from ..scenario import Scenario
from .kinetic import ConstrainedKineticSystem, KineticSystem
from .sound_speed import SoundSpeedSystem

#: System class of each value of the scenario key ``method.closure``. Beyond what the solver asks of a linear
#: system each has `first_state`, `observed` and `read_off`, `stackable` (whether its modes may belong to several
#: universes, see `twofluid.universe.UniverseStack`), `neutrinos_may_have_mass`, `switches` (conformal times at
#: which its equations change, to be met by every clock [Mpc]) and `cautions` (sentences its user has to know).
CLOSURES = {"kinetic": KineticSystem, "sound-speed": SoundSpeedSystem}

#: The same for mixtures of initial modes; closures that are not here know the adiabatic mode alone.
MIXTURE_CLOSURES = {"kinetic": ConstrainedKineticSystem}


def check_closure(scenario: Scenario) -> None:
    """Refuse a closure that lacks what the universe holds.

    Parameters
    ----------
    scenario : Scenario

    Raises
    ------
    ValueError
        The text names the keys that do not go together.
    """
    masses, closure = scenario.cosmology.neutrinos.masses, scenario.method.closure
    if any(masses) and not CLOSURES[closure].neutrinos_may_have_mass:
        able = [name for name, system in CLOSURES.items() if system.neutrinos_may_have_mass]
        raise ValueError(
            f"method.closure = {closure} follows neutrinos without mass only, and cosmology.neutrinos.masses = "
            f"{list(masses)} eV were given: choose {' or '.join(able)}"
        )
