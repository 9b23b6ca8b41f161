"""The one error a scenario can cause."""

LONGEST_SHOWN = 60  # characters of an offending value worth repeating in a message; our choice


def printable(text):
    """Escape what does not print, so that text stays on one line of a terminal."""
    return "".join(letter if letter.isprintable() else ascii(letter)[1:-1] for letter in text)


def shortened(text):
    """Make text printable and cut what is too long for a message."""
    shown = printable(text)
    return shown if len(shown) <= LONGEST_SHOWN else shown[: LONGEST_SHOWN - 3] + "..."


class ScenarioError(ValueError):
    """A scenario breaks a rule.

    The text of the error is one line, ``FILE:LINE: key = value: rule; remedy``, without the parts
    that do not apply.

    Parameters
    ----------
    rule : str
        What is wrong.
    remedy : str
        What to do about it.
    file : str or None
        Name of the file, None for a scenario that was not read from text.
    line : int or None
        Line in that file, counted from 1.
    key : str or None
        Dotted key, for example ``cosmology.hubble_constant``.
    value : str or None
        The offending value as it stands in the file, None if there is none.
    """

    def __init__(self, rule, remedy, file=None, line=None, key=None, value=None):
        super().__init__(rule, remedy, file, line, key, value)
        self.rule = rule
        self.remedy = remedy
        self.file = file
        self.line = line
        self.key = key
        self.value = value

    def __str__(self):
        place = "scenario" if self.file is None else printable(self.file)
        if self.line is not None:
            place += f":{self.line}"
        parts = [place]
        if self.key:
            parts.append(shortened(self.key) + ("" if self.value is None else f" = {shortened(self.value)}"))
        parts.append(f"{self.rule}; {self.remedy}")
        return ": ".join(parts)
