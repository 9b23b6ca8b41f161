"""The way out and back: mapping, YAML, template, key table and the shipped scenarios."""

import re
from dataclasses import FrozenInstanceError, replace
from pathlib import Path

import numpy
import pytest
import yaml
from scenario_texts import NO_PRODUCTS, full_text, wavenumber_text

from twofluid.scenario import (
    Cosmology,
    Method,
    Neutrinos,
    Primordial,
    Sampling,
    Scenario,
    ScenarioError,
    Share,
    key_table_markdown,
    parse_scenario,
    read_scenario,
    scenario_from_mapping,
    scenario_template,
)
from twofluid.scenario.document import entry_from_text
from twofluid.scenario.keys import (
    BASE,
    DEFAULT_PRODUCTS,
    GAS_SECTIONS,
    INITIAL_MODES,
    KEY_AT,
    KEYS,
    MIXTURE,
    SECTIONS,
    Kind,
)
from twofluid.scenario.values import read_value

SHIPPED = sorted((Path(__file__).parents[2] / "scenarios").glob("*.yaml"))
TEXTS = {
    "full": full_text(),
    "list": wavenumber_text("[5 1/Mpc, 0.1 1/Mpc, 1e-3 1/kpc]"),
    "single": wavenumber_text("0.1234567890123456 1/Mpc"),
    "template": scenario_template(),
    "two points": full_text({"sampling.wavenumbers.per_decade": "0.01"}),
    "odd density": full_text({"sampling.wavenumbers.per_decade": "66.66"}),
    "no products": full_text({"products": "{}"} | NO_PRODUCTS),
    "no spheres named": full_text({"products.spheres.radii": None, "products.shortfall.masses": None}),
    "odd title": full_text({"title": '"5: # no"'}),
} | {path.name: path.read_text() for path in SHIPPED if "\nbase:" not in path.read_text()}


@pytest.mark.parametrize("text", TEXTS.values(), ids=TEXTS)
def test_round_trip_through_mapping_and_yaml(text):
    scenario = parse_scenario(text)
    mapping = scenario.to_mapping()
    written = yaml.safe_dump(mapping)
    again = parse_scenario(written)
    assert again == scenario
    assert yaml.safe_load(written) == mapping
    assert scenario_from_mapping(mapping) == scenario
    assert again.to_mapping() == mapping
    assert all(KEY_AT[key].default is None for key in again.assumed)  # all else is spelled out


def test_quantities_carry_their_units_in_the_mapping():
    mapping = parse_scenario(full_text()).to_mapping()
    assert mapping["cosmology"]["hubble_constant"] == "67.5 km/(s Mpc)"
    assert mapping["cosmology"]["photon_temperature"] == "2.7 K"
    assert mapping["cosmology"]["baryon_density"] == 0.0223
    assert mapping["sampling"]["wavenumbers"] == {
        "from": "0.01 1/Mpc",
        "to": "100.0 1/Mpc",
        "per_decade": 5.0,
    }


def test_a_range_with_one_changed_digit_is_written_as_a_list():
    scenario = parse_scenario(full_text())
    values = list(scenario.sampling.wavenumbers)
    values[3] = float(numpy.nextafter(values[3], 1.0))
    changed = replace(scenario, sampling=Sampling(values, scenario.sampling.redshifts))
    mapping = changed.to_mapping()
    assert len(mapping["sampling"]["wavenumbers"]) == len(values)
    assert scenario_from_mapping(mapping) == changed


def built(**changes):
    parts = {
        "title": "by hand",
        "cosmology": Cosmology(hubble_constant=70.0, baryon_density=0.02, dark_matter_density=0.1),
        "primordial": Primordial(),
        "sampling": Sampling(numpy.geomspace(0.1, 10.0, 4), numpy.array([100, 10])),
    }
    return Scenario(**(parts | changes))


def test_arrays_are_kept_as_tuples_of_plain_floats():
    sampling = built().sampling
    assert sampling.redshifts == (100.0, 10.0)
    assert {type(value) for value in sampling.wavenumbers + sampling.redshifts} == {float}


def test_a_scenario_built_by_hand_passes_the_rules_of_a_file():
    scenario = built(cosmology=Cosmology(70.0, 0.02, 0.0, curvature_fraction=0.1))
    assert scenario_from_mapping(scenario.to_mapping()) == scenario


@pytest.mark.parametrize(
    ("changes", "key"),
    [
        ({"title": ""}, "title"),
        ({"cosmology": Cosmology(float("nan"), 0.02, 0.1)}, "cosmology.hubble_constant"),
        ({"cosmology": Cosmology(70.0, -0.02, 0.1)}, "cosmology.baryon_density"),
        (
            {"cosmology": Cosmology(70.0, 0.02, 0.1, neutrinos=Neutrinos(masses=[-0.1]))},
            "cosmology.neutrinos.masses",
        ),
        ({"sampling": Sampling([0.1, float("inf")], [10])}, "sampling.wavenumbers"),
        ({"sampling": Sampling([0.1], [])}, "sampling.redshifts"),
        ({"sampling": Sampling([], [10])}, "sampling.wavenumbers"),
        ({"products": {"lag": {"fraction": (0.5,)}}}, "products.lag.fraction"),
        ({"products": {"map": {}}}, "products.map"),
        ({"method": Method("fluid")}, "method.closure"),
    ],
)
def test_a_scenario_built_by_hand_can_be_refused(changes, key):
    with pytest.raises(ScenarioError) as caught:
        scenario_from_mapping(built(**changes).to_mapping())
    assert (caught.value.key, caught.value.file, caught.value.line) == (key, None, None)
    assert str(caught.value).startswith(f"scenario: {key}")


@pytest.mark.parametrize(
    "part", [built(), built().cosmology, built().primordial, built().sampling, Neutrinos()]
)
def test_requests_are_frozen(part):
    with pytest.raises(FrozenInstanceError):
        part.title = "other"


def test_a_scenario_without_a_method_has_the_default_and_others_differ():
    assert built().method == Method("kinetic")
    assert built(method=Method("sound-speed")) != built()
    assert built(method=Method("sound-speed")).to_mapping()["method"] == {
        "closure": "sound-speed",
        "accuracy": "standard",
        "ionization_fluctuations": False,
    }


def test_two_scenarios_do_not_share_their_products():
    assert built().products is not built().products


# --- template and key table


def in_mapping(mapping, path):
    for name in path.split("."):
        mapping = mapping[name]
    return mapping


def test_the_template_stands_at_the_defaults():
    scenario = parse_scenario(scenario_template())
    required = {
        "cosmology": {name: in_mapping(scenario.to_mapping(), f"cosmology.{name}") for name in
                      ("hubble_constant", "baryon_density", "dark_matter_density")},
        "sampling": scenario.to_mapping()["sampling"],
    }  # fmt: skip
    # Every product of the template, with nothing said about it.
    required["products"] = dict.fromkeys(parse_scenario(scenario_template()).products)
    left_out = scenario_from_mapping(required)
    assert replace(left_out, title=scenario.title) == scenario


def test_the_template_shows_every_product():
    products = parse_scenario(scenario_template()).products
    assert {f"products.{name}" for name in products} == {path for path in SECTIONS if path.startswith("products.")}


# The sections of the mixture and of the gas are commented out as a whole: being there they mean something.
NO_DEFAULT = [  # or none that the example shows
    key for key in KEYS
    if (key.default is None or key.unsaid) and not key.required and key.kind is not Kind.TEXT
    and not key.path.startswith((MIXTURE, *GAS_SECTIONS))
]  # fmt: skip


def test_the_template_assumes_only_what_has_no_fixed_default():
    assert set(parse_scenario(scenario_template()).assumed) == {key.path for key in NO_DEFAULT} | set(GAS_SECTIONS)


@pytest.mark.parametrize("key", KEYS, ids=lambda key: key.path)
def test_the_template_explains_each_key(key):
    lines = [line.strip() for line in scenario_template().splitlines()]
    assert f"# {key.meaning}" in lines
    facts = lines[lines.index(f"# {key.meaning}") + 1]
    assert key.kind.value in facts
    assert ("required" in facts) == key.required
    assert f"[{key.unit}]" in facts or not key.unit
    assert str(key.allowed) in facts or not key.allowed
    assert max(map(len, lines)) < 130


def test_the_commented_keys_of_the_template_are_valid_too():
    text = scenario_template()
    for key in NO_DEFAULT:
        text = text.replace(f"# {key.name}: ", f"{key.name}: ")
    scenario = parse_scenario(text)
    assert scenario.assumed == tuple(GAS_SECTIONS)
    assert scenario.cosmology.curvature_fraction == 0.01
    for section in GAS_SECTIONS:
        begin = text.index(f"# {section}:")
        end = text.index("\n\n", begin)
        inside = re.sub(r"^( *)# (\w+:( |$))", r"\1\2", text[begin:end], flags=re.MULTILINE)
        scenario = parse_scenario(text[:begin] + inside + text[end:])
        assert set(GAS_SECTIONS) - set(scenario.assumed) == {section}


def test_the_commented_mixture_of_the_template_is_valid_too():
    before, rest = scenario_template().split("  # mixture:\n")
    inside, after = rest.split("\n# where the answer is wanted")
    keys = r"^( *)# ((?:adiabatic|ratio|correlation|tilt|" + "|".join(INITIAL_MODES) + "):)"
    text = before + "  mixture:\n" + re.sub(keys, r"\1\2", inside, flags=re.MULTILINE) + after
    mixture = parse_scenario(text).primordial.mixture
    assert mixture.shares == dict.fromkeys(INITIAL_MODES, Share(0.1, correlation=0.0, tilt=0.965))
    assert mixture.adiabatic == 1.0


@pytest.mark.parametrize("key", KEYS, ids=lambda key: key.path)
def test_each_example_is_valid_and_each_default_is_its_example(key):
    if key.kind is Kind.TABLE:  # names a file, which is not there
        return
    entry = parse_entry(f"value: {key.example}\n")
    value = read_value(entry, key)
    if key.default is not None:
        assert (value == key.default) != bool(key.unsaid)  # an example that is not the default says what is


def parse_entry(text):
    return entry_from_text(text, "example").content["value"]


def test_the_key_table_has_a_row_for_each_key():
    header, rule, *rows = key_table_markdown().splitlines()
    assert header == "| key | value | allowed | default | meaning |"
    assert [row.split(" | ")[0] for row in rows] == [f"| `{key.path}`" for key in (BASE, *KEYS)]
    assert {row.count("|") for row in (header, rule, *rows)} == {6}
    assert "| `cosmology.photon_temperature` | number with unit [K] | from 0.1 to 30 | 2.7255 K |" in rows[5]


def test_each_key_stands_in_a_section_the_table_knows():
    for key in KEYS:
        assert key.section in {"", "sampling.wavenumbers", "thermal.table", *SECTIONS}
        assert key.unit or key.kind not in (Kind.QUANTITY, Kind.QUANTITIES, Kind.WAVENUMBERS)
        assert not (key.required and key.default is not None)


# --- shipped scenarios


def test_at_least_three_scenarios_are_shipped():
    assert {"saltmarsh-small-box.yaml", "saltmarsh-large-box.yaml", "saltmarsh-minimal.yaml"} <= {
        path.name for path in SHIPPED
    }


@pytest.mark.parametrize("path", SHIPPED, ids=lambda path: path.name)
def test_shipped_scenarios_read_and_say_that_they_are_invented(path):
    scenario = read_scenario(path)
    assert scenario.source == str(path)
    assert scenario.sampling.redshifts == tuple(sorted(scenario.sampling.redshifts, reverse=True))
    assert "invented" in path.read_text()


def test_the_minimal_scenario_has_only_required_keys():
    scenario = read_scenario(next(path for path in SHIPPED if "minimal" in path.name))
    made = tuple(f"products.{product}." for product in DEFAULT_PRODUCTS)
    optional = {
        key.path for key in KEYS
        if not key.required and (key.path.startswith(made) or not key.path.startswith(("products", MIXTURE)))
    }
    optional = {path for path in optional if not path.startswith(tuple(GAS_SECTIONS))} | set(GAS_SECTIONS)
    assert set(scenario.assumed) == optional
