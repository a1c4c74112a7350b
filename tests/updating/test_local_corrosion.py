"""Onset and current at a section that was broken out, against sums over a fine grid."""

import numpy as np
import pytest
from scipy import stats

from assess.mechanics.corrosion import penetration_depth
from assess.updating import corrosion_history as history
from assess.updating.corrosion_history import Population
from assess.updating.local_corrosion import measured_corrosion
from tests.updating.test_corrosion_history import DESIGNS, _rows, _zone

COUNT = 20_000
PARAMETERS = [(35.0, 0.3, 3.0, 0.5), (25.0, 0.6, 1.5, 0.2)]


def _local(visits, zone, count=COUNT):
    population = Population(*(np.full(count, p) for p in zone))
    return measured_corrosion(history.places(_rows(visits), 9).one(0), population)


def _scores(count, dimension, seed=3):
    return np.random.default_rng(seed).standard_normal((count, 1, dimension))


@pytest.mark.parametrize("name", DESIGNS)
@pytest.mark.parametrize("parameters", PARAMETERS)
def test_local_values_have_the_moments_of_the_joint_density(name, parameters):
    visits, zone = DESIGNS[name](50.0), _zone(*parameters)
    found = _local(visits, zone).values(_scores(COUNT, 2), np.arange(COUNT))
    drawn = np.stack(
        [np.log(found["onset"][:, 0]), np.log(penetration_depth(found["current"][:, 0], 1.0))]
    )
    expected = _joint_moments(visits, zone)
    for k, series in enumerate((*drawn, drawn[0] ** 2, drawn[1] ** 2, drawn[0] * drawn[1])):
        error = series.std() / np.sqrt(COUNT)
        assert series.mean() == pytest.approx(expected[k], abs=4.5 * error + 2e-4)


@pytest.mark.parametrize("name", ["found", "none", "none, then found"])
def test_tails_of_the_onset_are_exact(name):
    # The distribution function of the onset given the findings, summed on a fine grid.
    visits, zone = DESIGNS[name](50.0), _zone(*PARAMETERS[0])
    log_onset, _, weight = _grid(visits, zone, 1501, 14001)
    mass = weight.sum(axis=1)
    below = mass.cumsum() - 0.5 * mass
    for score in (-4.0, -3.0, -1.0, 0.0, 1.0, 3.0):
        z = np.array([[[score, 0.0]]])
        onset = _local(visits, zone, 1).values(z, np.array([0]))["onset"][0, 0]
        share = np.interp(np.log(onset), log_onset[:, 0], below)
        tail = min(share, 1.0 - share)
        assert tail == pytest.approx(stats.norm.sf(abs(score)), rel=0.05)


def test_without_dependence_the_marginals_stay_and_the_ridge_goes():
    visits, zone = DESIGNS["found"](50.0), _zone(*PARAMETERS[0])
    joint = _local(visits, zone)
    torn = joint.without_dependence(np.random.default_rng(1))
    assert len(torn.normals) == 3
    draws = np.arange(COUNT)
    kept = joint.values(_scores(COUNT, 2), draws)
    dropped = torn.values(_scores(COUNT, 3, seed=4), draws)
    for name in ("onset", "current"):
        assert stats.ks_2samp(kept[name][:, 0], dropped[name][:, 0]).pvalue > 0.001
    assert stats.spearmanr(kept["onset"], kept["current"]).statistic > 0.3
    assert abs(stats.spearmanr(dropped["onset"], dropped["current"]).statistic) < 0.03
    assert torn.without_dependence(np.random.default_rng(2)) is torn


def _grid(visits, zone, n_onset=3001, n_rate=1401):
    """ln onset (n, 1), ln rate (1, m) and normalised weights (n, m) on a fine grid of scores."""
    z_onset = np.linspace(-7.0, 7.0, n_onset)
    z_rate = np.linspace(-7.0, 7.0, n_rate)
    log_onset = (zone[0] + zone[1] * z_onset)[:, None]
    log_rate = (zone[2] + zone[3] * z_rate)[None, :]
    log_weight = -0.5 * z_onset[:, None] ** 2 - 0.5 * z_rate[None, :] ** 2
    allowed = np.ones(log_weight.shape)
    for age, loss, limit, variation in visits:
        years = np.maximum(age - np.exp(log_onset), 1e-300)
        log_loss = log_rate + np.log(years)
        if np.isnan(loss):
            allowed = allowed * (log_loss < np.log(limit))
        else:
            allowed = allowed * (log_loss >= np.log(limit))
            log_weight = log_weight - 0.5 * (np.log(loss) - log_loss) ** 2 / np.log1p(variation**2)
    weight = np.exp(log_weight - log_weight.max()) * allowed
    return log_onset, log_rate, weight / weight.sum()


def _joint_moments(visits, zone):
    """E of ln onset, ln rate, their squares and product."""
    log_onset, log_rate, weight = _grid(visits, zone)
    parts = (log_onset, log_rate, log_onset**2, log_rate**2, log_onset * log_rate)
    return [float((weight * part).sum()) for part in parts]
