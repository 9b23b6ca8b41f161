"""Scenarios that start from another one: what is inherited, what is replaced, and what is refused where."""

import os
from dataclasses import replace
from pathlib import Path

import pytest
import yaml
from scenario_texts import VALUES, full_text, line_of, refusal, wavenumber_text

from twofluid.scenario import ScenarioError, parse_scenario, read_scenario, scenario_from_mapping
from twofluid.scenario.document import LARGEST_SIZE
from twofluid.scenario.family import MOST_BASES

BASE = full_text({"cosmology.cosmological_constant_fraction": None})
SHIPPED = Path(__file__).parents[2] / "scenarios"


@pytest.fixture
def child(tmp_path):
    """Return a function that reads changes made to a base."""
    (tmp_path / "base.yaml").write_text(BASE)

    def read(changes, base=None):
        if base is not None:
            (tmp_path / "base.yaml").write_text(base)
        (tmp_path / "child.yaml").write_text("base: base.yaml\n" + changes)
        return read_scenario(tmp_path / "child.yaml")

    return read


@pytest.fixture
def refused(child, tmp_path):
    """Return a function that gives the error of changes made to a base; its file by name alone."""

    def read(changes, base=None):
        with pytest.raises(ScenarioError) as caught:
            child(changes, base)
        assert str(caught.value).startswith(f"{caught.value.file}:{caught.value.line}: {caught.value.key}")
        return caught.value, os.path.relpath(caught.value.file, tmp_path)

    return read


def test_without_changes_everything_but_the_title_is_inherited(child):
    assert child("") == replace(parse_scenario(BASE), title="child")
    assert child("").source.endswith("child.yaml")
    assert child("").assumed == (*parse_scenario(BASE).assumed, "title")[::-1]


def test_a_change_inside_a_section_leaves_its_neighbours(child):
    scenario = child("cosmology:\n  neutrinos: {effective_number: 2}\n  baryon_density: 0.03\n")
    expected = full_text({
        "cosmology.cosmological_constant_fraction": None, "title": "child",
        "cosmology.neutrinos.effective_number": "2", "cosmology.baryon_density": "0.03",
    })  # fmt: skip
    assert scenario == parse_scenario(expected)


def test_a_list_replaces_a_list(child):
    assert child("sampling: {redshifts: [7]}\n").sampling.redshifts == (7.0,)


def test_a_range_replaces_a_range_as_a_whole(child, refused):
    changed = child("sampling: {wavenumbers: {from: 1 1/Mpc, to: 10 1/Mpc, per_decade: 2}}\n")
    assert len(changed.sampling.wavenumbers) == 3
    error, file = refused("sampling:\n  wavenumbers: {from: 1 1/Mpc, to: 10 1/Mpc}\n")
    assert (file, error.line, error.key) == ("child.yaml", 3, "sampling.wavenumbers.per_decade")
    assert error.rule == "is required"


def test_a_list_replaces_a_range_and_the_reverse(child):
    assert child("sampling: {wavenumbers: [3 1/Mpc]}\n").sampling.wavenumbers == (3.0,)
    changed = child("sampling: {wavenumbers: {from: 1 1/Mpc, to: 10 1/Mpc, per_decade: 1}}\n",
                    wavenumber_text("[3 1/Mpc]"))  # fmt: skip
    assert changed.sampling.wavenumbers == (1.0, 10.0)


@pytest.mark.parametrize("nothing", ["null", "~", "NULL"])
def test_null_takes_back_what_the_base_says(child, nothing):
    scenario = child(f"cosmology: {{curvature_fraction: {nothing}, cosmological_constant_fraction: 0.6}}\n")
    assert scenario.cosmology.curvature_fraction is None
    assert scenario.cosmology.cosmological_constant_fraction == 0.6
    assert "cosmology.curvature_fraction" in scenario.assumed


def test_null_cannot_take_back_what_is_not_there(refused):
    error, file = refused("cosmology:\n  cosmological_constant_fraction: null\n")
    assert (file, error.line, error.key) == ("child.yaml", 3, "cosmology.cosmological_constant_fraction")
    assert error.rule == "takes back what the base does not give"


def test_a_blank_is_no_null(refused):
    error, file = refused("cosmology:\n  photon_temperature:\n")
    assert (file, error.line, error.key) == ("child.yaml", 3, "cosmology.photon_temperature")
    assert error.rule == "has no value"


def test_a_required_key_can_be_taken_back_but_is_missed(refused):
    error, file = refused("cosmology:\n  hubble_constant: null\n")
    assert (file, error.line, error.key) == ("child.yaml", 2, "cosmology.hubble_constant")
    assert error.rule == "is required"


def test_null_and_braces_for_a_section(child):
    paths = [path for path in VALUES if path.startswith("primordial")]
    default = parse_scenario(full_text(dict.fromkeys(paths)))
    for nothing in ("null", "{}"):
        assert child(f"primordial: {nothing}\n").primordial == default.primordial
    assert child("primordial:\n").primordial == parse_scenario(BASE).primordial  # nothing said, nothing changed


def test_products_can_be_kept_changed_dropped_and_left_to_the_default(child):
    kept = child("").products
    assert kept["lag"] == {"fractions": (0.5, 0.9)}
    assert child("products: {lag: {fractions: [0.7]}}\n").products == kept | {"lag": {"fractions": (0.7,)}}
    assert child("products: {lag: null}\n").products == {name: kept[name] for name in kept if name != "lag"}
    assert child("products: {}\n").products == {}
    assert child("products: null\n").products == {"lag": {"fractions": (0.5, 0.9, 0.95, 0.99)}}


def test_a_default_product_has_to_be_dropped_with_braces(refused, child):
    silent = BASE.partition("products:")[0]
    assert refused("products: {lag: null}\n", silent)[0].rule == "takes back what the base does not give"
    assert child("products: {}\n", silent).products == {}


def test_blank_products_are_ambiguous_in_base_and_change(refused):
    assert refused("products:\n")[0].rule == "has no value"
    blank = BASE.partition("products:")[0] + "products:\n"
    for change in ("", "products: {lag: {}}\n"):
        error, file = refused(change, blank)
        assert (file, error.rule, error.line) == ("base.yaml", "has no value", len(blank.splitlines()))


def test_a_base_may_be_incomplete(child, refused):
    sampling = "sampling: {wavenumbers: [1 1/Mpc], redshifts: [9]}\n"
    cosmology = BASE.partition("sampling:")[0]
    assert child(sampling, cosmology).sampling.redshifts == (9.0,)
    error, file = refused("primordial: {tilt: 1}\n", cosmology)
    assert (file, error.key, error.rule) == ("child.yaml", "sampling.wavenumbers", "is required")


def test_grandparents(tmp_path):
    (tmp_path / "a.yaml").write_text(BASE)
    (tmp_path / "deep").mkdir()
    (tmp_path / "deep" / "b.yaml").write_text("base: ../a.yaml\ntitle: b\nprimordial: {tilt: 1, amplitude: 1e-9}\n")
    (tmp_path / "c.yaml").write_text("base: deep/b.yaml\nprimordial: {tilt: 1.1}\n")
    scenario = read_scenario(tmp_path / "c.yaml")
    assert scenario.title == "c"
    assert (scenario.primordial.tilt, scenario.primordial.amplitude, scenario.primordial.pivot) == (1.1, 1e-9, 0.002)


def test_the_mapping_of_a_child_stands_alone(child):
    scenario = child("primordial: {tilt: 1}\n")
    mapping = scenario.to_mapping()
    assert "base" not in mapping
    assert scenario_from_mapping(mapping) == scenario
    assert parse_scenario(yaml.safe_dump(mapping)) == scenario


# --- errors inside the base, at the base's line


@pytest.mark.parametrize(
    ("path", "value", "rule"),
    [
        ("cosmology.baryon_density", "-1", "is out of range"),
        ("cosmology.photon_temperature", "2.7", "needs a unit"),
        ("sampling.redshifts", "[10, 10.0]", "stands twice in the list"),
    ],
)
def test_a_wrong_value_is_reported_where_it_stands(refused, path, value, rule):
    base = full_text({path: value})
    error, file = refused("title: child\n", base)
    assert (file, error.line, error.key, error.rule) == ("base.yaml", line_of(path), path, rule)


def test_a_misspelt_key_of_the_base_is_reported_even_where_it_changes(refused):
    error, file = refused("cosmology: {baryon_density: 0.02}\n", BASE.replace("tilt:", "titl:"))
    assert (file, error.key, error.remedy) == ("base.yaml", "primordial.titl", "did you mean tilt?")
    error, file = refused("primordial: {tilt: 1}\n", BASE.replace("tilt:", "titl:"))
    assert (file, error.key) == ("base.yaml", "primordial.titl")


def test_a_section_of_the_base_must_hold_keys_though_it_is_changed(refused):
    error, file = refused("primordial: {tilt: 1}\n", "primordial: 5\n")
    assert (file, error.line, error.rule) == ("base.yaml", 1, "must hold keys")


def test_the_rules_of_text_hold_for_a_base(child, tmp_path):
    for text, rule in [
        ("title: &a x\n", "sets the anchor &a"),
        ("title: *a\n", "uses the alias *a"),
        ("", "is empty"),
        ("a: [\n", "is not valid YAML"),
        ("#" * LARGEST_SIZE + "\n", "is larger than 1000000 bytes"),
    ]:
        with pytest.raises(ScenarioError) as caught:
            child("", text)
        assert caught.value.file == str(tmp_path / "base.yaml")
        assert rule in caught.value.rule


# --- the chain itself


@pytest.mark.parametrize(
    ("value", "rule"),
    [
        ("none.yaml", "names {0}/none.yaml, which does not exist"),
        (".", "names {0}/., which is a directory"),
        ('"a\\0b"', "must be one line of printable text"),
        ("", "has no value"),
        ("null", "has no value"),
        ("[base.yaml]", "must be text"),
        ("child.yaml", "is this file itself"),
    ],
)
def test_a_base_that_is_none(tmp_path, value, rule):
    path = tmp_path / "child.yaml"
    path.write_text(f"title: x\nbase: {value}\n")
    with pytest.raises(ScenarioError) as caught:
        read_scenario(path)
    assert (caught.value.file, caught.value.line, caught.value.key) == (str(path), 2, "base")
    assert caught.value.rule == rule.format(tmp_path)


def test_a_circle_is_named_at_the_line_that_closes_it(tmp_path):
    for name, base in (("a", "b"), ("b", "c"), ("c", "./b")):
        (tmp_path / f"{name}.yaml").write_text(f"title: {name}\nbase: {base}.yaml\n")
    with pytest.raises(ScenarioError) as caught:
        read_scenario(tmp_path / "a.yaml")
    assert (caught.value.file, caught.value.line) == (str(tmp_path / "c.yaml"), 2)
    assert caught.value.rule == "rests on this file in turn"


def test_the_longest_chain(tmp_path):
    (tmp_path / "0.yaml").write_text(BASE)
    for number in range(1, MOST_BASES + 2):
        (tmp_path / f"{number}.yaml").write_text(f"base: {number - 1}.yaml\nprimordial: {{tilt: 0.9{number}}}\n")
    assert read_scenario(tmp_path / f"{MOST_BASES}.yaml").primordial.tilt == 0.98
    with pytest.raises(ScenarioError) as caught:
        read_scenario(tmp_path / f"{MOST_BASES + 1}.yaml")
    assert caught.value.rule == "makes a chain of more than 8 bases"
    assert caught.value.file == str(tmp_path / "1.yaml")


def test_only_a_file_has_a_base():
    error = refusal("base: other.yaml\n" + BASE)
    assert (error.line, error.key, error.value) == (1, "base", "other.yaml")
    assert "in a file only" in error.rule
    with pytest.raises(ScenarioError, match=r"^scenario: base = other\.yaml: can be given in a file only"):
        scenario_from_mapping({"base": "other.yaml"})


def test_a_misspelt_base_gets_its_name_offered():
    assert refusal("bsae: other.yaml\n" + BASE).remedy == "did you mean base?"


# --- the shipped family


def test_the_family_differs_from_its_baseline_in_what_it_says():
    baseline = read_scenario(SHIPPED / "saltmarsh-baseline.yaml")
    omega_b, omega_c = baseline.cosmology.baryon_density, baseline.cosmology.dark_matter_density
    changes = {
        "no-dark-matter": {"dark_matter_density": 0.0},
        "no-dark-matter-open": {"dark_matter_density": 0.0, "cosmological_constant_fraction": 0.68869},
        "all-baryons": {"dark_matter_density": 0.0, "baryon_density": round(omega_b + omega_c, 4)},
        "half-dark-matter": {"dark_matter_density": omega_c / 2},
        "twice-baryons": {"baryon_density": 2 * omega_b},
    }
    for name, change in changes.items():
        scenario = read_scenario(SHIPPED / f"saltmarsh-{name}.yaml")
        assert scenario.title != baseline.title
        assert replace(scenario, title=baseline.title) == replace(
            baseline, cosmology=replace(baseline.cosmology, **change)
        ), name
