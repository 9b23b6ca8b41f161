"""The error raised for a universe that cannot be, or that lacks what is asked of it."""


class UniverseError(ValueError):
    """A universe that contradicts itself, or a landmark it does not have.

    The message is one sentence ready for the user.
    """
