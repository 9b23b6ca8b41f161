"""What a file may say about its initial modes, and what they come to."""

import numpy as np
import pytest
from scenario_texts import refusal

from twofluid.scenario import Mixture, Primordial, Share, mixture_lines, parse_scenario, parts, read_scenario

TEXT = """\
cosmology:
  hubble_constant: 70 km/(s Mpc)
  baryon_density: 0.02
  dark_matter_density: 0.1
  neutrinos: {effective_number: 3}
primordial:
  tilt: 0.9
  mixture:
    {MIXTURE}
sampling: {wavenumbers: 0.1 1/Mpc, redshifts: [20]}
method:
  closure: kinetic
"""


def text(mixture, **changes):
    written = TEXT.replace("{MIXTURE}", mixture)
    for old, new in changes.items():
        name = {"dark": "dark_matter_density: 0.1", "neutrinos": "effective_number: 3", "closure": "kinetic"}[old]
        assert name in written
        written = written.replace(name, new)
    return written


def test_what_is_left_out_of_a_mode_is_filled_in_and_named():
    scenario = parse_scenario(text("baryon: {ratio: 0.2}"))
    assert scenario.primordial.mixture == Mixture(1.0, baryon=Share(0.2, correlation=0.0, tilt=None))
    named = [line for line in scenario.assumptions() if "mixture" in line]
    assert named == [
        "primordial.mixture.adiabatic = 1.0",
        "primordial.mixture.baryon.correlation = 0.0",
        "primordial.mixture.baryon.tilt = that of primordial.tilt",
    ]


def test_no_mixture_says_nothing_of_mixtures():
    scenario = parse_scenario(text("").replace("  mixture:\n    \n", ""))
    assert scenario.primordial.mixture is None
    assert not any("mixture" in line for line in scenario.assumptions())
    assert "mixture" not in scenario.to_mapping()["primordial"]
    assert mixture_lines(scenario.primordial) == ()


@pytest.mark.parametrize(
    ("mixture", "changes", "key", "rule"),
    [
        ("dark_matter: {ratio: 1}", {"dark": "dark_matter_density: 0"}, "dark_matter", "needs dark matter"),
        ("compensated: {ratio: 1}", {"dark": "dark_matter_density: 0"}, "compensated", "needs dark matter"),
        ("neutrino_density: {ratio: 1}", {"neutrinos": "effective_number: 0"}, "neutrino_density", "needs neutrinos"),
        ("neutrino_velocity: {ratio: 1}", {"neutrinos": "effective_number: 0"}, "neutrino_velocity", "needs neutrinos"),
        ("baryon: {ratio: 1}", {"closure": "sound-speed"}, "baryon", "is not known to method.closure: sound-speed"),
        ("baryon: {correlation: 1}", {}, "baryon.ratio", "is required"),
        ("baryon: {ratio: -1}", {}, "baryon.ratio", "is out of range"),
        ("baryon: {ratio: 1, correlation: 1.1}", {}, "baryon.correlation", "is out of range"),
        ("adiabatic: -1", {}, "adiabatic", "is out of range"),
        ("baryons: {ratio: 1}", {}, "baryons", "is an unknown key"),
        ("baryon: 0.1", {}, "baryon", "must hold keys"),
    ],
)
def test_a_mixture_that_cannot_be_is_refused_where_it_stands(mixture, changes, key, rule):
    error = refusal(text(mixture, **changes))
    assert (error.line, error.key) == (9, f"primordial.mixture.{key}")
    assert error.rule.startswith(rule)


def test_a_mixture_of_nothing_is_refused():
    error = refusal(text("{adiabatic: 0, baryon: {ratio: 0}}"))
    assert (error.line, error.key, error.rule) == (8, "primordial.mixture", "leaves no mode")


def test_a_mode_of_ratio_zero_asks_for_nothing():
    written = text("dark_matter: {ratio: 0}", dark="dark_matter_density: 0", closure="sound-speed")
    assert parse_scenario(written).primordial.mixture.shares == {}


def test_a_relative_without_dark_matter_is_sent_to_the_base(tmp_path):
    (tmp_path / "base.yaml").write_text(text("compensated: {ratio: 1}"))
    child = tmp_path / "child.yaml"
    child.write_text("base: base.yaml\ncosmology: {dark_matter_density: 0}\n")
    with pytest.raises(ValueError, match=r"base.yaml:9: primordial.mixture.compensated = \{ratio\}: needs dark matter"):
        read_scenario(child)
    child.write_text("base: base.yaml\ncosmology: {dark_matter_density: 0}\nprimordial: {mixture: null}\n")
    assert read_scenario(child).primordial == Primordial(tilt=0.9)


# --- independent parts


def test_parts_have_the_power_and_the_correlation_asked_for():
    primordial = Primordial(
        tilt=0.9, pivot=0.1,
        mixture=Mixture(2.0, baryon=Share(0.5, correlation=-0.6, tilt=1.4), dark_matter=Share(3.0, correlation=1.0),
                        compensated=Share(0.7)),
    )  # fmt: skip
    k = np.array([0.01, 0.1, 10.0])
    found = parts(primordial, k)
    assert [part.name for part in found] == ["adiabatic + baryon + dark_matter", "baryon", "compensated"]
    ratio = 0.5 * (k / 0.1) ** 0.25  # the power over that of the reference goes as k^(1.4 - 0.9)
    power = sum(part.weights.get("baryon", 0.0) ** 2 for part in found)
    np.testing.assert_allclose(power, ratio**2, rtol=1e-12)
    together = sum(part.weights.get("baryon", 0.0) * part.weights.get("adiabatic", 0.0) for part in found)
    np.testing.assert_allclose(together / (2.0 * ratio), -0.6, rtol=1e-12)
    np.testing.assert_array_equal(found[0].weights["dark_matter"], 3.0)
    np.testing.assert_array_equal(found[2].weights["compensated"], 0.7)


def test_modes_can_follow_one_field_without_the_adiabatic_mode():
    both = {"baryon": Share(1.0, correlation=1.0), "dark_matter": Share(2.0, correlation=-1.0)}
    (only,) = parts(Primordial(mixture=Mixture(0.0, **both)), [0.1])
    assert only.name == "baryon + dark_matter"
    assert {name: weight.tolist() for name, weight in only.weights.items()} == {"baryon": [1.0], "dark_matter": [-2.0]}


def test_without_a_mixture_there_is_one_part():
    (only,) = parts(Primordial(), [0.1, 1.0])
    assert only.name == "adiabatic"
    assert only.weights["adiabatic"].tolist() == [1.0, 1.0]


def test_lines_say_the_values_used():
    lines = mixture_lines(Primordial(mixture=Mixture(0.0, baryon=Share(0.2))))
    assert lines[0] == "adiabatic: ratio 0"
    assert lines[1].startswith("baryon: ratio 0.2 at 0.05 1/Mpc, tilt 0.965, correlation 0; baryon density")
