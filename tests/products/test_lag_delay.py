"""Ratio and delay, against closed forms."""

import numpy as np
import pytest
from scipy.optimize import brentq

from twofluid.products import lag_table


@pytest.mark.parametrize("exponent", [0.5, 1.0, 2.0])
@pytest.mark.parametrize("sign", [1, -1])
def test_delay_of_a_power_law(make_history, curves, exponent, sign):
    # delta_c = a^p, delta_b = b delta_c: delta_c was delta_b at b^(1/p) a, and t = t_0 a^(3/2), so the delay
    # is t_0 a^(3/2) (1 - b^(3/2p)).
    redshift = np.array([99.0, 3.0, 0.0])
    ratio = 0.7
    history = make_history(
        [curves.power(exponent, sign)], [curves.power(exponent, sign * ratio)], redshift=redshift
    )
    table = lag_table(history)
    expected = curves.age_today * (1 + redshift) ** -1.5 * (1 - ratio ** (1.5 / exponent))
    assert list(table["ratio"]) == pytest.approx([ratio] * 3, rel=1e-14)
    # Cubic Hermite pieces of width 0.01 in ln a: (0.01 p)^4/384 of the amplitude.
    assert list(table["delay"]) == pytest.approx(list(expected), rel=1e-8)


def test_the_latest_earlier_time_counts(make_history, curves):
    # A dark matter that goes up and down passes the amplitude more than once.
    dark = curves.wave(3.0, 1.0, 4.0, 0.2)
    baryon = curves.power(0, 2.9)
    now = -np.log1p(0.1)
    history = make_history([dark], [baryon], redshift=[0.1], start=-6.0)
    then = brentq(lambda x: dark[0](x) - 2.9, now - 0.2, now, xtol=1e-14)
    assert dark[0](then - 0.5) < 2.9 < dark[0](now)
    assert dark[0](then - 0.9) > 2.9  # so there are earlier ones
    expected = curves.age_today * (np.exp(1.5 * now) - np.exp(1.5 * then))
    # The pieces err by 0.01^4/384 * 4^4 of the wave's amplitude, over a delay of 0.1 in ln a.
    assert lag_table(history)["delay"][0] == pytest.approx(expected, rel=1e-6)


def test_what_comes_later_does_not_count(make_history, curves):
    # Rises through its middle at ln a = -0.2 and a period, 2 pi/4, before. Asked just after the earlier.
    first = -0.2 - np.pi / 2
    dark, redshift = curves.wave(3.0, 1.0, 4.0, 0.2), np.expm1(-first - 0.1)
    history = make_history([dark], [curves.power(0, 3.0)], redshift=[redshift], start=-6.0)
    expected = curves.age_today * (np.exp(1.5 * (first + 0.1)) - np.exp(1.5 * first))
    # As above.
    assert lag_table(history)["delay"][0] == pytest.approx(expected, rel=1e-6)


@pytest.mark.parametrize(
    ("now", "amplitude", "why"),
    [(-0.6, 2.5, "baryons ahead of a dark matter in its trough, 2.003"), (-0.1, -0.3, "of the other sign")],
)
def test_no_delay_though_the_dark_matter_once_had_that_amplitude(make_history, curves, now, amplitude, why):
    middle = 3.0 if amplitude > 0 else 0.5
    dark = curves.wave(middle, 1.0, 4.0, 0.2)
    earlier = dark[0](np.linspace(-6, now, 1000))
    assert earlier.min() < amplitude < earlier.max()
    history = make_history([dark], [curves.power(0, amplitude)], redshift=[np.expm1(-now)], start=-6.0)
    assert lag_table(history)["delay"].mask.tolist() == [True], why


@pytest.mark.parametrize(
    ("factor", "why"),
    [
        (1.2, "baryons are ahead"),
        (0.0, "no baryon contrast"),
        (-0.3, "baryons of the other sign"),
        (1e-5, "the dark matter was never that small: the run starts at exp(-9)"),
    ],
)
def test_no_delay_is_empty(make_history, curves, factor, why):
    table = lag_table(make_history([curves.power(1)], [curves.power(1, factor)], redshift=[0.0]))
    assert table["delay"].mask.tolist() == [True], why
    assert table["ratio"][0] == pytest.approx(factor, rel=1e-14)


def test_level_baryons_have_no_delay_to_wait(make_history, curves):
    table = lag_table(make_history([curves.power(1)], [curves.power(1)], redshift=[0.0]))
    # t_0 times round-off in ln a.
    assert table["delay"][0] == pytest.approx(0.0, abs=curves.age_today * 1e-12)


def test_rows_run_over_redshift_first_in_the_order_asked(make_history, curves):
    history = make_history(
        [curves.power(1)] * 2, [curves.power(1, 0.5), curves.power(1, 0.9)], redshift=[0.0, 30.0, 4.0]
    )
    table = lag_table(history)
    assert table["wavenumber"].tolist() == [1, 1, 1, 2, 2, 2]
    assert table["redshift"].tolist() == [0, 30, 4, 0, 30, 4]
    assert list(table["ratio"]) == pytest.approx([0.5, 0.5, 0.5, 0.9, 0.9, 0.9], rel=1e-14)
    # Shorter when the universe is younger, and with less to catch up.
    delay = np.array(table["delay"]).reshape(2, 3)
    assert (delay[:, 0] > delay[:, 2]).all()
    assert (delay[:, 2] > delay[:, 1]).all()
    assert (delay[0] > delay[1]).all()


def test_without_dark_matter_ratio_and_delay_are_empty(make_history, curves):
    table = lag_table(make_history([curves.power(1)], [curves.power(1, 0.5)], has_dark_matter=False))
    assert table["ratio"].mask.all()
    assert table["delay"].mask.all()
    assert not np.ma.is_masked(table["wavenumber"])
    assert "no dark matter" in table.meta["no_dark_matter"]
