"""Pooled zones and priors that the case puts in place of the tool's own."""

import numpy as np
import pytest
from scipy import stats

from assess.errors import CaseError
from assess.pipeline import check_case
from assess.updating.prior import joint_prior
from tests.verification import cases

SHARE = {"distribution": "beta", "mean": 0.5, "sd": 0.25, "lower": 0, "upper": 1, "source": "test"}


def two_zones(**more):
    raw = cases.base()
    raw["zones"]["wall"] = dict(raw["zones"]["deck"])
    return raw | more


def pooling(share=SHARE, variable="concrete_mean"):
    return [{"variable": variable, "zones": ["deck", "wall"], "share": share}]


def draw(case, count=40_000):
    prior = joint_prior(case)
    z = np.random.default_rng(1).standard_normal((count, len(prior.names)))
    return dict(zip(prior.names, prior.physical(z).T, strict=True))


def test_pooling_leaves_the_prior_of_each_zone_as_it_is(make_case):
    plain, together = draw(make_case(two_zones())), draw(make_case(two_zones(pooling=pooling())))
    for name in ("deck.concrete_mean", "wall.concrete_mean", "deck.cover_mean"):
        assert stats.ks_2samp(plain[name], together[name]).pvalue > 1e-3


@pytest.mark.parametrize("own", [0.2, 0.7])
def test_zones_correlate_by_what_they_share(make_case, own):
    known = {"distribution": "constant", "mean": own, "source": "test"}
    drawn = draw(make_case(two_zones(pooling=pooling(known, "cover_mean"))))
    found = np.corrcoef(drawn["deck.cover_mean"], drawn["wall.cover_mean"])[0, 1]
    assert found == pytest.approx(1.0 - own, abs=0.02)  # both normal: 1 - w by definition


def test_a_stated_prior_takes_the_place_of_the_tools_own(make_case):
    stated = {"distribution": "normal", "mean": "1 in", "sd": "1 mm", "source": "trial pits"}
    prior = joint_prior(make_case(two_zones(priors={"deck.cover_mean": stated})))
    variable = next(v for v in prior.variables if v.name == "deck.cover_mean")
    assert variable.marginal.mean == pytest.approx(25.4)
    assert variable.source == "trial pits"


@pytest.mark.parametrize(
    ("more", "words"),
    [
        ({"priors": {"deck.cover_men": {}}}, "priors.deck.cover_men: there is no such variable"),
        (
            {"priors": {"deck.cover_mean": {"distribution": "normal", "mean": "3 MPa", "sd": 1,
                                            "source": "x"}}},
            "does not convert to mm",
        ),
        ({"pooling": pooling(variable="onset")}, "zone 'deck' has no such variable"),
        (
            {"pooling": [{"variable": "cover_mean", "zones": ["deck", "wal"], "share": SHARE}]},
            "did you mean 'wall'",
        ),
        ({"pooling": [*pooling(), *pooling()]}, "the variable is pooled twice"),
        (
            {"dependence": [{"between": ["deck.cover_mean", "meter.bias"], "spearman": 0.2,
                             "source": "x"}]},
            "there is no such variable, given meter.bias",
        ),
    ],
)  # fmt: skip
def test_faults_are_said_with_their_line(tmp_path, more, words):
    path = cases.write_case(tmp_path, two_zones(**more))
    faults = [str(fault) for fault in check_case(path).faults]
    assert any(words in fault for fault in faults), faults
    assert all(f"{path}:" in fault and ":0:" not in fault for fault in faults)


def test_a_share_beyond_one_is_refused(make_case):
    wide = {"distribution": "uniform", "lower": 0, "upper": 2, "source": "x"}
    with pytest.raises(CaseError, match="between 0 and 1"):
        make_case(two_zones(pooling=pooling(wide)))


def test_measuring_variables_may_depend_on_each_other(make_case):
    entries = [
        {"date": "2020-01-01", "cover": {"table": "a.csv", "zone": "deck", "meter": meter}}
        for meter in (cases.METER_A,)
    ]
    raw = cases.base(surveys=entries)
    raw["dependence"] = [
        {"between": ["cover_meter_1.bias", "deck.cover_mean"], "spearman": 0.3, "source": "x"}
    ]
    case = make_case(raw, {"a.csv": "location,cover [mm]\nA,40\nB,42\n"})
    prior = joint_prior(case)
    i, j = (prior.names.index(name) for name in raw["dependence"][0]["between"])
    assert prior.correlation[i, j] == pytest.approx(2.0 * np.sin(np.pi * 0.3 / 6.0))
