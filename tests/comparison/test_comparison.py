"""What several scenarios have in common to ask for, in which inputs they differ, and solving them side by side."""

from dataclasses import replace

import numpy as np
import pytest

import twofluid
from twofluid.comparison import align, compare, input_differences
from twofluid.scenario import Cosmology, Primordial, Sampling, Scenario
from twofluid.solver import SolverFailure


def scenario(title="one", k=(0.1, 1.0, 10.0), z=(100.0, 10.0), products=None, source=None, **cosmology):
    densities = {"hubble_constant": 67.5, "baryon_density": 0.0223, "dark_matter_density": 0.1195} | cosmology
    products = {"lag": {"fractions": (0.5,)}} if products is None else products
    return Scenario(title, Cosmology(**densities), Primordial(), Sampling(k, z), products, source=source)


def test_equal_samplings_are_kept_without_a_word():
    one, two = scenario(), scenario("two", baryon_density=0.03)
    alignment = align([one, two])
    assert alignment.scenarios == (one, two)
    assert alignment.labels == ("one", "two")
    assert alignment.notes == ()


def test_the_first_sampling_is_cut_to_what_all_have():
    alignment = align([
        scenario(k=(10.0, 0.1, 1.0, 3.0), z=(100.0, 30.0, 10.0)),
        scenario("two", k=(0.5, 20.0), z=(10.0, 100.0)),
        scenario("three", k=(3.0 * (1 - 1e-12), 0.01), z=(100.0, 10.0 * (1 + 1e-12), 0.0)),
    ])  # fmt: skip
    for aligned in alignment.scenarios:
        assert aligned.sampling == Sampling((1.0, 3.0), (100.0, 10.0))
    assert "2 of the 4 wavenumbers of 'one'" in alignment.notes[0]
    assert alignment.notes[1].endswith("100, 10")


@pytest.mark.parametrize(
    ("other", "told"),
    [
        ({"k": (20.0, 30.0)}, "no wavenumber of 'one' .*'one' 0.1 to 10 1/Mpc; 'two' 20 to 30 1/Mpc"),
        ({"k": (0.5,)}, "no wavenumber of 'one'"),  # inside the range of the first, but not one of its own
        ({"z": (50.0, 0.0)}, "no redshift of 'one' .*'one' 100, 10; 'two' 50, 0"),
    ],
)
def test_nothing_in_common(other, told):
    with pytest.raises(ValueError, match=told):
        align([scenario(), scenario("two", **other)])


def test_one_is_not_enough():
    with pytest.raises(ValueError, match="at least two"):
        align([scenario()])


def test_labels_are_titles_then_files_then_paths():
    twin = scenario(source="a/one.yaml")
    assert align([twin, scenario(source="a/two.yaml")]).labels == ("one", "two")
    assert align([twin, scenario(source="b/one.yaml")]).labels == ("a/one.yaml", "b/one.yaml")
    with pytest.raises(ValueError, match=r"a/one\.yaml is given twice"):
        align([twin, twin])


def test_products_are_those_of_all_with_the_options_of_the_first():
    other = scenario("two", products={"lag": {"fractions": (0.9,)}, "extra": {}})
    alignment = align([scenario(), other])
    assert [aligned.products for aligned in alignment.scenarios] == [{"lag": {"fractions": (0.5,)}}] * 2
    assert alignment.notes == (
        "products not every scenario asks for are left out: extra",
        "the options of lag are those of 'one'",
    )


def test_only_inputs_that_differ_are_named():
    one = scenario()
    two = replace(scenario("two", z=(1.0,), curvature_fraction=0.1, baryon_density=0.03), primordial=Primordial(tilt=1))
    assert input_differences([one, two, one]) == {
        "cosmology.baryon_density": (0.0223, 0.03, 0.0223),
        "cosmology.curvature_fraction": (None, 0.1, None),
        "primordial.tilt": (0.965, 1.0, 0.965),
    }


def test_each_scenario_is_solved_as_it_is_alone():
    scenarios = [scenario(k=(0.3, 1.0)), scenario("two", k=(0.3, 1.0), dark_matter_density=0.06)]
    shares = []
    comparison = twofluid.compare(scenarios, progress=lambda done, total: shares.append(done / total))
    for history, alone in zip(comparison.histories, scenarios, strict=True):
        # Round-off only: the modes of all scenarios march side by side.
        np.testing.assert_allclose(history.delta_baryon, twofluid.evolve(alone).delta_baryon, rtol=1e-9)
    assert shares == sorted(shares)
    assert shares[-1] == 1


def test_a_failure_names_its_scenario(monkeypatch):
    def integrate(*arguments):
        raise SolverFailure("the solution is no longer finite", mode=0, time=300.0)

    monkeypatch.setattr("twofluid.evolution.integrate", integrate)
    with pytest.raises(SolverFailure, match=r"^one: the integration failed at k = .*: the solution is no") as caught:
        compare([scenario(), scenario("two")])
    assert (caught.value.mode, caught.value.time) == (0, 300.0)
