"""What an invalid scenario is told: the file, the line, the key, the value, the rule and the way out."""

import pickle
import re

import pytest
from scenario_texts import NO_PRODUCTS, VALUES, full_text, line_of, refusal, wavenumber_text

from twofluid.scenario import ScenarioError, parse_scenario
from twofluid.scenario.keys import KEY_AT, KEYS, SECTIONS, Kind

PATHS = list(VALUES)
LEAVES = [path for path, value in VALUES.items() if value]
REQUIRED = [key.path for key in KEYS if key.required]
PARTS = [path for path in PATHS if path.startswith("sampling.wavenumbers.")]


def check(error, path, value, rule, remedy):
    """Check every part of an error and that its text is made of them."""
    assert (error.file, error.line, error.key, error.value) == ("box.yaml", line_of(path), path, value)
    assert rule in error.rule
    assert remedy in error.remedy
    shown = "" if value is None else f" = {value}"
    assert str(error) == f"box.yaml:{line_of(path)}: {path}{shown}: {error.rule}; {error.remedy}"


def test_the_table_and_these_tests_know_the_same_keys():
    assert set(PATHS) == set(KEY_AT) | set(SECTIONS)


@pytest.mark.parametrize("path", PATHS)
def test_each_key_misspelt_once_gets_its_name_offered(path):
    name = path.rpartition(".")[2]
    wrong = name[:-2] + name[-1] + name[-2]  # the last two letters swapped
    if path.count(".") == 2 and len(name) <= 4:
        wrong = name + "s"  # `ot` for `to` is too far away to be recognised
    if wrong == name:  # twice the same letter
        wrong = name[:-1]
    error = refusal(full_text(names={path: wrong}))
    assert error.line == line_of(path)
    assert error.key.rpartition(".")[2] == wrong
    assert error.rule == "is an unknown key"
    assert error.remedy == f"did you mean {name}?"


def test_an_unlike_key_gets_the_list_of_keys():
    error = refusal(full_text(names={"primordial.tilt": "zzz"}))
    assert error.remedy == "known in `primordial`: amplitude, tilt, pivot, mixture"


def test_a_key_in_the_wrong_section_is_sent_home():
    error = refusal("tilt: 1\n" + full_text())
    assert str(error) == "box.yaml:1: tilt = 1: does not belong at the top; move it to primordial"


def test_an_unknown_product_is_refused():
    error = refusal(full_text(names={"products.lag": "map"}))
    assert (error.key, error.line) == ("products.map", line_of("products.lag"))
    assert "lag" in error.remedy


@pytest.mark.parametrize("path", REQUIRED)
def test_each_required_key_is_missed(path):
    changes = dict.fromkeys(other for other in PATHS if other == path or other.startswith(path + "."))
    error = refusal(full_text(changes))
    assert error.key == path
    assert error.line == line_of(path.rpartition(".")[0])
    assert error.rule == "is required"
    name = path.rpartition(".")[2]
    assert error.remedy == f"add for example `{name}: {KEY_AT[path].example}`"


@pytest.mark.parametrize(
    ("section", "first"), [("cosmology", "cosmology.hubble_constant"), ("sampling", "sampling.wavenumbers")]
)
def test_a_required_section_left_out_is_missed(section, first):
    inner = dict.fromkeys(path for path in PATHS if path == section or path.startswith(section + "."))
    assert refusal(full_text(inner)).key == first


@pytest.mark.parametrize("path", LEAVES)
@pytest.mark.parametrize("nothing", ["", "~", "null"])
def test_each_key_without_value(path, nothing):
    error = refusal(full_text({path: nothing}))
    check(error, path, None, "has no value", f"for example {KEY_AT[path].example}")


@pytest.mark.parametrize("path", ["cosmology", "primordial", "sampling", "products", "products.lag"])
@pytest.mark.parametrize("value", ["5", "[1, 2]"])
def test_a_section_must_hold_keys(path, value):
    inner = dict.fromkeys(other for other in PATHS if other.startswith(path + "."))
    # Everything below the section is left out, so the lines above it keep their numbers.
    check(refusal(full_text({path: value, **inner})), path, value, "must hold keys", "key: value")


def test_products_without_value_is_ambiguous():
    error = refusal(full_text(NO_PRODUCTS))
    check(error, "products", None, "has no value", "write {} for none, or leave the section out for lag")


NUMBERS = [key.path for key in KEYS if key.kind is Kind.NUMBER]
QUANTITIES = [key.path for key in KEYS if key.kind is Kind.QUANTITY]


@pytest.mark.parametrize("path", NUMBERS)
@pytest.mark.parametrize(
    ("value", "rule"),
    [
        ("true", "must be a plain number"),
        ("yes", "must be a plain number"),
        ("many", "must be a plain number"),
        ("1,5", "must be a plain number"),
        ("0x10", "must be a plain number"),
        (".nan", "must be a plain number"),
        (".inf", "must be a plain number"),
        ("nan", "must be a finite number"),
        ("-inf", "must be a finite number"),
        ("1e400", "must be a finite number"),
        ("0.02 kg/m3", "must be a plain number, without a unit"),
        ("[1]", "must be one number"),
    ],
)
def test_each_number_refuses_what_is_none(path, value, rule):
    check(refusal(full_text({path: value})), path, value, rule, KEY_AT[path].example)


def test_a_number_in_quotes_is_text():
    error = refusal(full_text({"primordial.tilt": '"0.96"'}))
    check(error, "primordial.tilt", "0.96", "not text in quotes", "remove the quotes")


@pytest.mark.parametrize("path", QUANTITIES)
@pytest.mark.parametrize(
    ("value", "rule"),
    [
        ("5", "needs a unit"),
        ("true", "must be a number with a unit"),
        ("nan 1/Mpc", "must be a number with a unit"),
        ("5 furlong", "has a unit that cannot be read or converted"),
        ("5 kg", "has a unit that cannot be read or converted"),
        ("5 1/(Mpc", "has a unit that cannot be read or converted"),
        ("5 dex(K)", "has a unit that cannot be read or converted"),
        ("5 mag", "has a unit that cannot be read or converted"),
        ("5 7 1/Mpc", "holds two numbers"),
        ("5 -1/Mpc", "holds two numbers"),
    ],
)
def test_each_quantity_refuses_what_is_none(path, value, rule):
    key = KEY_AT[path]
    remedy = f"in {key.unit} or an equivalent unit, for example {key.example}"
    check(refusal(full_text({path: value})), path, value, rule, remedy)


@pytest.mark.parametrize(
    ("value", "rule"),
    [("[0.05 1/Mpc]", "must be one number with a unit"), ("1e400 1/Mpc", "must be a finite number")],
)
def test_a_list_or_an_overflow_is_no_quantity(value, rule):
    path = "primordial.pivot"
    check(refusal(full_text({path: value})), path, value, rule, "for example 0.05 1/Mpc")


@pytest.mark.parametrize("unit", ["h/Mpc", "littleh/Mpc", "h Mpc^-1", "hMpc^-1", "h/kpc"])
def test_wavenumbers_in_h_are_explained(unit):
    error = refusal(full_text({"primordial.pivot": f"0.05 {unit}"}))
    assert f"'{unit}'" in error.rule
    assert "h reads as hour, so multiply by the Hubble constant over 100" in error.remedy


def test_other_units_are_not_told_about_h():
    assert "hour" not in refusal(full_text({"primordial.pivot": "0.05 1/hogshead"})).remedy


def test_an_absurdly_long_unit_is_refused_unread():
    error = refusal(full_text({"primordial.pivot": "0.05 1/Mpc" + " m/m" * 200}))
    assert "cannot be read" in error.rule
    assert len(str(error)) < 400


@pytest.mark.parametrize(
    ("path", "value", "allowed"),
    [
        ("cosmology.hubble_constant", "0 km/(s Mpc)", "from 1 to 500 km/(s Mpc)"),
        ("cosmology.hubble_constant", "-67 km/(s Mpc)", "from 1 to 500 km/(s Mpc)"),
        ("cosmology.hubble_constant", "67.5 Mm/(s Mpc)", "from 1 to 500 km/(s Mpc)"),
        ("cosmology.baryon_density", "0", "from 1e-06 to 10"),
        ("cosmology.baryon_density", "11", "from 1e-06 to 10"),
        ("cosmology.dark_matter_density", "-0.1", "from 0 to 10"),
        ("cosmology.photon_temperature", "0 K", "from 0.1 to 30 K"),
        ("cosmology.photon_temperature", "31 K", "from 0.1 to 30 K"),
        ("cosmology.helium_mass_fraction", "-0.1", "at least 0 and below 1"),
        ("cosmology.helium_mass_fraction", "1", "at least 0 and below 1"),
        ("cosmology.curvature_fraction", "1.5", "from -1 to 1"),
        ("cosmology.cosmological_constant_fraction", "-2.5", "from -2 to 2"),
        ("cosmology.neutrinos.effective_number", "-1", "from 0 to 20"),
        ("cosmology.dark_matter.sound_speed", "-1 km/s", "from 0 to 29979 km/s"),
        ("cosmology.dark_matter.sound_speed", "3e4 km/s", "from 0 to 29979 km/s"),
        ("cosmology.dark_matter.at_redshift", "-1", "from 0 to 1e+06"),
        ("cosmology.dark_matter.scaling", "1.5", "from 0 to 1"),
        ("primordial.amplitude", "0", "above 0 and at most 1"),
        ("primordial.amplitude", "1.1", "above 0 and at most 1"),
        ("primordial.tilt", "7", "from -3 to 5"),
        ("primordial.pivot", "0 1/Mpc", "from 1e-06 to 1e+06 1/Mpc"),
        ("sampling.wavenumbers.from", "9e-5 1/Mpc", "from 0.0001 to 100000 1/Mpc"),
        ("sampling.wavenumbers.to", "1.1e5 1/Mpc", "from 0.0001 to 100000 1/Mpc"),
        ("sampling.wavenumbers.per_decade", "0", "above 0 and at most 100000"),
        ("products.growth.reference_redshift", "-0.5", "from 0 to 1e+06"),
        ("products.growth.reference_redshift", "1000001", "from 0 to 1e+06"),
        ("products.shortfall.target_redshift", "-1", "from 0 to 1e+06"),
        ("products.streaming.from_redshift", "9.9", "from 10 to 2000"),
        ("products.streaming.from_redshift", "2001", "from 10 to 2000"),
    ],
)
def test_each_range_ends(path, value, allowed):
    check(refusal(full_text({path: value})), path, value, "is out of range", f"give a value {allowed}")


@pytest.mark.parametrize(
    ("path", "items", "value"),
    [
        ("sampling.redshifts", "[10, -1]", "-1"),
        ("sampling.redshifts", "[10, 1000001]", "1000001"),
        ("products.lag.fractions", "[0.5, 1]", "1"),
        ("products.lag.fractions", "[0, 0.5]", "0"),
        ("products.spheres.radii", "[1 Mpc, 0 Mpc]", "0 Mpc"),
        ("products.spheres.radii", "[1 Mpc, 20 Gpc]", "20 Gpc"),
        ("products.spheres.masses", "[-1 solMass]", "-1 solMass"),
        ("products.streaming.velocities", "[0, 5.1]", "5.1"),
    ],
)
def test_each_range_ends_inside_lists(path, items, value):
    check(refusal(full_text({path: items})), path, value, "is out of range", str(KEY_AT[path].allowed))


@pytest.mark.parametrize("path", ["sampling.redshifts", "products.lag.fractions"])
@pytest.mark.parametrize(
    ("value", "shown", "rule"),
    [
        ("5", "5", "must be a list"),
        ("{a: 1}", "{a}", "must be a list"),
        ("[]", "[]", "must not be an empty list"),
        ("[0.5, true]", "true", "must be a plain number"),
        ("[0.5, [0.6]]", "[0.6]", "must be one number"),
        ("[0.5, ~]", None, "has no value"),
        ("[0.5, 0.5 K]", "0.5 K", "must be a plain number, without a unit"),
        ("[0.5, 0.50]", "0.50", "stands twice in the list"),
    ],
)
def test_lists_of_numbers(path, value, shown, rule):
    check(refusal(full_text({path: value})), path, shown, rule, "")


@pytest.mark.parametrize("path", [key.path for key in KEYS if key.kind is Kind.QUANTITIES and key.shortest])
@pytest.mark.parametrize(
    ("value", "shown", "rule"),
    [
        ("5", "5", "must be a list"),
        ("[]", "[]", "must not be an empty list"),
        ("[5]", "5", "needs a unit"),
        ("[5 mol]", "5 mol", "has a unit that cannot be read or converted"),
        ("[nan Mpc]", "nan Mpc", "must be a number with a unit"),
    ],
)
def test_lists_of_quantities(path, value, shown, rule):
    check(refusal(full_text({path: value})), path, shown, rule, "")


def test_an_item_is_reported_at_its_own_line():
    error = refusal(full_text({"products.lag.fractions": "\n    - 0.5\n    - 1.5"}))
    assert (error.line, error.value) == (line_of("products.lag.fractions") + 2, "1.5")


def test_the_later_of_two_equal_items_is_reported():
    error = refusal(full_text({"products.lag.fractions": "\n    - 0.5\n    - 0.4\n    - 0.50"}))
    assert (error.line, error.value) == (line_of("products.lag.fractions") + 3, "0.50")


def test_too_many_items():
    redshifts = refusal(full_text({"sampling.redshifts": str(list(range(1001)))}))
    assert redshifts.rule == "must be at most 1000 entries: more redshifts are not tabulated in one run"
    fractions = refusal(full_text({"products.lag.fractions": str([item / 200 for item in range(1, 102)])}))
    assert fractions.rule == "must be at most 100 entries: more fractions are not tabulated in one run"
    parse_scenario(full_text({"sampling.redshifts": str(list(range(1000)))}))


def test_neutrino_masses():
    path = "cosmology.neutrinos.masses"
    equal = parse_scenario(full_text({path: "[20 meV, 20 meV, 0 eV]"}))  # equal masses may stand side by side
    assert equal.cosmology.neutrinos.masses == pytest.approx((0.02, 0.02, 0.0), rel=1e-15)
    check(refusal(full_text({path: "[0.06]"})), path, "0.06", "needs a unit", "0.06 eV")
    check(refusal(full_text({path: "[11 eV]"})), path, "11 eV", "is out of range", "from 0 to 10 eV")
    check(refusal(full_text({path: "0.06 eV"})), path, "0.06 eV", "must be a list", "[0.06 eV]")
    four = "[0.1 eV, 0.1 eV, 0.1 eV, 0.1 eV]"
    error = refusal(full_text({path: four}))
    check(error, path, four, "must be at most 3 entries: three species share the effective number", "[0.06 eV]")


@pytest.mark.parametrize(
    ("value", "shown", "rule"),
    [
        ("0.1", "0.1", "needs a unit"),
        ("[0.1, 1]", "0.1", "needs a unit"),
        ("[]", "[]", "must not be an empty list"),
        ("[0.1 1/Mpc, 0.1 1/Mpc]", "0.1 1/Mpc", "stands twice in the list"),
        # Converted to 1/Mpc these two differ in the last digit.
        ("[1 1/Mpc, 1e-3 1/kpc]", "1e-3 1/kpc", "stands twice in the list"),
        ("[1e-3 1/kpc, 1 1/Mpc]", "1 1/Mpc", "stands twice in the list"),
        ("[1 1/Mpc, 1e6 1/Mpc]", "1e6 1/Mpc", "is out of range"),
        ("[1 1/Mpc, {from: 1 1/Mpc}]", "{from}", "must be one number with a unit"),
    ],
)
def test_wavenumber_lists(value, shown, rule):
    check(refusal(wavenumber_text(value)), "sampling.wavenumbers", shown, rule, "")


@pytest.mark.parametrize("low", ["100 1/Mpc", "0.1 1/kpc", "200 1/Mpc"])
def test_a_range_must_ascend(low):
    path = "sampling.wavenumbers.from"
    check(
        refusal(full_text({path: low})), path, low, "must be less than `to`, which is 100 1/Mpc", "swap them"
    )


def test_a_range_may_not_hold_too_many_points():
    path = "sampling.wavenumbers.per_decade"
    check(
        refusal(full_text({path: "25000"})),
        path,
        "25000",
        "makes more than 100000 wavenumbers",
        "fewer points",
    )
    scenario = parse_scenario(full_text({path: "24999.75"}))  # 99 999 intervals
    assert len(scenario.sampling.wavenumbers) == 100_000


@pytest.mark.parametrize(
    ("title", "rule"),
    [
        ('"  "', "is blank"),
        ('"two\\nlines"', "must be one line"),
        ('"\\e[31m"', "must be one line"),
        ("[a]", "must be text"),
    ],
)
def test_titles(title, rule):
    error = refusal(full_text({"title": title}))
    assert (error.key, error.line) == ("title", 1)
    assert rule in error.rule
    assert str(error).isprintable()


def test_the_error_is_a_value_error_that_survives_pickling():
    error = refusal(full_text({"primordial.tilt": "7"}))
    assert isinstance(error, ValueError)
    copy = pickle.loads(pickle.dumps(error))
    assert isinstance(copy, ScenarioError)
    assert str(copy) == str(error)
    assert vars(copy) == vars(error)


def test_long_values_are_cut_in_the_text_but_kept_in_the_error():
    value = "9" * 500
    error = refusal(full_text({"primordial.tilt": value}))
    assert error.value == value
    assert re.search(r"tilt = 9{57}\.\.\.: ", str(error))


def test_the_text_names_only_what_applies():
    assert str(ScenarioError("rule", "remedy")) == "scenario: rule; remedy"
    assert str(ScenarioError("rule", "remedy", "a.yaml")) == "a.yaml: rule; remedy"
    assert str(ScenarioError("rule", "remedy", "a\n.yaml")) == "a\\n.yaml: rule; remedy"
    assert str(ScenarioError("rule", "remedy", "a.yaml", 3)) == "a.yaml:3: rule; remedy"
    assert str(ScenarioError("rule", "remedy", key="a.b", value="1")) == "scenario: a.b = 1: rule; remedy"


@pytest.mark.parametrize(
    ("value", "shown", "remedy"),
    [
        ("sound_speed", "sound_speed", "did you mean sound-speed?"),
        ("Kinetic", "Kinetic", "did you mean kinetic?"),
        ("2", "2", "write for example kinetic"),
        ("[kinetic, sound-speed]", "[kinetic, sound-speed]", "write for example kinetic"),
    ],
)
def test_a_choice_takes_only_its_words(value, shown, remedy):
    error = refusal(full_text({"method.closure": value}))
    check(error, "method.closure", shown, "must be kinetic or sound-speed", remedy)


def test_a_choice_left_blank_is_refused():
    error = refusal(full_text({"method.closure": ""}))
    check(error, "method.closure", None, "has no value", "give one, for example kinetic")
