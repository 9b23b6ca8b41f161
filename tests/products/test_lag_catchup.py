"""The redshift of catching up, against closed forms."""

import numpy as np
import pytest
from scipy.optimize import brentq

from twofluid.products import catchup_table

DECOUPLING = np.log(1 / 1060)  # ln a at which the baryons of the infall below are let go


def infall(baryon_share, exponent):
    """Baryon infall from rest in the matter era, two cold fluids, with derivatives by ln r, r = a/a_d.

    delta_m = f_c [(3/2+p)/(5/2) r + (1-p)/(5/2) r^(-3/2)], delta_bc = -(1+2p) + 2p r^(-1/2),
    delta_b = delta_m + f_c delta_bc, delta_c = delta_m - f_b delta_bc. Checked by substitution in the
    two-fluid equations with 30 digits.
    """
    dark_share = 1 - baryon_share
    grow, decay = dark_share * (1.5 + exponent) / 2.5, dark_share * (1 - exponent) / 2.5

    def parts(x):
        r = np.exp(x - DECOUPLING)
        total = grow * r + decay * r**-1.5, grow * r - 1.5 * decay * r**-1.5
        return total, (-(1 + 2 * exponent) + 2 * exponent * r**-0.5, -exponent * r**-0.5)

    def curve(share):
        return tuple(lambda x, i=i: parts(x)[0][i] + share * parts(x)[1][i] for i in (0, 1))

    return curve(-baryon_share), curve(dark_share)


# delta_b/delta_c at r = a/a_d of the closed form above, six digits, computed with 30.
INFALL = [
    (0.157081, 0.901902, {2: 0.183349, 5: 0.542563, 10: 0.735703, 50: 0.937673, 100: 0.967770}),
    (0.0, 1.0, {2: 0.207107, 5: 0.578885, 10: 0.763246, 50: 0.945657, 100: 0.972000}),
]


@pytest.mark.parametrize(("share", "exponent", "ratios"), INFALL)
def test_infall_catches_up_where_the_table_says(make_history, share, exponent, ratios):
    dark, baryon = infall(share, exponent)
    history = make_history([dark], [baryon], start=DECOUPLING)
    table = catchup_table(history, tuple(ratios.values()))
    for (r, ratio), name in zip(ratios.items(), table.meta["fractions"], strict=True):
        assert table.meta["fractions"][name] == ratio
        # The ratio has six digits and rises by 0.03 or more per unit of ln r: 5e-7/0.03 in 1 + z.
        assert 1 + table[name][0] == pytest.approx(1060 / r, rel=2e-5)


@pytest.mark.parametrize("fraction", [0.1, 0.5, 0.9, 0.955])
def test_infall_agrees_with_the_root_of_the_closed_form(make_history, fraction):
    dark, baryon = infall(0.157081, 0.901902)
    table = catchup_table(make_history([dark], [baryon], start=DECOUPLING), [fraction])
    root = brentq(lambda x: baryon[0](x) - fraction * dark[0](x), DECOUPLING + 0.1, 0, xtol=1e-14)
    # Cubic Hermite pieces of width 0.01 in ln a: error 0.01^4/384 of the fourth derivative.
    assert 1 + table.columns[1][0] == pytest.approx(np.exp(-root), rel=1e-9)


def test_error_falls_with_the_fourth_power_of_the_step(make_history):
    dark, baryon = infall(0.157081, 0.901902)
    root = brentq(lambda x: baryon[0](x) - 0.5 * dark[0](x), DECOUPLING + 0.1, 0, xtol=1e-14)
    errors = []
    for step in (0.4, 0.2, 0.1):
        table = catchup_table(make_history([dark], [baryon], start=DECOUPLING, step=step), [0.5])
        errors.append(abs(-np.log1p(table["redshift_at_50_percent"][0]) - root))
    # Sixteenfold per halving, less what the place of the root within its piece changes.
    assert errors[0] > 4 * errors[1] > 16 * errors[2] > 0


def outcome(make_history, curves, ratio, fraction):
    """Redshift entry and ratio today of one mode with delta_dark = 1 and this curve of the ratio."""
    table = catchup_table(make_history([curves.power(0)], [ratio], start=-6.0), [fraction])
    return table.columns[1][0], table["ratio_today"][0]


def test_last_of_several_rises_counts(make_history, curves):
    redshift, _ = outcome(make_history, curves, curves.wave(0.5, 0.4, 3.0, 1.0), 0.5)
    assert 1 + redshift == pytest.approx(np.e, rel=1e-8)  # rises at ln a = -1 and 2 pi/3, 4 pi/3 before


def test_a_rise_lost_again_counts_and_the_ratio_today_tells(make_history, curves):
    redshift, today = outcome(make_history, curves, curves.wave(0.5, 0.4, 3.0, 1.3), 0.5)
    assert 1 + redshift == pytest.approx(np.exp(1.3), rel=1e-8)
    assert today == pytest.approx(0.5 + 0.4 * np.sin(3.9), rel=1e-14)
    assert today < 0.5


def test_never_reached_is_empty(make_history, curves):
    redshift, _ = outcome(make_history, curves, curves.wave(0.5, 0.4, 3.0, 1.0), 0.95)
    assert redshift is np.ma.masked


def test_fallen_below_and_not_back_is_empty(make_history, curves):
    falling = (lambda x: 1.0 - 0.1 * (x + 6.0), lambda x: -0.1 + 0 * x)  # 1 at the start, 0.4 today
    redshift, today = outcome(make_history, curves, falling, 0.5)
    assert redshift is np.ma.masked
    assert today == pytest.approx(0.4, rel=1e-14)


def test_never_below_is_infinite(make_history, curves):
    redshift, _ = outcome(make_history, curves, curves.wave(0.5, 0.4, 3.0, 1.0), 0.05)
    assert redshift == np.inf


def test_reaching_it_today_is_redshift_zero(make_history, curves):
    rising = (lambda x: 0.5 + 0.05 * x, lambda x: 0.05 + 0 * x)
    redshift, _ = outcome(make_history, curves, rising, 0.5)
    assert redshift == pytest.approx(0.0, abs=1e-12)


@pytest.mark.parametrize("sign", [1, -1])
def test_dark_matter_through_zero(make_history, sign):
    # b = 2 + 1/(2 (ln a + 1)): sinks through 1/2 at ln a = -4/3, to minus infinity at ln a = -1, and comes
    # down from plus infinity after. The pole is where it was last below.
    dark = (lambda x: sign * (x + 1), lambda x: sign + 0 * x)
    baryon = (lambda x: sign * (2 * x + 2.5), lambda x: 2 * sign + 0 * x)
    table = catchup_table(make_history([dark], [baryon], start=-3.0, step=0.07), [0.5])
    assert 1 + table["redshift_at_50_percent"][0] == pytest.approx(np.e, rel=1e-12)


def test_repeated_last_steps_change_nothing(make_history, curves):
    history = make_history([curves.power(0)], [curves.wave(0.5, 0.4, 3.0, 1.0)], start=-6.0)
    plain = catchup_table(history, [0.5, 0.95])
    for name, values in vars(history.trace).items():
        setattr(history.trace, name, np.concatenate([values, values[:, -1:], values[:, -1:]], axis=1))
    padded = catchup_table(history, [0.5, 0.95])
    assert padded["redshift_at_50_percent"][0] == plain["redshift_at_50_percent"][0]
    assert padded["redshift_at_95_percent"].mask.all()


def test_many_modes_at_once_are_each_alone(make_history, curves):
    waves = [curves.wave(0.5, 0.4, rate, 0.7) for rate in (0.5, 2.0, 5.0, 11.0)]
    together = catchup_table(make_history([curves.power(1)] * 4, [scaled(w) for w in waves]), [0.3, 0.8])
    for mode, ratio in enumerate(waves):
        alone = catchup_table(make_history([curves.power(1)], [scaled(ratio)]), [0.3, 0.8])
        for name in ("redshift_at_30_percent", "redshift_at_80_percent", "ratio_today"):
            assert together[name].filled(-1)[mode] == alone[name].filled(-1)[0]


def scaled(curve):
    """Curve times a, with its derivative."""
    return (lambda x: np.exp(x) * curve[0](x), lambda x: np.exp(x) * (curve[0](x) + curve[1](x)))


@pytest.mark.parametrize(
    ("fraction", "name"),
    [
        (0.5, "redshift_at_50_percent"),
        (0.955, "redshift_at_95p5_percent"),
        (0.29, "redshift_at_29_percent"),  # 0.29 * 100 is 28.999999999999996
        (1.0, "redshift_at_100_percent"),
        (1e-5, "redshift_at_0p001_percent"),
    ],
)
def test_column_name_is_the_fraction_as_written(make_history, curves, fraction, name):
    table = catchup_table(make_history([curves.power(1)], [curves.power(1, 0.5)]), [fraction])
    assert table.colnames == ["wavenumber", name, "ratio_today"]
    number = name.split("_")[2].replace("p", ".")
    assert f"rises through {number} per cent" in table[name].description


@pytest.mark.parametrize(("fractions", "told"), [((0.0,), "0.0"), ((0.5, 1.5), "1.5"), ((np.nan,), "nan")])
def test_fraction_out_of_range_is_refused(make_history, curves, fractions, told):
    history = make_history([curves.power(1)], [curves.power(1)])
    with pytest.raises(ValueError, match=f"fractions: .*{told}.* is not above 0 and at most 1"):
        catchup_table(history, fractions)


def test_fraction_given_twice_is_refused(make_history, curves):
    history = make_history([curves.power(1)], [curves.power(1)])
    with pytest.raises(ValueError, match=r"fractions: 0\.5 is given twice"):
        catchup_table(history, (0.5, 0.9, 0.5))


def test_without_dark_matter_all_is_empty(make_history, curves):
    table = catchup_table(make_history([curves.power(1)], [curves.power(1, 2.0)], has_dark_matter=False))
    for name in table.colnames[1:]:
        assert table[name].mask.all(), name
        assert np.isnan(table[name].data.data).all(), name  # nothing to read under the mask either
    assert "no dark matter" in table.meta["no_dark_matter"]
