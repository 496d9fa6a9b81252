"""Whether a random sample names the leader: the size a question needs, before any model."""

from __future__ import annotations

from scipy.stats import binom


def chance_sample_names_leader(respondents: int, *, share: float) -> float:
    """Chance that the leader of a two-way race leads among randomly drawn respondents.

    Exact binomial; a sample that splits evenly names the leader half of the time. The size of the
    electorate hardly matters. A sample with a design effect counts as ``respondents`` over that effect.

    Parameters
    ----------
    respondents
        Size of a simple random sample.
    share
        Share of the leader among the two, above 0.5 and up to 1.

    Raises
    ------
    ValueError
        Where ``share`` is not above 0.5, or above 1, or the sample is empty.

    Examples
    --------
    >>> round(chance_sample_names_leader(1001, share=0.52), 3)
    0.897
    """
    if not 0.5 < share <= 1:
        raise ValueError(f"share is {share}; expected the leader's share, above 0.5 and up to 1.")
    if respondents < 1:
        raise ValueError(f"respondents is {respondents}; expected a whole number above 0.")
    half = respondents // 2
    leads = float(binom.sf(half, respondents, share))
    return leads if respondents % 2 else leads + float(binom.pmf(half, respondents, share)) / 2
