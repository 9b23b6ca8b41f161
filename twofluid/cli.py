"""The command line: parse, call, report."""

from __future__ import annotations

import argparse
import io
import os
import sys
from pathlib import Path

STATUS_FAILED = 1  # the input was good, but solving or writing failed
STATUS_REFUSED = 2  # the request was refused: nothing was solved, nothing was written
STATUS_UNCERTAIN = 3  # all is written, but the numerical error exceeds what the accuracy asked for promises
STATUS_INTERRUPTED = 130  # what shells report for a program ended by Ctrl-C

DESCRIPTION = "Baryons and dark matter as coupled linear fluids, from the radiation era to today."
EPILOG = (
    "Exit status: 0 done; 1 solving or writing failed; 2 the request was refused, nothing solved and nothing "
    "written; 3 all written, but the numerical error exceeds what was promised; 130 interrupted. A file stands in "
    "the output directory complete or not at all."
)


class RequestError(ValueError):
    """A request that cannot be served; the text is the sentence for the user."""


def main(arguments=None):
    """Run the program.

    Parameters
    ----------
    arguments : list of str, optional
        Command line without the program's name; that of the process by default.

    Returns
    -------
    int
        Exit status: 0 done, 1 solving or writing failed, 2 refused, 3 less certain than promised, 130 interrupted.
    """
    for stream in (sys.stdout, sys.stderr):
        if isinstance(stream, io.TextIOWrapper):
            # A title must not break a terminal that lacks its letters.
            stream.reconfigure(errors="backslashreplace")
    options = _parser().parse_args(arguments)
    try:
        return options.command(options)
    except KeyboardInterrupt:
        print("\ntwofluid: interrupted; no file is half-written", file=sys.stderr)
        return STATUS_INTERRUPTED


def _parser():
    from twofluid import __version__

    words = {"epilog": EPILOG, "allow_abbrev": False}
    parser = argparse.ArgumentParser(prog="twofluid", description=DESCRIPTION, **words)
    parser.add_argument("--version", action="version", version=f"twofluid {__version__}")
    commands = parser.add_subparsers(title="commands", required=True, metavar="COMMAND")

    check = commands.add_parser("check", help="read a scenario, print its universe's landmarks", **words)
    check.add_argument("file", metavar="FILE", help="scenario file (YAML)")
    check.set_defaults(command=_check)

    run = commands.add_parser("run", help="solve scenarios and write tables and figures", **words)
    run.add_argument("files", metavar="FILE", nargs="+", help="scenario file (YAML)")
    run.add_argument("--out", metavar="DIR", type=Path, required=True,
                     help="output directory; with several files each gets a directory of its name in it")
    run.add_argument("--overwrite", action="store_true", help="replace files of an earlier run")
    run.set_defaults(command=_run)

    compare = commands.add_parser("compare", help="solve scenarios and set them side by side", **words)
    compare.add_argument("files", metavar="FILE", nargs="+",
                         help="scenario file (YAML), two or more; ratios are to the first")
    compare.add_argument("--out", metavar="DIR", type=Path, required=True, help="output directory")
    compare.add_argument("--overwrite", action="store_true", help="replace files of an earlier comparison")
    compare.set_defaults(command=_compare)
    for command in (run, compare):
        command.add_argument("--no-certificate", dest="certificate", action="store_false",
                             help="do not estimate the numerical error; the tables then say so")

    template = commands.add_parser("template", help="print a scenario with every key explained", **words)
    template.set_defaults(command=_template)
    return parser


def _template(options):
    from twofluid.scenario import scenario_template

    _say(scenario_template())
    return 0


def _check(options):
    from twofluid.report import check_lines

    try:
        scenario, universe = _prepare(options.file)
    except RequestError as error:
        return _complain(error, STATUS_REFUSED)
    _say("\n".join(check_lines(scenario, universe)))
    return 0


def _run(options):
    from twofluid.solver import SolverFailure

    try:
        # Everything that can be refused is refused before the first equation is solved.
        scenarios = [_prepare(file)[0] for file in options.files]
        directories = _directories(options.files, options.out)
        for scenario, directory in zip(scenarios, directories, strict=True):
            _check_outputs(scenario, directory, options.overwrite)
    except RequestError as error:
        return _complain(error, STATUS_REFUSED)
    status = 0
    for file, scenario, directory in zip(options.files, scenarios, directories, strict=True):
        try:
            if not _solve_and_write(scenario, directory, options.certificate):
                status = STATUS_UNCERTAIN
        except SolverFailure as failure:
            return _complain(f"{file}: {failure}", STATUS_FAILED)
        except OSError as error:
            return _complain_of_writing(error, directory)
    return status


def _compare(options):
    from twofluid.comparison import align
    from twofluid.products import check_products
    from twofluid.registry import comparison_names
    from twofluid.solver import SolverFailure

    try:
        scenarios, universes = zip(*map(_prepare, options.files), strict=True)
        try:
            alignment = align(scenarios)
            for scenario, universe in zip(alignment.scenarios, universes, strict=True):
                check_products(scenario, universe)  # the options of the first have to suit every universe
            names = comparison_names(alignment)
        except ValueError as error:
            raise RequestError(f"compare: {error}") from error
        _check_place(names, options.out, options.overwrite)
    except RequestError as error:
        return _complain(error, STATUS_REFUSED)
    try:
        kept = _compare_and_write(scenarios, names, options.out, options.certificate)
    except SolverFailure as failure:
        return _complain(failure, STATUS_FAILED)
    except OSError as error:
        return _complain_of_writing(error, options.out)
    return 0 if kept else STATUS_UNCERTAIN


def _prepare(file):
    """Read a scenario and build its universe, landmarks and all."""
    from twofluid import read_scenario
    from twofluid.fluids import check_closure, check_dark_waves
    from twofluid.products import check_products
    from twofluid.scenario import ScenarioError
    from twofluid.universe import Universe

    try:
        scenario = read_scenario(file)
    except ScenarioError as error:
        raise RequestError(str(error)) from error
    try:
        universe = Universe(scenario.cosmology)
        _ = universe.landmarks  # a universe without them is refused now
        check_dark_waves(universe, scenario.sampling.wavenumbers)
    except ValueError as error:  # UniverseError is one
        raise RequestError(f"{file}: {error}") from error
    try:
        check_closure(scenario)
        check_products(scenario, universe)
    except ValueError as error:
        raise RequestError(f"{file}: {error}") from error
    return scenario, universe


def _directories(files, out):
    """Return the directory of each scenario's output."""
    if len(files) == 1:
        return [out]
    stems = [Path(file).stem for file in files]
    for number, stem in enumerate(stems):
        if stem in stems[:number]:
            both = f"{files[stems.index(stem)]} and {files[number]}"
            raise RequestError(f"{both} would both write to {out / stem}; rename one, or run them apart")
    return [out / stem for stem in stems]


def _check_outputs(scenario, directory, overwrite):
    from twofluid.registry import output_names

    try:
        names = output_names(scenario)
    except ValueError as error:
        raise RequestError(f"{scenario.source}: {error}") from error
    _check_place(names, directory, overwrite)


def _check_place(names, directory, overwrite):
    """Refuse a directory in which these files cannot be written, or stand already."""
    nearest = next(path for path in (directory, *directory.absolute().parents) if path.exists())
    if not nearest.is_dir():
        raise RequestError(f"--out: {nearest} is not a directory")
    if not os.access(nearest, os.W_OK | os.X_OK):
        raise RequestError(f"--out: no permission to write in {nearest}")
    present = [name for name in names if (directory / name).exists()]
    if present and not overwrite:
        names = ", ".join(present)
        raise RequestError(f"--out: {directory} already holds {names}; add --overwrite to replace them")


def _solve_and_write(scenario, directory, certificate):
    """Solve one scenario and write all it asks for; return whether its accuracy is what was promised."""
    from twofluid import certify, evolve
    from twofluid.registry import make_outputs, output_names
    from twofluid.report import progress_bar, run_lines

    history = evolve(scenario, progress=progress_bar(sys.stderr))
    if certificate:
        history = certify(history)
    outputs, summary = make_outputs(history)
    _write(outputs, output_names(scenario), directory)
    for warning in history.warnings:
        print(f"twofluid: warning: {warning}", file=sys.stderr)
    _say("\n".join([*run_lines(history), *summary, f"  written to {directory}: {', '.join(outputs)}"]))
    return _promise_kept(history)


def _compare_and_write(scenarios, names, directory, certificate):
    """Solve scenarios and write their comparison; return whether their accuracy is what was promised."""
    from dataclasses import replace

    from twofluid import certify, compare
    from twofluid.registry import make_comparison
    from twofluid.report import comparison_lines, progress_bar

    comparison = compare(scenarios, progress=progress_bar(sys.stderr))
    if certificate:
        comparison = replace(comparison, histories=tuple(certify(history) for history in comparison.histories))
    outputs, summary = make_comparison(comparison)
    _write(outputs, names, directory)
    for label, history in zip(comparison.labels, comparison.histories, strict=True):
        for warning in history.warnings:
            print(f"twofluid: warning: {label}: {warning}", file=sys.stderr)
    head = comparison_lines(comparison)
    _say("\n".join([*head, *summary, f"  written to {directory}: {', '.join(outputs)}"]))
    kept = [_promise_kept(history) for history in comparison.histories]  # each has its say
    return all(kept)


def _promise_kept(history):
    """Say so on stderr if the numerical error exceeds what was promised."""
    certificate = history.certificate
    if certificate is None or certificate.kept:
        return True
    print(f"twofluid: warning: {history.scenario.title}: {certificate.sentence()}", file=sys.stderr)
    return False


def _write(outputs, names, directory):
    """Write files, each all or nothing; what could have been made but was not does not stay from before."""
    from twofluid.files import write_file

    directory.mkdir(parents=True, exist_ok=True)
    for name, content in outputs.items():
        write_file(directory / name, content)
    for name in set(names) - set(outputs):
        (directory / name).unlink(missing_ok=True)


def _say(text):
    """Print; a reader who has gone away (`| head`) does not stop the work."""
    try:
        print(text.rstrip("\n"), flush=True)
    except BrokenPipeError:
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())


def _complain_of_writing(error, directory):
    return _complain(f"cannot write {error.filename or directory}: {error.strerror or error}", STATUS_FAILED)


def _complain(message, status):
    print(f"twofluid: error: {message}", file=sys.stderr)
    return status
