"""The closures a scenario can ask for. A new one is a module with a system class, and a row here."""

from .kinetic import ConstrainedKineticSystem, KineticSystem
from .sound_speed import SoundSpeedSystem

#: System class of each value of the scenario key ``method.closure``. Beyond what the solver asks of a linear
#: system each has `first_state`, `observed` and `read_off`, `stackable` (whether its modes may belong to several
#: universes, see `twofluid.universe.UniverseStack`), `switches` (conformal times at which its equations
#: change, to be met by every clock [Mpc]) and `cautions` (sentences its user has to know).
CLOSURES = {"kinetic": KineticSystem, "sound-speed": SoundSpeedSystem}

#: The same for mixtures of initial modes; closures that are not here know the adiabatic mode alone.
MIXTURE_CLOSURES = {"kinetic": ConstrainedKineticSystem}
