"""The certificate of a run: how many of its digits are right."""

from dataclasses import dataclass

import numpy as np


@dataclass(frozen=True)
class Certificate:
    """Estimated numerical error of a run.

    Attributes
    ----------
    wavenumber : array, shape (mode,)
        Modes solved again [1/Mpc].
    redshift : array, shape (redshift,)
        Redshifts of the run [unitless].
    dark_error : array, shape (mode, redshift)
        Error of the dark-matter contrast (without dark matter: of the dust that carries the frame), relative to
        the larger of its value and a tenth of its largest so far [unitless].
    ratio_error : array, shape (mode, redshift)
        Error of the ratio of baryon to dark-matter contrast, absolute, and relative where it is above 1 (then the
        dark matter may be passing through zero); without dark matter of the baryon contrast, relative to the larger
        of the baryons' and the dust's; where the dark matter has pressure, and the ratio poles, likewise with the
        dark matter's [unitless].
    temperature_error : array, shape (mode, redshift)
        Error of the gas temperature contrast, relative to the larger of its value and the baryons' [unitless].
    constraint : float
        Largest drift of the Einstein constraint of all modes of the run, NaN if its equations have none [unitless].
    promise : float
        What the accuracy asked for promises for the first two [unitless].
    """

    wavenumber: np.ndarray
    redshift: np.ndarray
    dark_error: np.ndarray
    ratio_error: np.ndarray
    temperature_error: np.ndarray
    constraint: float
    promise: float

    @property
    def kept(self) -> bool:
        """Whether the promise is kept."""
        return bool(max(self.dark_error.max(), self.ratio_error.max()) <= self.promise)

    def sentence(self) -> str:
        """Say it in one line."""
        constraint = "none to check" if np.isnan(self.constraint) else f"drift {self.constraint:.1g}"
        verdict = "within" if self.kept else "EXCEEDS"
        return (
            f"numerical error of the lag ratio: {self._worst(self.ratio_error)}; of the dark-matter contrast: "
            f"{self._worst(self.dark_error)}; {len(self.wavenumber)} modes solved again, finer; energy constraint: "
            f"{constraint}; {verdict} the promised {self.promise:g}"
        )

    def _worst(self, error: np.ndarray) -> str:
        mode, epoch = np.unravel_index(np.argmax(error), error.shape)
        return f"{error.max():.0e}, largest at k = {self.wavenumber[mode]:.3g}/Mpc, z = {self.redshift[epoch]:g}"
