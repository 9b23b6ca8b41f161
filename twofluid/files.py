"""Files: tables and figures as bytes, and bytes to disk all at once or not at all."""

from __future__ import annotations

import io
import os
import secrets
from contextlib import contextmanager
from pathlib import Path

FIGURE_FORMATS = ("pdf", "png")  # vector for the paper, pixels for the screen


@contextmanager
def replace_atomically(path):
    """Open a file so that at any moment its old content or all of the new stands there, never a part.

    Parameters
    ----------
    path : path-like
        File to write or replace; its directory must exist.

    Yields
    ------
    binary stream
        Where to write; takes the place of the file when the block ends without an exception.

    Raises
    ------
    OSError
        If the file cannot be written; names it. What stood there before still stands.
    """
    path = Path(path)
    # In the same directory, since a rename across file systems is a copy.
    partial = path.with_name(f".{path.name}.{secrets.token_hex(4)}.part")
    try:
        with open(partial, "xb") as file:
            yield file
            file.flush()
            os.fsync(file.fileno())
        os.replace(partial, path)
    except OSError as error:
        raise OSError(error.errno, error.strerror, str(path)) from error
    finally:
        partial.unlink(missing_ok=True)


def write_file(path, content):
    """Write a file, all or nothing.

    Parameters
    ----------
    path : path-like
        File to write or replace; its directory must exist.
    content : bytes
        What it is to hold.

    Raises
    ------
    OSError
        As `replace_atomically`.
    """
    with replace_atomically(path) as file:
        file.write(content)


def write_table(table, path):
    """Write a table as ECSV.

    Parameters
    ----------
    table : astropy.table.Table
        The table.
    path : path-like
        File to write or replace.

    Raises
    ------
    OSError
        As `replace_atomically`.
    """
    write_file(path, table_bytes(table))


def save_figure(figure, path, scenario):
    """Save a figure with the scenario that led to it.

    Parameters
    ----------
    figure : matplotlib.figure.Figure
        The figure.
    path : path-like
        File to write or replace; its ending, .pdf or .png, says the format.
    scenario : Scenario
        The scenario for the file's metadata.

    Raises
    ------
    ValueError
        If the ending is neither.
    OSError
        As `replace_atomically`.
    """
    write_file(path, figure_bytes(figure, Path(path).suffix.removeprefix("."), scenario))


def table_bytes(table):
    """Return a table as the content of an ECSV file, numbers with all their digits.

    Parameters
    ----------
    table : astropy.table.Table
        The table.

    Returns
    -------
    bytes
        UTF-8 text, lines ending in a newline on every system.
    """
    text = io.StringIO(newline="\n")
    table.write(text, format="ascii.ecsv")
    return (text.getvalue().rstrip("\n") + "\n").encode()


def figure_bytes(figure, form, *scenarios):
    """Return a figure as the content of a file; the same figure gives the same bytes.

    Parameters
    ----------
    figure : matplotlib.figure.Figure
        The figure.
    form : str
        One of `FIGURE_FORMATS`.
    *scenarios : Scenario
        Titles, and each whole as a YAML document, go to the metadata with the program's version.

    Returns
    -------
    bytes
        The content.

    Raises
    ------
    ValueError
        If the format is another.
    """
    if form not in FIGURE_FORMATS:
        raise ValueError(f"figure format {form!r} is none of {', '.join(FIGURE_FORMATS)}")
    import yaml

    from twofluid import __version__
    from twofluid.drawing import journal_style

    mappings = [scenario.to_mapping() for scenario in scenarios]
    request = yaml.safe_dump_all(mappings, sort_keys=False, allow_unicode=True)
    title = "; ".join(scenario.title for scenario in scenarios)
    program = f"twofluid {__version__}"
    metadata = {
        # A creation date would make every file differ from the last.
        "pdf": {"Title": title, "Subject": request, "Creator": program, "CreationDate": None},
        "png": {"Title": title, "Description": request, "Software": program},
    }
    content = io.BytesIO()
    with journal_style():
        figure.savefig(content, format=form, metadata=metadata[form])
    return _with_palette(content) if form == "png" else content.getvalue()


def _with_palette(content):
    """Return a PNG of at most 256 colours, all that lines and type need, in a third of the bytes."""
    from PIL import Image, PngImagePlugin

    image, words = Image.open(content), PngImagePlugin.PngInfo()
    for name, text in image.text.items():
        words.add_itxt(name, text)
    small = io.BytesIO()
    image.convert("RGB").quantize(256).save(small, "png", optimize=True, pnginfo=words, dpi=image.info["dpi"])
    return small.getvalue()
