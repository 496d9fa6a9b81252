r"""How large the error that all polls share has been, by the desk's own record of past elections.

The error of a final poll average has variance :math:`c^2 p(1-p)`, p the result. One past error e thus says
:math:`e^2 / p(1-p)` of c². A desk's record is short, so it is pulled twice: all parties together towards the
published size, which counts as much as some twenty errors, and each party towards all together. This is the
posterior mean of a variance under a conjugate prior, with fixed weights. The record holds the sampling error
of those averages too: the size errs on the large side.
"""

from __future__ import annotations

import numpy as np

from models.arrays import Floats, Indices

# As many past errors as the published size counts for: four elections with five parties.
PUBLISHED_COUNTS_AS = 20.0
# As many past errors of a party as the size common to all parties counts for.
COMMON_COUNTS_AS = 8.0
# Shares nearer to nought or one say nothing of a size that goes as √(p(1−p)).
LEAST_SHARE = 0.005


def recorded_size(
    *, polled: Floats, result: Floats, party: Indices, parties: int, published: float
) -> Floats:
    """Size c of the shared lean by party, log units × √p; dims (party).

    Parameters
    ----------
    polled, result
        Final poll average and result, shares 0–1, dims (error).
    party
        Position of each error's party, −1 for one that does not stand any more, dims (error).
    parties
        Number of parties.
    published
        c as published.
    """
    share = np.clip(result, LEAST_SHARE, 1 - LEAST_SHARE)
    squared = (polled - result) ** 2 / (share * (1 - share))
    common = (PUBLISHED_COUNTS_AS * published**2 + squared.sum()) / (PUBLISHED_COUNTS_AS + len(squared))
    own = party >= 0
    count = np.bincount(party[own], minlength=parties)
    total = np.bincount(party[own], weights=squared[own], minlength=parties)
    return np.asarray(np.sqrt((COMMON_COUNTS_AS * common + total) / (COMMON_COUNTS_AS + count)))
