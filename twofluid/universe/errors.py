"""The error raised for a universe that cannot be, or that lacks what is asked of it."""


class UniverseError(ValueError):
    """A universe that contradicts itself, or a landmark it does not have.

    The message is one sentence ready for the user.

    Attributes
    ----------
    index : int or None
        Which of the universes built together it is, counted from 0.
    """

    def __init__(self, message, index=None):
        super().__init__(message)
        self.index = index
