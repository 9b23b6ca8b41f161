"""The verdict on each mode: known cases, limits, and where one verdict gives way to the next."""

import io

import numpy as np
import pytest
from astropy.table import Table

from twofluid.files import table_bytes
from twofluid.products import scales_table, verdict_table
from twofluid.products.jeans import jeans_wavenumber
from twofluid.products.verdict import DAMPED, FALLS, GROWS, HELD, LARGER, OSCILLATES, UNTOLD, VERDICTS, verdicts


def verdict_at(run, wavenumber, redshift, **options):
    """Verdict on the mode of the run nearest to a wavenumber."""
    mode = np.argmin(abs(np.log(run.wavenumber / wavenumber)))
    return verdicts(run, [redshift], **options)[mode, 0]


# Common practice, no source: what anybody in the field would say.
KNOWN = [
    (0.0005, 1e4, LARGER),
    (1e-4, 0.0, LARGER),  # a H = 2.25e-4/Mpc today
    (0.02, 1e4, LARGER),  # a H = 0.025/Mpc
    (0.03, 1e4, GROWS),  # inside, but sound has crossed it only once
    (0.1, 2000.0, OSCILLATES),
    (1.0, 1e4, OSCILLATES),
    (10.0, 1500.0, DAMPED),
    (1e3, 2000.0, DAMPED),
    (1.0, 300.0, FALLS),
    (0.1, 200.0, FALLS),
    (5e3, 50.0, HELD),
    (1e4, 0.0, HELD),
    (1.0, 5.0, GROWS),
    (0.01, 10.0, GROWS),
    (0.001, 0.0, GROWS),
]


@pytest.mark.parametrize(("wavenumber", "redshift", "expected"), KNOWN)
def test_known_cases(standard_run, wavenumber, redshift, expected):
    found = verdict_at(standard_run, wavenumber, redshift)
    assert VERDICTS[found] == VERDICTS[expected]


@pytest.mark.parametrize(
    ("wavenumber", "redshift", "options", "was", "expected"),
    [
        (1.0, 300.0, {"together": 0.3}, FALLS, GROWS),  # its ratio is 0.36
        (1.0, 5.0, {"together": 0.99}, GROWS, FALLS),  # its ratio is 0.978
    ],
)
def test_the_fraction_decides_what_has_caught_up(standard_run, wavenumber, redshift, options, was, expected):
    # Negative control for the cases above.
    assert verdict_at(standard_run, wavenumber, redshift) == was
    assert verdict_at(standard_run, wavenumber, redshift, **options) == expected


def test_without_dark_matter_nothing_falls_in_and_all_else_is_judged(bare_run):
    found = verdicts(bare_run, bare_run.redshift)
    assert set(np.unique(found)) == {LARGER, OSCILLATES, DAMPED, HELD, GROWS}
    assert verdict_at(bare_run, 1.0, 20.0) == GROWS
    assert verdict_at(bare_run, 150.0, 500.0) == HELD


def test_waves_die_where_diffusion_has_taken_their_amplitude(standard_run):
    # Photon diffusion damps by exp[-(k/k_D)^2], Kaiser 1983, from memory; 1/e at k = k_D. Redshift at which the run
    # calls each mode damped, against the one at which k_D falls below k. Turns are half a period apart, 10 per cent of
    # the time there is at k = 0.5/Mpc, and the amplitude also falls by (1+R)^(-1/4).
    redshift = np.geomspace(6000, 1070, 400)
    found = verdicts(standard_run, redshift)
    diffusion = standard_run.universe.diffusion_wavenumber(1 / (1 + redshift))
    modes = np.flatnonzero((standard_run.wavenumber > 0.5) & (standard_run.wavenumber < 2.0))
    assert len(modes) > 5
    for mode in modes:
        assert found[mode, 0] == OSCILLATES
        died = redshift[np.argmax(found[mode] == DAMPED)]
        expected = redshift[np.argmax(diffusion < standard_run.wavenumber[mode])]
        assert died == pytest.approx(expected, rel=0.1)


def test_a_wave_oscillates_from_its_first_turn_on(standard_run):
    # cos(k r_s) turns first at k r_s = pi (Hu & Sugiyama 1996; common practice for the number). The driving by gravity
    # while radiation rules shifts the first turn by up to a fifth.
    redshift = np.geomspace(1e4, 1070, 600)
    found = verdicts(standard_run, redshift)
    modes = np.flatnonzero((standard_run.wavenumber > 0.03) & (standard_run.wavenumber < 0.09))
    for mode in modes:
        assert found[mode, 0] in (GROWS, LARGER)
        turned = redshift[np.argmax(found[mode] == OSCILLATES)]
        phase = standard_run.wavenumber[mode] * standard_run.universe.sound_horizon(1 / (1 + turned))
        assert phase == pytest.approx(np.pi, rel=0.2)


def test_pressure_wins_near_the_jeans_scale_of_the_gas(standard_run):
    # Equal at k_J for gas at rest in steady dark matter; gas that still moves, and cools, puts it up to 1.8 higher.
    for redshift in (300.0, 100.0, 20.0, 5.0):
        found = verdicts(standard_run, [redshift])[:, 0]
        held = standard_run.wavenumber[found == HELD].min()
        assert 1.0 < held / jeans_wavenumber(standard_run.universe, [redshift])[0] < 1.8
        assert np.all(found[standard_run.wavenumber >= held] == HELD)


def test_a_verdict_of_a_mode_does_not_depend_on_the_others(standard_run, make_run):
    few = make_run(standard_run.wavenumber[[0, 40, 60, 90]], [0.0])
    redshift = [9000.0, 2000.0, 500.0, 30.0, 1.0]
    assert verdicts(few, redshift).tolist() == verdicts(standard_run, redshift)[[0, 40, 60, 90]].tolist()


def test_a_wave_the_run_does_not_follow_has_no_verdict(standard_run):
    # At z = 1e5 diffusion reaches k = 129/Mpc; the run leaves waves beyond k tau = 130, k = 30/Mpc, unresolved.
    table = verdict_table(standard_run, [1e5])
    untold = table["verdict"].mask
    assert untold.any()
    assert table["wavenumber"][untold].max() < 129
    assert table["agrees_with_jeans"].mask.tolist() == untold.tolist()
    assert verdict_at(standard_run, 60.0, 1e5) == UNTOLD
    assert verdict_at(standard_run, 1e3, 1e5) == DAMPED


def test_agreement_is_what_the_jeans_criterion_says(standard_run):
    table = verdict_table(standard_run, [3000.0, 100.0])
    jeans = dict(zip([3000.0, 100.0], scales_table(standard_run, [3000.0, 100.0])["jeans_wavenumber"], strict=True))
    for row in table:
        withstands = row["verdict"] in ("oscillates with the plasma", "damped", "held up by pressure")
        assert row["agrees_with_jeans"] == (withstands == (row["wavenumber"] > jeans[row["redshift"]]))
    share = np.mean(table["agrees_with_jeans"])
    assert 0.9 < share < 1.0  # between the two edges of each transition they differ


def test_gas_without_time_to_build_up_pressure_disagrees(standard_run):
    table = verdict_table(standard_run, [1000.0])  # 3 per cent in time after its release; k_J = 288/Mpc
    early = table[(table["wavenumber"] > 300) & (table["wavenumber"] < 3000)]
    assert not early["agrees_with_jeans"].any()
    assert set(early["verdict"]) == {"falls in"}


def test_rows_and_words_survive_the_file(standard_run):
    table = verdict_table(standard_run, [1e5, 20.0], together=0.95)
    again = Table.read(io.BytesIO(table_bytes(table)), format="ascii.ecsv")
    assert again.colnames == ["wavenumber", "redshift", "verdict", "agrees_with_jeans"]
    assert again["redshift"][:2].tolist() == [1e5, 20.0]
    assert again["verdict"].mask.tolist() == table["verdict"].mask.tolist()
    kept = ~table["verdict"].mask
    assert again["verdict"][kept].tolist() == table["verdict"][kept].tolist()
    assert again["agrees_with_jeans"].dtype == bool
    assert again["agrees_with_jeans"][kept].tolist() == table["agrees_with_jeans"][kept].tolist()
    assert again.meta["together"] == 0.95


def test_scales_survive_the_file(standard_run):
    table = scales_table(standard_run)
    again = Table.read(io.BytesIO(table_bytes(table)), format="ascii.ecsv")
    for name in table.colnames:
        assert again[name].unit == table[name].unit
        assert again[name].description == table[name].description
        assert np.ma.allequal(np.ma.asarray(again[name]), np.ma.asarray(table[name]))  # every bit
    assert dict(again.meta) == table.meta
