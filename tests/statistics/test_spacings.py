"""Level spacings of mixed systems against their limits, quadrature, and samples (Berry and Robnik, 1984)."""

import math

import numpy as np
import pytest
from scipy.integrate import quad
from scipy.special import erfc
from scipy.stats import kstest

from scanner.errors import ScannerError
from scanner.statistics import draw_spacings, gap_probability, spacing_cumulative, spacing_density, spacing_moment

MIXTURES = [
    (0.0, None),
    (1.0, None),
    (0.3, None),
    (0.3, (0.5, 0.2)),
    (0.0, (0.5, 0.5)),
    (0.2, (0.3, 0.3, 0.2)),
]
S = np.linspace(0.0, 6.0, 61)


def test_wigner_without_a_regular_part():
    """(pi / 2) S exp(-pi S^2 / 4), and 1 - exp(-pi S^2 / 4): exact."""
    wigner = 0.5 * math.pi * S * np.exp(-0.25 * math.pi * S**2)
    np.testing.assert_allclose(spacing_density(S, 0.0), wigner, rtol=1e-13)  # rounding of exponents up to 30
    np.testing.assert_allclose(spacing_cumulative(S, 0.0), -np.expm1(-0.25 * math.pi * S**2), rtol=1e-13)


def test_poisson_without_chaos():
    np.testing.assert_allclose(spacing_density(S, 1.0), np.exp(-S), rtol=1e-14)
    np.testing.assert_allclose(spacing_cumulative(S, 1.0), -np.expm1(-S), rtol=1e-14)


def test_density_at_zero():
    """P(0) = 1 - sum of the squares of the chaotic components: exact."""
    for regular, chaotic in MIXTURES:
        components = np.array([1.0 - regular] if chaotic is None else chaotic)
        assert spacing_density(0.0, regular, chaotic) == pytest.approx(1.0 - (components**2).sum(), abs=1e-15)


def test_gap_probability_is_the_closed_form():
    """E(S) = exp(-rho_1 S) prod_i erfc(sqrt(pi) rho_i S / 2), written out here."""
    plain = np.exp(-0.3 * S) * erfc(0.5 * math.sqrt(math.pi) * 0.5 * S) * erfc(0.5 * math.sqrt(math.pi) * 0.2 * S)
    np.testing.assert_allclose(gap_probability(S, 0.3, (0.5, 0.2)), plain, rtol=1e-13)


@pytest.mark.parametrize(("regular", "chaotic"), MIXTURES)
def test_density_and_cumulative_are_derivatives(regular, chaotic):
    """P = W' = E'' and W = 1 + E': by central differences of step h, whose error is h^2 plus rounding / h."""
    s, h = np.linspace(0.1, 4.0, 30), 1e-5
    slope = (gap_probability(s + h, regular, chaotic) - gap_probability(s - h, regular, chaotic)) / (2.0 * h)
    np.testing.assert_allclose(spacing_cumulative(s, regular, chaotic), 1.0 + slope, atol=1e-9)
    density = (spacing_cumulative(s + h, regular, chaotic) - spacing_cumulative(s - h, regular, chaotic)) / (2.0 * h)
    np.testing.assert_allclose(spacing_density(s, regular, chaotic), density, atol=1e-9)


@pytest.mark.parametrize(("regular", "chaotic"), MIXTURES)
def test_moments(regular, chaotic):
    """Norm and mean are 1; all orders against quadrature of the density, good to 1e-10."""
    for order in range(5):
        direct = quad(lambda s, k=order: s**k * spacing_density(s, regular, chaotic), 0.0, 60.0, limit=200)[0]
        assert spacing_moment(order, regular, chaotic) == pytest.approx(direct, rel=1e-8)
    assert spacing_moment(0, regular, chaotic) == spacing_moment(1, regular, chaotic) == 1.0


def test_second_moments_in_closed_form():
    """4 / pi (Wigner), 2 (Poisson), and 2 (1 - erfcx(r / 2a)) / r, a = sqrt(pi) c / 2, between (computed here)."""
    assert spacing_moment(2, 0.0) == pytest.approx(4.0 / math.pi, rel=1e-10)
    assert spacing_moment(2, 1.0) == pytest.approx(2.0, rel=1e-10)
    r = 0.3
    reach = r / (math.sqrt(math.pi) * (1.0 - r))
    closed = 2.0 * (1.0 - math.exp(reach**2) * math.erfc(reach)) / r
    assert spacing_moment(2, r) == pytest.approx(closed, rel=1e-10)


def test_small_probabilities_and_far_tails_keep_their_digits():
    """Near 0, W = P(0) S up to S^2; far out the logarithm of the density still falls like -pi c^2 S^2 / 4."""
    assert spacing_cumulative(1e-12, 0.3) == pytest.approx(0.51e-12, rel=1e-11)
    assert spacing_cumulative(1e-9, 0.0) == pytest.approx(0.25 * math.pi * 1e-18, rel=1e-12)
    assert spacing_density(20.0, 0.0) == pytest.approx(10.0 * math.pi * math.exp(-100.0 * math.pi), rel=1e-12)
    # 6 chaotic components of 1/6 have E = erfc(x)^6, which plain differences would lose below 1e-16.
    assert 0.0 < spacing_density(30.0, 0.0, (1 / 6,) * 6) < 1e-30


@pytest.mark.parametrize(("regular", "chaotic"), MIXTURES)
def test_samples_follow_the_cumulative_form(regular, chaotic):
    """Kolmogorov-Smirnov; with one seed a right sampler fails with probability 1e-3."""
    drawn = draw_spacings(20_000, regular, chaotic, generator=np.random.default_rng(3))
    assert kstest(drawn, lambda s: spacing_cumulative(s, regular, chaotic)).pvalue > 1e-3


def test_samples_of_another_mixture_are_told_apart():
    """Negative control: a regular part off by 0.1, and one chaotic component instead of two."""
    drawn = draw_spacings(20_000, 0.3, (0.5, 0.2), generator=np.random.default_rng(3))
    assert kstest(drawn, lambda s: spacing_cumulative(s, 0.4, (0.4, 0.2))).pvalue < 1e-3
    assert kstest(drawn, lambda s: spacing_cumulative(s, 0.3)).pvalue < 1e-3


def test_samples_depend_on_the_generator_alone():
    first, second = (draw_spacings(5, 0.4, generator=np.random.default_rng(7)) for _ in range(2))
    np.testing.assert_array_equal(first, second)
    assert draw_spacings(0, 0.4, generator=np.random.default_rng(7)).shape == (0,)


def test_shapes_follow_the_spacings():
    grid = S[:60].reshape(3, 4, 5)
    for function in (gap_probability, spacing_density, spacing_cumulative):
        assert function(grid, 0.3, (0.5, 0.2)).shape == grid.shape
        np.testing.assert_array_equal(function(grid, 0.3, (0.5, 0.2)).ravel(), function(S[:60], 0.3, (0.5, 0.2)))


@pytest.mark.parametrize(
    ("call", "message"),
    [
        (lambda: spacing_density(1.0, 1.2), "1.2 of the energy shell"),
        (lambda: spacing_density(1.0, 0.3, (0.5, 0.1)), "add up to 0.9"),
        (lambda: gap_probability(-1.0, 0.3), "negative"),
        (lambda: spacing_cumulative(math.nan, 0.3), "not a finite number"),
        (lambda: spacing_moment(-1, 0.3), "order = -1"),
        (lambda: draw_spacings(-1, 0.3, generator=np.random.default_rng(1)), "count = -1"),
    ],
)
def test_bad_requests_are_refused_in_one_line(call, message):
    with pytest.raises(ScannerError, match=message) as caught:
        call()
    assert "\n" not in str(caught.value)
