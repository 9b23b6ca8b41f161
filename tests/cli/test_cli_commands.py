"""The command line from end to end, on a scenario small enough to solve in a moment."""

import errno
import os
import subprocess
import sys
from pathlib import Path

import numpy as np
import pytest
import yaml
from astropy.table import Table

import twofluid
from twofluid import cli
from twofluid.scenario import parse_scenario, scenario_template
from twofluid.solver import SolverFailure

TINY = """\
title: Saltmarsh tiny
cosmology:
  hubble_constant: 67.5 km/(s Mpc)
  baryon_density: 0.0223
  dark_matter_density: 0.1195
sampling:
  wavenumbers: [0.05 1/Mpc, 1 1/Mpc, 20 1/Mpc]
  redshifts: [100, 20]
products:
  lag: {fractions: [0.5, 0.955]}
"""
OUTPUTS = ["catchup.ecsv", "evolution.ecsv", "lag.ecsv", "lag.pdf", "lag.png"]


@pytest.fixture
def scenario_file(tmp_path):
    path = tmp_path / "tiny.yaml"
    path.write_text(TINY)
    return path


@pytest.fixture
def lean_file(tmp_path):
    """A scenario without products, so that nothing is drawn."""
    path = tmp_path / "lean.yaml"
    path.write_text(TINY.partition("products:")[0] + "products: {}\n")
    return path


@pytest.fixture(scope="module")
def finished(tmp_path_factory):
    """Output directory of one run of the tiny scenario, only to be read."""
    place = tmp_path_factory.mktemp("finished")
    (place / "tiny.yaml").write_text(TINY)
    assert run("run", place / "tiny.yaml", "--out", place / "out") == 0
    return place / "out"


@pytest.fixture
def out(tmp_path):
    return tmp_path / "results" / "first"


@pytest.fixture
def nothing_solved(monkeypatch):
    """Let the test fail if anything is solved."""

    def evolve(*arguments, **options):
        raise AssertionError("solved, though the request should have been refused")

    monkeypatch.setattr(twofluid, "evolve", evolve)


def run(*arguments, certificate=False):
    """Run the program, without a certificate where nothing depends on it: that saves time."""
    if arguments[:1] in (("run",), ("compare",)) and not certificate:
        arguments = (*arguments, "--no-certificate")
    return cli.main([str(argument) for argument in arguments])


def check_refused(capsys, out, status, *told):
    assert status == 2
    shown = capsys.readouterr()
    assert shown.out == ""
    assert shown.err.startswith("twofluid: error: ")
    assert shown.err.count("\n") == 1
    for text in told:
        assert text in shown.err
    assert not out.exists()


def test_run_writes_everything_and_says_so(scenario_file, out, capsys):
    assert run("run", scenario_file, "--out", out) == 0
    assert sorted(os.listdir(out)) == OUTPUTS
    shown = capsys.readouterr()
    assert shown.err == ""  # no terminal, so no progress
    lines = shown.out.splitlines()
    assert lines[0] == "Saltmarsh tiny"
    assert "3 wavenumbers from 0.05 to 20 1/Mpc, 2 redshifts from 100 to 20" in lines[1]
    assert str(out) in lines[-1]
    table = Table.read(out / "lag.ecsv")
    assert (f"{table['ratio'][0]:.4f}") in shown.out
    catchup = Table.read(out / "catchup.ecsv")
    assert f"{catchup['redshift_at_95p5_percent'][0]:.5g}" in shown.out


def test_tables_carry_a_scenario_that_can_be_run_again(finished):
    asked = parse_scenario(TINY)
    for name in ("evolution", "lag", "catchup"):
        meta = Table.read(finished / f"{name}.ecsv").meta
        assert parse_scenario(yaml.safe_dump(meta["scenario"])) == asked
        assert meta["program"] == f"twofluid {twofluid.__version__}"
        assert any(text.startswith("cosmology.photon_temperature = 2.7255") for text in meta["assumed"])


def test_tables_agree_with_the_python_interface(scenario_file, finished):
    history = twofluid.evolve(twofluid.read_scenario(scenario_file))
    table = Table.read(finished / "evolution.ecsv")
    assert table["wavenumber"].tolist() == [0.05, 0.05, 1, 1, 20, 20]
    assert table["redshift"].tolist() == [100, 20] * 3
    for name in ("delta_dark", "delta_baryon", "theta_baryon", "delta_gas_temperature"):
        assert np.array_equal(table[name], getattr(history, name).ravel())  # every bit
    # b at the redshift of catching up, interpolated by the history itself.
    catchup = Table.read(finished / "catchup.ecsv")
    for mode, redshift in enumerate(catchup["redshift_at_50_percent"]):
        ratio = history.at("delta_baryon", redshift) / history.at("delta_dark", redshift)
        assert ratio[mode, 0] == pytest.approx(0.5, rel=1e-9)  # the same interpolant, to round-off of 1 + z


def test_the_same_run_gives_the_same_bytes(scenario_file, finished, out):
    run("run", scenario_file, "--out", out)
    for name in OUTPUTS:
        assert (out / name).read_bytes() == (finished / name).read_bytes(), name


def test_without_dark_matter_there_is_nothing_to_lag_behind(tmp_path, out, capsys):
    path = tmp_path / "bare.yaml"
    path.write_text(TINY.replace("0.1195", "0"))
    out.mkdir(parents=True)
    (out / "lag.pdf").write_text("figure of an earlier run")
    assert run("run", path, "--out", out, "--overwrite") == 0
    assert sorted(os.listdir(out)) == ["catchup.ecsv", "evolution.ecsv", "lag.ecsv"]
    assert "no dark matter" in capsys.readouterr().out
    assert Table.read(out / "evolution.ecsv")["delta_dark"].mask.all()
    assert "no dark matter" in Table.read(out / "lag.ecsv").meta["no_dark_matter"]


def test_several_files_get_a_directory_each(lean_file, tmp_path, out):
    other = tmp_path / "other.yaml"
    other.write_text(lean_file.read_text().replace("1 1/Mpc", "2 1/Mpc"))
    assert run("run", lean_file, other, "--out", out) == 0
    assert sorted(os.listdir(out)) == ["lean", "other"]
    wavenumbers = [Table.read(out / name / "evolution.ecsv")["wavenumber"][2] for name in ("lean", "other")]
    assert wavenumbers == [1, 2]


def test_files_of_one_name_are_refused(scenario_file, tmp_path, out, capsys, nothing_solved):
    twin = tmp_path / "elsewhere" / "tiny.yaml"
    twin.parent.mkdir()
    twin.write_text(TINY)
    check_refused(capsys, out, run("run", scenario_file, twin, "--out", out), str(scenario_file), str(twin))


def test_all_files_are_checked_before_any_is_solved(scenario_file, tmp_path, out, capsys, nothing_solved):
    bad = tmp_path / "bad.yaml"
    bad.write_text(TINY.replace("baryon_density: 0.0223", "baryon_density: -1"))
    status = run("run", scenario_file, bad, "--out", out)
    check_refused(capsys, out, status, "bad.yaml:4", "cosmology.baryon_density = -1")


def test_a_universe_that_cannot_be_is_refused(tmp_path, out, capsys, nothing_solved):
    path = tmp_path / "odd.yaml"
    both = "\n  curvature_fraction: 0.3\n  cosmological_constant_fraction: 0.9"
    path.write_text(TINY.replace("dark_matter_density: 0.1195", "dark_matter_density: 0.1195" + both))
    check_refused(capsys, out, run("run", path, "--out", out), "odd.yaml")


@pytest.mark.parametrize("command", ["run", "check"])
def test_too_many_waves_of_the_dark_matter_are_refused(tmp_path, out, capsys, nothing_solved, command):
    path = tmp_path / "warm.yaml"
    warm = "  dark_matter: {sound_speed: 100 km/s, scaling: 0.5}\n"
    path.write_text(TINY.replace("sampling:", f"{warm}sampling:").replace("20 1/Mpc", "2000 1/Mpc"))
    arguments = (command, path) if command == "check" else (command, path, "--out", out)
    told = ("warm.yaml", "at k = 2000 1/Mpc", "sound waves of the dark matter", "cosmology.dark_matter.sound_speed")
    check_refused(capsys, out, run(*arguments), *told)


def test_missing_file_is_refused(tmp_path, out, capsys):
    check_refused(capsys, out, run("check", tmp_path / "none.yaml"), "none.yaml")


def test_existing_outputs_are_refused_by_name(scenario_file, out, capsys, nothing_solved):
    out.mkdir(parents=True)
    (out / "lag.ecsv").write_text("precious")
    assert run("run", scenario_file, "--out", out) == 2
    message = capsys.readouterr().err
    assert "lag.ecsv" in message
    assert "--overwrite" in message
    assert "evolution.ecsv" not in message
    assert (out / "lag.ecsv").read_text() == "precious"
    assert os.listdir(out) == ["lag.ecsv"]


def test_overwrite_replaces_outputs_and_leaves_the_rest(lean_file, out):
    out.mkdir(parents=True)
    (out / "evolution.ecsv").write_text("old")
    (out / "notes.txt").write_text("mine")
    assert run("run", lean_file, "--out", out, "--overwrite") == 0
    assert (out / "evolution.ecsv").read_text().startswith("# %ECSV")
    assert (out / "notes.txt").read_text() == "mine"


def test_output_directory_that_is_a_file_is_refused(scenario_file, capsys, nothing_solved):
    assert run("run", scenario_file, "--out", scenario_file / "sub") == 2
    assert f"{scenario_file} is not a directory" in capsys.readouterr().err


def test_solver_failure_is_status_one_with_its_sentence(scenario_file, out, capsys, monkeypatch):
    def evolve(scenario, **options):
        raise SolverFailure("the integration failed at k = 20 1/Mpc, z = 900", mode=2, time=1.0)

    monkeypatch.setattr(twofluid, "evolve", evolve)
    assert run("run", scenario_file, "--out", out) == 1
    shown = capsys.readouterr()
    assert shown.err == f"twofluid: error: {scenario_file}: the integration failed at k = 20 1/Mpc, z = 900\n"
    assert shown.out == ""
    assert not out.exists()


def test_full_disk_is_status_one_and_names_the_file(lean_file, out, capsys, monkeypatch):
    def full(*arguments):
        raise OSError(errno.ENOSPC, "No space left on device")

    monkeypatch.setattr(os, "fsync", full)
    assert run("run", lean_file, "--out", out) == 1
    message = capsys.readouterr().err
    assert message == f"twofluid: error: cannot write {out / 'evolution.ecsv'}: No space left on device\n"
    assert os.listdir(out) == []


def test_interrupt_is_status_130_and_leaves_nothing(scenario_file, out, capsys, monkeypatch):
    def evolve(scenario, **options):
        raise KeyboardInterrupt

    monkeypatch.setattr(twofluid, "evolve", evolve)
    assert run("run", scenario_file, "--out", out) == 130
    assert "interrupted" in capsys.readouterr().err
    assert not out.exists()


def test_warnings_go_to_the_error_stream_and_the_tables(lean_file, out, capsys, monkeypatch):
    from dataclasses import replace

    solve = twofluid.evolve

    def evolve(scenario, **options):
        return replace(solve(scenario, **options), warnings=("mind the gap",))

    monkeypatch.setattr(twofluid, "evolve", evolve)
    assert run("run", lean_file, "--out", out) == 0
    assert capsys.readouterr().err == "twofluid: warning: mind the gap\n"
    assert Table.read(out / "evolution.ecsv").meta["warnings"] == ["mind the gap"]


def test_check_shows_landmarks_and_what_was_assumed_and_solves_nothing(scenario_file, capsys, nothing_solved):
    assert run("check", scenario_file) == 0
    shown = capsys.readouterr().out
    landmarks = twofluid.read_scenario(scenario_file).cosmology
    universe = twofluid.universe.Universe(landmarks)
    (line,) = [line for line in shown.splitlines() if "drag_sound_horizon" in line]
    name, symbol, value, unit, meaning = line.split(maxsplit=4)
    assert (name, symbol, unit) == ("drag_sound_horizon", "r_drag", "Mpc")
    assert float(value) == pytest.approx(universe.landmarks.drag_sound_horizon, rel=1e-5)  # six digits shown
    assert meaning == "comoving sound horizon at the drag epoch"
    assert "cosmology.helium_mass_fraction = 0.2454" in shown
    assert "cosmology.baryon_density" not in shown  # the file says it


EVERY_PRODUCT = """\
  growth: {reference_redshift: 100}
  spheres: {radii: [1 Mpc], masses: [1e9 solMass]}
  shortfall: {target_redshift: 10, radii: [2 Mpc]}
"""
WIDE = TINY.replace("[0.05 1/Mpc, 1 1/Mpc, 20 1/Mpc]", "{from: 0.005 1/Mpc, to: 50 1/Mpc, per_decade: 12}")


def test_growth_spheres_and_shortfall_from_the_command_line(tmp_path, out, capsys):
    path = tmp_path / "wide.yaml"
    path.write_text(WIDE + EVERY_PRODUCT)
    assert run("run", path, "--out", out) == 0
    tables = {name: Table.read(out / f"{name}.ecsv") for name in ("growth", "spheres", "shortfall", "contrast")}
    assert tables["growth"].meta["reference_redshift"] == 100
    assert tables["shortfall"].meta["target_redshift"] == 10
    assert len(tables["spheres"]) == 4
    assert tables["shortfall"]["sphere_radius"].compressed().tolist() == [2, 2, 2]
    for name in ("growth", "spheres", "shortfall"):
        assert (out / f"{name}.pdf").stat().st_size > 5000
        assert (out / f"{name}.png").stat().st_size > 5000
    shown = capsys.readouterr()
    assert shown.err == ""
    assert "growth of matter since z = 100  z = 100  z = 20" in shown.out
    assert f"{tables['growth']['growth_matter'][1]:.5g}" in shown.out
    assert f"{tables['spheres']['sigma_matter'][1]:.4g}" in shown.out
    needed = tables["shortfall"]["rms_needed"][0]
    assert f"order unity by z = 10 takes an rms contrast of {needed:.3g} at decoupling" in shown.out
    assert "never by today" in shown.out
    assert "R = 2 Mpc" in shown.out


def test_growth_spheres_and_shortfall_without_dark_matter(tmp_path, out, capsys):
    path = tmp_path / "bare.yaml"
    path.write_text(WIDE.replace("0.1195", "0").replace("to: 50", "to: 2") + EVERY_PRODUCT)
    assert run("run", path, "--out", out) == 0
    shown = capsys.readouterr().out
    assert "shortfall: this universe has no dark matter" in shown
    assert "never: growth stops at z = " in shown  # waves that were damped before decoupling
    assert "nan" not in shown
    for name, columns in {"growth": ["rate_dark"], "spheres": ["sigma_dark"], "contrast": ["rms_dark"]}.items():
        table = Table.read(out / f"{name}.ecsv")
        assert all(table[column].mask.all() for column in columns)
        assert "no dark matter" in table.meta["no_dark_matter"]


def test_spheres_no_run_covers_are_said_and_not_drawn(tmp_path, out, capsys):
    path = tmp_path / "few.yaml"
    path.write_text(TINY + "  spheres: {}\n")
    assert run("run", path, "--out", out) == 0
    assert "spheres need at least 8 wavenumbers" in capsys.readouterr().out
    assert Table.read(out / "spheres.ecsv")["sigma_matter"].mask.all()
    assert not (out / "spheres.pdf").exists()


@pytest.mark.parametrize("command", ["run", "check"])
@pytest.mark.parametrize(
    ("product", "told"),
    [
        ("shortfall: {target_redshift: 1100}", "products.shortfall.target_redshift = 1100 must lie between"),
        ("shortfall: {target_redshift: -0.5}", "products.shortfall.target_redshift = -0.5: is out of range"),
        ("growth: {reference_redshift: 2e6}", "products.growth.reference_redshift = 2e6: is out of range"),
        ("spheres: {radii: [8]}", "products.spheres.radii = 8: needs a unit"),
    ],
)
@pytest.mark.usefixtures("nothing_solved")
def test_product_options_are_refused_before_anything_is_solved(tmp_path, out, capsys, command, product, told):
    path = tmp_path / "odd.yaml"
    path.write_text(TINY + f"  {product}\n")
    arguments = ("--out", out) if command == "run" else ()
    check_refused(capsys, out, run(command, path, *arguments), told, "odd.yaml")


@pytest.mark.usefixtures("nothing_solved")
def test_reference_before_the_start_of_the_run_is_refused(tmp_path, out, capsys):
    # So much radiation that matter took over at redshift 2: the waves start when matter is 4e-6 of radiation.
    path = tmp_path / "hot.yaml"
    text = TINY.replace("0.0223", "0.0001").replace("0.1195", "0.00005").replace("[0.05", "[0.001")
    path.write_text(text + "  growth: {reference_redshift: 1e6}\n")
    status = run("run", path, "--out", out)
    check_refused(capsys, out, status, "products.growth.reference_redshift = 1e+06 must be at most", "started")


@pytest.mark.usefixtures("nothing_solved")
def test_options_of_the_first_have_to_suit_every_universe_compared(tmp_path, out, capsys):
    # Many baryons recombine earlier: drag epochs at redshifts 1172 and 1055 (see the error for the second).
    for name, density, target in (("rich", "0.14", 1100), ("poor", "0.0223", 10)):
        text = TINY.replace("0.0223", density) + f"  shortfall: {{target_redshift: {target}}}\n"
        (tmp_path / f"{name}.yaml").write_text(text.replace("tiny", name))
    status = run("compare", tmp_path / "rich.yaml", tmp_path / "poor.yaml", "--out", out)
    check_refused(capsys, out, status, "compare: products.shortfall.target_redshift = 1100 must lie between")


def test_progress_is_drawn_on_a_terminal_and_wiped():
    from io import StringIO

    from twofluid.report import progress_bar

    class Terminal(StringIO):
        def isatty(self):
            return True

    terminal = Terminal()
    show = progress_bar(terminal)
    show(1, 4)
    assert "[==========" in terminal.getvalue()
    assert "25 %" in terminal.getvalue()
    show(4, 4)
    assert terminal.getvalue().endswith("\r")
    assert progress_bar(StringIO()) is None


def test_template_is_a_scenario(capsys):
    assert run("template") == 0
    shown = capsys.readouterr().out
    assert shown.rstrip("\n") == scenario_template().rstrip("\n")
    parse_scenario(shown)


def test_version(capsys):
    with pytest.raises(SystemExit) as ended:
        run("--version")
    assert ended.value.code == 0
    assert capsys.readouterr().out == f"twofluid {twofluid.__version__}\n"


@pytest.mark.parametrize(
    "arguments", [[], ["fly"], ["run", "a.yaml"], ["run", "--out", "x"], ["run", "a.yaml", "--ou", "x"]]
)
def test_usage_errors_are_status_two(arguments, capsys):
    with pytest.raises(SystemExit) as ended:
        run(*arguments)
    assert ended.value.code == 2
    assert "usage: twofluid" in capsys.readouterr().err


def process(*arguments, **options):
    """A process of the program as a module, from anywhere."""
    environment = os.environ | {"PYTHONPATH": str(Path(twofluid.__file__).parents[1])}
    return subprocess.Popen(
        [sys.executable, *map(str, arguments)], env=environment,
        stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True, **options,
    )  # fmt: skip


def test_module_is_the_same_program(scenario_file, capsys):
    shown, _ = process("-m", "twofluid", "check", scenario_file).communicate()
    run("check", scenario_file)
    assert shown == capsys.readouterr().out


def test_reader_who_goes_away_is_no_error():
    program = process("-m", "twofluid", "template")
    program.stdout.close()
    assert program.stderr.read() == ""
    program.stderr.close()
    assert program.wait() == 0


def test_checking_loads_neither_figures_nor_tables(scenario_file):
    code = (
        "import sys; from twofluid.cli import main; main(['check', sys.argv[1]]); "
        "sys.exit(sum(name in sys.modules for name in ('matplotlib', 'astropy.table', 'astropy.cosmology')))"
    )
    program = process("-c", code, scenario_file)
    program.communicate()
    assert program.returncode == 0


def test_run_with_the_other_closure(scenario_file, out, capsys):
    scenario_file.write_text(TINY + "method: {closure: sound-speed}\n")
    assert run("run", scenario_file, "--out", out) == 0
    assert sorted(os.listdir(out)) == OUTPUTS
    assert "closure sound-speed is a small model" in capsys.readouterr().err
    for name in ("evolution", "lag", "catchup"):
        assert Table.read(out / f"{name}.ecsv").meta["closure"] == "sound-speed"


def test_an_unknown_closure_is_refused(scenario_file, out, capsys, nothing_solved):
    scenario_file.write_text(TINY + "method: {closure: sound speed}\n")
    told = "tiny.yaml:11: method.closure = sound speed: must be kinetic or sound-speed; did you mean sound-speed?"
    check_refused(capsys, out, run("run", scenario_file, "--out", out), told)


def test_a_bad_thermal_table_is_refused_with_its_line(tmp_path, capsys, nothing_solved):
    heading = "# %ECSV 1.0\n# ---\n# datatype:\n# - {name: redshift, datatype: float64}\n"
    heading += "# - {name: gas_temperature, unit: K, datatype: float64}\n"
    heading += "# - {name: electron_fraction, datatype: float64}\n"
    rows = "redshift gas_temperature electron_fraction\n0 1e4 1\n0.5 1e4 1\n1 -1e4 1\n1.5 1e4 1\n2 1e4 1\n"
    (tmp_path / "heating.ecsv").write_text(heading + rows)
    scenario = tmp_path / "heated.yaml"
    scenario.write_text(
        "cosmology: {hubble_constant: 70 km/(s Mpc), baryon_density: 0.02, dark_matter_density: 0.1}\n"
        "sampling: {wavenumbers: 0.1 1/Mpc, redshifts: [20]}\nthermal: {table: heating.ecsv, below_redshift: 1.5}\n"
    )
    assert run("run", scenario, "--out", tmp_path / "out") == 2
    told = capsys.readouterr().err
    assert told.count("\n") == 1
    assert f"{tmp_path / 'heating.ecsv'}:10: thermal.table.gas_temperature = -10000.0 K: is out of range" in told
    assert not (tmp_path / "out").exists()


def test_certificate_is_printed_and_stands_in_the_header(lean_file, out, capsys):
    assert run("run", lean_file, "--out", out, certificate=True) == 0
    assert "  numerical error of the lag ratio: " in capsys.readouterr().out
    assert Table.read(out / "evolution.ecsv").meta["certificate"].startswith("numerical error of the lag ratio: ")


def test_without_a_certificate_the_header_says_so(lean_file, out, capsys):
    assert run("run", lean_file, "--out", out) == 0
    assert "numerical error" not in capsys.readouterr().out
    assert Table.read(out / "evolution.ecsv").meta["certificate"].startswith("none: ")


def test_a_broken_promise_is_status_three_with_the_tables_written_and_marked(lean_file, out, capsys, monkeypatch):
    from dataclasses import replace

    from twofluid.fluids import ACCURACIES

    monkeypatch.setitem(ACCURACIES, "standard", replace(ACCURACIES["standard"], promise=1e-12))
    assert run("run", lean_file, "--out", out, certificate=True) == 3
    assert "EXCEEDS the promised 1e-12" in capsys.readouterr().err
    assert "EXCEEDS the promised 1e-12" in Table.read(out / "evolution.ecsv").meta["certificate"]
