"""Which variables failure comes from: sensitivity factors from failure-conditional means."""

import numpy as np
from numpy.typing import NDArray
from scipy import special

from assess.probability.normal_space import normal_scores
from assess.reliability.importance import Sample
from assess.reliability.problem import SectionState, dimensions

FloatArray = NDArray[np.float64]

VARIABLE_LOAD = "variable load"
# Group of a common variable by the end of its name.
_COMMON_GROUPS = {
    "concrete_mean": "concrete strength",
    "concrete_scatter": "concrete strength",
    "cover_mean": "cover and depth",
    "cover_scatter": "cover and depth",
    "onset": "onset of corrosion",
    "onset_scatter": "onset of corrosion",
    "current": "corrosion rate",
    "current_scatter": "corrosion rate",
    "depth_deviation": "cover and depth",
    "depth_scatter": "cover and depth",
    **{
        f"{dimension}_{part}": "dimensions"
        for dimension in ("width", "flange_thickness")
        for part in ("deviation", "scatter")
    },
}


def sensitivity_factors(state: SectionState, sample: Sample, year: int) -> dict[str, float]:
    r"""Sensitivity factors of groups of variables for failure in one year.

    Parameters
    ----------
    state : SectionState
        The section.
    sample : Sample
        Its weighted sample.
    year : int
        Index of the year.

    Returns
    -------
    dict of str to float
        Group in words to sensitivity factor, largest first; their squares sum to 1.

    Notes
    -----
    In standard normal space the mean of the variables given failure points towards failure; for
    a linear limit state it is the design point times a factor [1]_, so its direction cosines
    are the sensitivity factors. Independent variables (local ones, the year's load) give the
    square of their mean. Common variables are dependent after updating: with scores s of
    correlation R and mean m given failure, :math:`m^T R^{-1} m` is shared out as
    :math:`m_i (R^{-1} m)_i`. The load's mean given that it exceeds the capacity is that of a
    truncated normal.

    References
    ----------
    .. [1] O. Ditlevsen, H. O. Madsen, Structural Reliability Methods, 1996, chapters 5 and 8.
    """
    failing = sample.given_past() * -np.expm1(-sample.hazard[..., year])
    total = failing.sum()
    shares: dict[str, float] = {}

    def add(group: str, share: float) -> None:
        shares[group] = shares.get(group, 0.0) + share

    if not total > 0.0:
        return {}
    means = np.einsum("rcp,rcpi->i", failing, sample.z) / total
    for (_, group), mean in zip(dimensions(state).items(), means, strict=True):
        add(group, float(mean**2))
    add(VARIABLE_LOAD, _load_mean(sample.hazard[..., year], failing, total) ** 2)
    by_draw = sample.per_draw(failing.sum(axis=0)) / total
    for group, share in _common_shares(state, by_draw):
        add(group, share)
    positive = {group: max(share, 0.0) for group, share in shares.items()}
    norm = sum(positive.values())
    ordered = sorted(positive.items(), key=lambda item: -item[1])
    return {group: float(np.sqrt(share / norm)) for group, share in ordered}


def _common_group(name: str) -> str:
    """Name the group that a common variable counts to."""
    if name.startswith("load."):
        return VARIABLE_LOAD
    if name.startswith("quantity."):
        return "permanent load"
    return _COMMON_GROUPS.get(name.rpartition(".")[2], "steel strength")


def _load_mean(hazard: FloatArray, failing: FloatArray, total: float) -> float:
    """Mean score of the year's load given failure."""
    log_tail = np.log(np.maximum(-np.expm1(-hazard), 1e-300))
    threshold = -special.ndtri_exp(log_tail)
    density = -0.5 * threshold**2 - 0.5 * np.log(2.0 * np.pi)
    exceeding = np.where(hazard > 30.0, 0.0, np.exp(density - log_tail))
    return float((failing * exceeding).sum() / total)


def _common_shares(state: SectionState, by_draw: FloatArray) -> list[tuple[str, float]]:
    """Share out the common variables' part; ``by_draw`` is each draw's share of failure."""
    columns = {name: draws for name, draws in state.common.items() if np.ptp(draws) > 0.0}
    if not columns:
        return []
    groups = [_common_group(name) for name in columns]
    scores = normal_scores(np.column_stack(list(columns.values())))
    mean = by_draw @ scores
    correlation = np.corrcoef(scores, rowvar=False)
    pull = np.linalg.lstsq(np.atleast_2d(correlation), mean, rcond=1e-8)[0]
    return [(group, float(share)) for group, share in zip(groups, mean * pull, strict=True)]
