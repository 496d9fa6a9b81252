"""Words for chances: the calibrated scale of the IPCC, and no other words.

References
----------
.. [1] Mastrandrea, M. D., et al. (2010). Guidance Note for Lead Authors of the IPCC Fifth Assessment
   Report on Consistent Treatment of Uncertainties, table 1. Intergovernmental Panel on Climate Change.
"""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True)
class LikelihoodBand:
    """A term of the scale and the chances it covers, both ends included.

    Attributes
    ----------
    word
        The term.
    low, high
        Ends of the band, as probabilities.
    """

    word: str
    low: float
    high: float

    def holds(self, probability: float) -> bool:
        """Whether a probability lies in the band."""
        return self.low <= probability <= self.high


# The bands are nested: 0.95 is both likely and very likely. Listed from the narrowest to the widest; where
# two bands of one width meet (at 0.33), the one named first is used.
LIKELIHOOD_SCALE = (
    LikelihoodBand("virtually certain", 0.99, 1.0),
    LikelihoodBand("exceptionally unlikely", 0.0, 0.01),
    LikelihoodBand("very likely", 0.90, 1.0),
    LikelihoodBand("very unlikely", 0.0, 0.10),
    LikelihoodBand("about as likely as not", 0.33, 0.66),
    LikelihoodBand("unlikely", 0.0, 0.33),
    LikelihoodBand("likely", 0.66, 1.0),
)
LIKELIHOOD_WORDS = tuple(band.word for band in LIKELIHOOD_SCALE)

NAMED_LEADER_FROM = 0.66
"""No party is called the leader below this chance: the lower end of "likely"."""


def likelihood_word(probability: float) -> str:
    """Word a chance by the narrowest band of the scale that holds it.

    Parameters
    ----------
    probability
        A probability from 0 to 1.

    Raises
    ------
    ValueError
        If the value is not a probability.
    """
    for band in LIKELIHOOD_SCALE:
        if band.holds(probability):
            return band.word
    raise ValueError(f"a probability lies between 0 and 1; got {probability!r}")
