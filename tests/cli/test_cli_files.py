"""Files appear complete or not at all."""

import errno
import os

import pytest
from matplotlib.figure import Figure

from twofluid.files import replace_atomically, save_figure, write_file
from twofluid.scenario import Cosmology, Primordial, Sampling, Scenario


@pytest.fixture
def scenario():
    cosmology = Cosmology(hubble_constant=67.5, baryon_density=0.0223, dark_matter_density=0.1195)
    return Scenario("Saltmarsh tiny", cosmology, Primordial(), Sampling((0.1,), (10.0,)))


def test_new_file_holds_what_was_written(tmp_path):
    write_file(tmp_path / "a.txt", b"new")
    assert (tmp_path / "a.txt").read_bytes() == b"new"
    assert os.listdir(tmp_path) == ["a.txt"]


def test_new_file_has_the_permissions_of_any_new_file(tmp_path):
    write_file(tmp_path / "ours", b"")
    (tmp_path / "plain").write_bytes(b"")
    assert (tmp_path / "ours").stat().st_mode == (tmp_path / "plain").stat().st_mode


@pytest.mark.parametrize("trouble", [RuntimeError, KeyboardInterrupt])
def test_trouble_while_writing_leaves_the_old_file(tmp_path, trouble):
    target = tmp_path / "a.txt"
    target.write_bytes(b"old")
    with pytest.raises(trouble), replace_atomically(target) as file:
        file.write(b"half of the ne")
        raise trouble
    assert target.read_bytes() == b"old"
    assert os.listdir(tmp_path) == ["a.txt"]


@pytest.mark.parametrize("call", ["fsync", "replace"])
def test_full_disk_leaves_the_old_file_and_names_it(tmp_path, monkeypatch, call):
    target = tmp_path / "a.txt"
    target.write_bytes(b"old")

    def full(*arguments):
        raise OSError(errno.ENOSPC, "No space left on device")

    monkeypatch.setattr(os, call, full)
    with pytest.raises(OSError, match=r"No space left on device.*a\.txt") as caught:
        write_file(target, b"new")
    assert caught.value.errno == errno.ENOSPC
    assert target.read_bytes() == b"old"
    assert os.listdir(tmp_path) == ["a.txt"]


def test_missing_directory_is_an_os_error_that_names_the_file(tmp_path):
    with pytest.raises(FileNotFoundError, match=r"none/a\.txt"):
        write_file(tmp_path / "none" / "a.txt", b"new")


@pytest.mark.parametrize("form", ["pdf", "png"])
def test_figure_carries_the_scenario_and_is_the_same_every_time(tmp_path, scenario, form):
    figure = Figure()
    figure.add_subplot().plot([1, 2])
    save_figure(figure, tmp_path / f"one.{form}", scenario)
    save_figure(figure, tmp_path / f"two.{form}", scenario)
    content = (tmp_path / f"one.{form}").read_bytes()
    assert content == (tmp_path / f"two.{form}").read_bytes()
    for text in (b"Saltmarsh tiny", b"baryon_density: 0.0223", b"twofluid "):
        assert text in content
    assert b"CreationDate" not in content


def test_figure_format_must_be_known(tmp_path, scenario):
    with pytest.raises(ValueError, match="'jpg' is none of pdf, png"):
        save_figure(Figure(), tmp_path / "a.jpg", scenario)
    assert os.listdir(tmp_path) == []
