"""Chloride ingress: recomputed examples of the published equations, quadrature, closed forms."""

import numpy as np
import pytest
from scipy import integrate, special

from assess.mechanics import chloride

SECONDS = 365.25 * 86400.0
MM2_PER_YEAR = 1e6 * SECONDS  # of 1 m²/s
FIB = "fib Bulletin 34 (2006), equations and parameters from memory"

# Migration coefficient [1e-12 m²/s], age [yr], exponent, temperature [K], surface, initial,
# cover, convection depth [mm], apparent coefficient [mm²/yr], content. Examples of our own,
# recomputed apart from the code with a year of 365.25 days; all digits printed.
EXAMPLES = [
    (10.0, 50.0, 0.30, 283.0, 3.0, 0.1, 50.0, 0.0, 25.31908, 1.029100),
    (10.0, 50.0, 0.30, 283.0, 3.0, 0.1, 50.0, 10.0, 25.31908, 1.337275),
    (8.9, 50.0, 0.30, 288.0, 2.5, 0.0, 45.0, 8.9, 30.24977, 1.278971),
    (1.4, 100.0, 0.45, 293.0, 3.0, 0.1, 40.0, 0.0, 1.75142, 0.194481),
    (7.0, 50.0, 0.60, 283.0, 4.0, 0.1, 45.0, 10.0, 2.53684, 0.209151),
]


@pytest.mark.published(source=FIB, place="annex B2, k_e")
@pytest.mark.parametrize(
    ("kelvin", "factor"),
    [(278.15, 0.417019), (283.0, 0.560527), (288.0, 0.752455), (293.0, 1.0), (303.0, 1.717154)],
)
def test_temperature_factor(kelvin, factor):
    assert chloride.temperature_factor(kelvin) == pytest.approx(factor, abs=5e-7)


@pytest.mark.published(source=FIB, place="annex B2, D_app and C(x, t)")
@pytest.mark.parametrize("example", EXAMPLES)
def test_recomputed_examples_of_the_full_equation(example):
    migration, age, exponent, kelvin, surface, initial, cover, convection, app, content = example
    found = chloride.apparent_from_migration(
        migration * 1e-12 * MM2_PER_YEAR, 0.0767, age, exponent, kelvin
    )
    assert found == pytest.approx(app, abs=6e-6)
    length = chloride.diffusion_length(found, age)
    at_bar = chloride.chloride_content(cover, length, surface, initial, convection)
    assert at_bar == pytest.approx(content, abs=6e-7)


@pytest.mark.published(source="Gaussian error integral, constant coefficient", place="C / C_s")
def test_constant_coefficient():
    diffusion = 1e-12 * MM2_PER_YEAR
    length = chloride.diffusion_length(diffusion, 50.0)
    assert chloride.chloride_content(50.0, length, 1.0) == pytest.approx(0.3734351, abs=5e-8)
    onset = chloride.chloride_onset(50.0, 0.4, 1.0, diffusion, 1.0, 0.0)
    assert onset == pytest.approx(55.92071, abs=5e-6)


@pytest.mark.published(source=FIB, place="annex B2, time to the critical content")
def test_onset_of_the_first_example():
    diffusion = chloride.temperature_factor(283.0) * 1e-11 * MM2_PER_YEAR
    onset = chloride.chloride_onset(50.0, 0.6, 3.0, diffusion, 0.0767, 0.30, 0.1)
    assert onset == pytest.approx(20.20566, abs=5e-6)


def test_diffusion_equation_holds():
    # Fick's second law by differences: dC/dt = D d²C/dx² with constant D.
    def content(depth, age):
        return chloride.chloride_content(depth, chloride.diffusion_length(20.0, age), 2.0, 0.1, 8.0)

    h, k = 0.05, 0.01
    by_time = (content(30.0, 25.0 + k) - content(30.0, 25.0 - k)) / (2.0 * k)
    curvature = (content(30.0 + h, 25.0) - 2.0 * content(30.0, 25.0) + content(30.0 - h, 25.0)) / (
        h * h
    )
    assert by_time == pytest.approx(20.0 * curvature, rel=1e-4)
    assert content(8.0, 25.0) == pytest.approx(2.0)


@pytest.mark.parametrize(
    ("start", "end", "length"), [(10.0, 20.0, 60.0), (8.0, 9.0, 5.0), (60.0, 80.0, 22.0)]
)
def test_mean_of_an_increment_is_that_of_the_content_over_it(start, end, length):
    def content(depth):
        return chloride.chloride_content(depth, length, 2.5, 0.05, 8.0)

    mean = integrate.quad(content, start, end, epsabs=0.0, epsrel=1e-12)[0] / (end - start)
    found = chloride.mean_content(start, end, length, 2.5, 0.05, 8.0)
    assert found == pytest.approx(mean, rel=1e-10)


def test_far_from_the_surface_the_mean_keeps_its_digits():
    # Asymptotic series of the repeated integral (NIST DLMF 7.18.14), with the nearer bound alone.
    u = 6.0
    series = np.exp(-u * u) / (2.0 * np.sqrt(np.pi) * u**2)
    series *= 1.0 - 3.0 / (2.0 * u**2) + 15.0 / (4.0 * u**4) - 105.0 / (8.0 * u**6)
    assert chloride.integrated_erfc(u) == pytest.approx(series, rel=2e-4)
    assert chloride.mean_penetration(6.0, 60.0, 1.0) == pytest.approx(series / 54.0, rel=2e-4)


def test_onset_puts_the_critical_content_at_the_bar():
    rng = np.random.default_rng(1)
    n = 200
    cover, critical = rng.uniform(30.0, 60.0, n), rng.uniform(0.4, 0.8, n)
    surface, diffusion = rng.uniform(0.9, 4.0, n), rng.uniform(50.0, 400.0, n)
    exponent = rng.uniform(0.0, 0.7, n)
    onset = chloride.chloride_onset(cover, critical, surface, diffusion, 0.0767, exponent, 0.1, 7.0)
    apparent = chloride.apparent_diffusion(diffusion, 0.0767, onset, exponent)
    content = chloride.chloride_content(
        cover, chloride.diffusion_length(apparent, onset), surface, 0.1, 7.0
    )
    np.testing.assert_allclose(content, critical, rtol=1e-9)


def test_onset_at_the_ends_of_its_range():
    common = {"diffusion": 100.0, "reference_age": 1.0, "age_exponent": 0.3}
    assert chloride.chloride_onset(40.0, 0.6, 0.6, **common) == np.inf
    assert chloride.chloride_onset(40.0, 0.6, 0.5, initial=0.1, **common) == np.inf
    assert chloride.chloride_onset(40.0, 0.6, 2.0, initial=0.6, **common) == 0.0
    assert chloride.chloride_onset(40.0, 0.6, 0.3, initial=0.7, **common) == 0.0
    assert chloride.chloride_onset(8.0, 0.6, 2.0, convection_depth=10.0, **common) == 0.0
    assert chloride.chloride_onset(8.0, 0.6, 0.5, convection_depth=10.0, **common) == np.inf


def test_with_an_age_exponent_of_one_the_profile_stands_still():
    # sqrt(D t) is sqrt(D_0 t_0) at any age: 10 mm here.
    constant = chloride.chloride_content(15.0, 20.0, 2.0)
    common = {"diffusion": 100.0, "reference_age": 1.0, "age_exponent": 1.0}
    assert chloride.chloride_onset(15.0, 1.01 * constant, 2.0, **common) == np.inf
    assert chloride.chloride_onset(15.0, 0.99 * constant, 2.0, **common) == 0.0


@pytest.mark.published(source=FIB, place="annex B2, reliability of the depassivation limit state")
def test_probability_of_depassivation_of_a_recomputed_case():
    # Sobol points, standard error 7e-5, apart from the code: P(C > C_crit) = 0.69407 at 50 years.
    from scipy import stats

    u = stats.qmc.Sobol(6, seed=3).random_base2(16)
    normal = stats.norm.ppf(u)
    exponent = stats.beta(4.07500, 9.50833).ppf(u[:, 0])
    diffusion = (10.0 + 2.0 * normal[:, 1]) * 1e-12 * MM2_PER_YEAR
    factor = chloride.temperature_factor(283.0, 4800.0 + 700.0 * normal[:, 2])
    spread = np.sqrt(np.log1p(0.3**2))
    surface = 3.0 * np.exp(spread * normal[:, 3] - 0.5 * spread**2)
    cover = 50.0 + 6.0 * normal[:, 4]
    critical = 0.2 + 1.8 * stats.beta(5.30864, 18.58025).ppf(u[:, 5])
    onset = chloride.chloride_onset(cover, critical, surface, diffusion * factor, 0.0767, exponent)
    assert np.mean(onset < 50.0) == pytest.approx(0.69407, abs=7e-4)


def test_graph_and_numbers_agree():
    tensor = pytest.importorskip("pytensor.tensor")
    diffusion, exponent = tensor.dscalar(), tensor.dscalar()
    apparent = chloride.apparent_diffusion(diffusion, 0.0767, 30.0, exponent)
    length = chloride.diffusion_length(apparent, 30.0)
    graph = chloride.mean_content(12.0, 20.0, length, 2.5, 0.1, 8.0)
    found = graph.eval({diffusion: 150.0, exponent: 0.4}, mode="FAST_COMPILE")
    reach = 2.0 * np.sqrt(150.0 * (0.0767 / 30.0) ** 0.4 * 30.0)
    mean = integrate.quad(lambda x: special.erfc((x - 8.0) / reach), 12.0, 20.0)[0] / 8.0
    assert found == pytest.approx(0.1 + 2.4 * mean, rel=1e-10)
