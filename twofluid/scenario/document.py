"""YAML text to a tree of entries that remember their lines; nothing in it is interpreted yet.

The tree is built from the events of the parser, so that a hostile file is refused at its first anchor
or its first bracket too many, before anything is expanded.
"""

from dataclasses import dataclass, replace

import yaml

from .errors import ScenarioError, printable, shortened
from .keys import path_in

LARGEST_SIZE = 1_000_000  # bytes; a long list of wavenumbers fits, a file given by mistake often does not
DEEPEST_NESTING = 10  # levels; the deepest valid scenario has four

_EMPTY_WORDS = ("", "~", "null", "Null", "NULL")  # YAML 1.1's ways to write nothing
_SYNTAX_REMEDY = "check indentation (no tabs), the blank after each colon, closing brackets and quotes"


@dataclass(frozen=True)
class Entry:
    """One value of a scenario and where it stands.

    Parameters
    ----------
    content : None, str, tuple of Entry or dict of str to Entry
        Nothing, the text of a scalar, the items of a list, the entries of a mapping.
    key : str
        Dotted key, empty at the top. Items of a list carry the key of the list.
    file, line : str, int or None
        Where it stands; None for a scenario that was not read from text.
    quoted : bool
        Whether a scalar stands in quotes.
    cleared : bool
        Whether nothing was written out, as `null`, rather than left blank.
    """

    content: str | tuple | dict | None
    key: str = ""
    file: str | None = None
    line: int | None = None
    quoted: bool = False
    cleared: bool = False

    @property
    def shown(self):
        """The value as a message shows it, None if there is none."""
        if isinstance(self.content, tuple):
            return "[" + ", ".join(item.shown or "" for item in self.content[:5]) + "]"
        if isinstance(self.content, dict):
            return "{" + ", ".join(self.content) + "}"
        return self.content

    def error(self, rule, remedy):
        """Make the error for this entry."""
        return ScenarioError(rule, remedy, self.file, self.line, self.key or None, self.shown)

    def child(self, name, content):
        """Make an entry of this mapping that stands nowhere in the text."""
        return Entry(content, path_in(self.key, name), self.file, self.line)

    def at(self, path):
        """Find the entry at a dotted path below; one that stands nowhere, the last of them, if it was not written."""
        entry = self
        for name in path.split("."):
            inner = entry.content.get(name) if isinstance(entry.content, dict) else None
            if inner is None:
                return entry.child(name, None)
            entry = inner
        return entry


def text_of_file(path, name, asked=None, remedy=None):
    """Read the text of a scenario file, or of a table beside it.

    Parameters
    ----------
    path : path-like
        A file, encoded in UTF-8.
    name : str
        What messages call it.
    asked : Entry, optional
        The entry that names the file; it is to blame if there is none to read.
    remedy : str, optional
        What to do about a file that is too large, if it is no scenario.

    Returns
    -------
    str
        The text.

    Raises
    ------
    ScenarioError
        The file cannot be read, is too large or is not UTF-8.
    """
    try:
        with open(path, "rb") as file:
            data = file.read(LARGEST_SIZE + 1)
    except FileNotFoundError:
        raise _unreadable(name, asked, "does not exist", "check the name and the directory") from None
    except IsADirectoryError:
        raise _unreadable(name, asked, "is a directory", "name a file in it") from None
    except (OSError, ValueError) as error:
        reason = getattr(error, "strerror", None) or str(error)
        raise _unreadable(name, asked, f"cannot be read ({reason})", "check name and permissions") from None
    if len(data) > LARGEST_SIZE:
        raise too_large(name, remedy)
    try:
        return data.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        line = data.count(b"\n", 0, error.start) + 1
        raise ScenarioError("is not UTF-8 text", "save it as UTF-8", name, line) from None


def _unreadable(name, asked, rule, remedy):
    if asked is None:
        return ScenarioError(rule, remedy, name)
    return asked.error(f"names {printable(name)}, which {rule}", remedy)


def entry_from_text(text, file):
    """Turn YAML text into entries.

    Parameters
    ----------
    text : str
        One YAML document.
    file : str
        Name for messages.

    Returns
    -------
    Entry
        The top of the tree.

    Raises
    ------
    ScenarioError
        The text is too long, no YAML, empty, several documents, nested too deeply, or uses anchors,
        aliases, tags or a key twice.
    """
    if len(text.encode("utf-8", "surrogatepass")) > LARGEST_SIZE:
        raise too_large(file)
    try:
        return _Builder(file).document(text)
    except yaml.reader.ReaderError as error:
        line = text.count("\n", 0, error.position) + 1
        rule = f"holds a character that YAML does not allow (code {ord(text[error.position]):#x})"
        raise ScenarioError(rule, "remove it", file, line) from None
    except yaml.MarkedYAMLError as error:
        mark = error.problem_mark or error.context_mark
        rule = f"is not valid YAML ({printable(error.problem or error.context)})"
        raise ScenarioError(rule, _SYNTAX_REMEDY, file, mark and mark.line + 1) from None
    except ScenarioError:
        raise
    except (ValueError, OverflowError):  # the parser lets these through for impossible escapes
        rule = "is not valid YAML (an escape names no character)"
        raise ScenarioError(rule, _SYNTAX_REMEDY, file) from None


def entry_from_plain(value, key=""):
    """Turn nested mappings, lists, texts and numbers into entries that stand in no file."""
    if isinstance(value, dict):
        names = {str(name): item for name, item in value.items()}
        return Entry({name: entry_from_plain(item, path_in(key, name)) for name, item in names.items()}, key)
    if isinstance(value, list | tuple):
        return Entry(tuple(entry_from_plain(item, key) for item in value), key)
    if isinstance(value, bool):
        return Entry(str(value).lower(), key)
    return Entry(None if value is None else str(value), key)


def too_large(file, remedy=None):
    """Make the error for a file over the limit."""
    rule = f"is larger than {LARGEST_SIZE} bytes"
    return ScenarioError(rule, remedy or "is it a scenario? Give long lists of wavenumbers as a range", file)


class _Builder:
    """Builds the tree of one document from the parser's events."""

    def __init__(self, file):
        self.file = file

    def document(self, text):
        self.events = yaml.parse(text, Loader=yaml.SafeLoader)
        self._next()  # start of the stream
        if isinstance(self._next(), yaml.StreamEndEvent):
            raise self._empty()
        top = self._entry(self._next(), "", 0)
        self._next()  # end of the document
        extra = self._next()
        if not isinstance(extra, yaml.StreamEndEvent):
            raise self._error(extra, "a second document starts here", "keep one scenario a file")
        if top.content is None:
            raise self._empty()
        return top

    def _next(self):
        return next(self.events)

    def _error(self, event, rule, remedy, key=None):
        return ScenarioError(rule, remedy, self.file, event.start_mark.line + 1, key or None)

    def _empty(self):
        return ScenarioError("is empty", "give at least the sections cosmology and sampling", self.file)

    def _entry(self, event, key, depth):
        self._refuse_indirection(event, key)
        if depth > DEEPEST_NESTING:
            raise self._error(event, f"is nested deeper than {DEEPEST_NESTING} levels", "flatten it", key)
        quoted = cleared = False
        if isinstance(event, yaml.MappingStartEvent):
            content = self._mapping(key, depth)
        elif isinstance(event, yaml.SequenceStartEvent):
            content = self._sequence(key, depth)
        else:
            quoted = event.style is not None
            content = event.value if quoted or event.value not in _EMPTY_WORDS else None
            cleared = content is None and event.value != ""
        return Entry(content, key, self.file, event.start_mark.line + 1, quoted, cleared)

    def _refuse_indirection(self, event, key):
        if isinstance(event, yaml.AliasEvent):
            raise self._error(event, f"uses the alias *{shortened(event.anchor)}", "write the value out", key)
        if event.anchor is not None:
            raise self._error(event, f"sets the anchor &{shortened(event.anchor)}", "remove it", key)
        if event.tag is not None:
            raise self._error(event, f"carries the tag {shortened(event.tag)}", "remove it", key)

    def _sequence(self, key, depth):
        items = []
        while not isinstance(event := self._next(), yaml.SequenceEndEvent):
            items.append(self._entry(event, key, depth + 1))
        return tuple(items)

    def _mapping(self, key, depth):
        entries = {}
        while not isinstance(event := self._next(), yaml.MappingEndEvent):
            self._refuse_indirection(event, key)
            if not isinstance(event, yaml.ScalarEvent):
                raise self._error(event, "has a list or mapping as a key", "use plain words as keys", key)
            path = path_in(key, event.value)
            if event.value in entries:
                earlier = entries[event.value].line
                raise self._error(event, f"stands here twice, first in line {earlier}", "keep one", path)
            value = self._entry(self._next(), path, depth + 1)
            # The line of the key, also where a mapping begins only on the next one.
            entries[event.value] = replace(value, line=event.start_mark.line + 1)
        return entries
