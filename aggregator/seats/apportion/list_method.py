"""The methods that turn votes of lists into seats: highest averages and largest remainder.

Highest averages divide each party's votes by a row of divisors and give the seats to the highest quotients.
Largest remainder divides the votes by a quota: every full quota is a seat, and the seats still open go to
the largest remainders.

References
----------
.. [1] Gallagher, M. (1991). Proportionality, disproportionality and electoral systems. Electoral Studies 10,
   33–51. doi:10.1016/0261-3794(91)90004-C
.. [2] Balinski, M. L. and Young, H. P. (2001). Fair Representation, 2nd ed. Brookings.
.. [3] Pukelsheim, F. (2017). Proportional Representation, 2nd ed. Springer. doi:10.1007/978-3-319-64707-4
"""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction

MODIFIED_FIRST_DIVISOR = Fraction(7, 5)
"""The first divisor of the modified Sainte-Laguë method (Gallagher 1991)."""

MOST_SEATS = 32767
"""The largest number of seats that can be shared out at once; seats are kept in 16 bits."""


@dataclass(frozen=True)
class HighestAverages:
    """Seats go to the highest quotients of votes and divisors.

    Attributes
    ----------
    first_divisor
        Divisor for a party's first seat; above 0 and below the second.
    step
        Distance of the later divisors: the k-th is ``1 + step (k - 1)``.
    """

    first_divisor: Fraction
    step: int

    def __post_init__(self) -> None:
        if not 0 < self.first_divisor < 1 + self.step:
            raise ValueError(
                f"first_divisor: got {self.first_divisor}; expected a number above 0 and below the second "
                f"divisor, {1 + self.step}"
            )

    def divisor(self, seat: int) -> Fraction:
        """Divisor for a party's seat of this number, counted from 1."""
        return self.first_divisor if seat == 1 else Fraction(1 + self.step * (seat - 1))


@dataclass(frozen=True)
class LargestRemainder:
    """Every full quota is a seat; seats still open go to the largest remainders.

    Attributes
    ----------
    quota_seats
        The quota is all votes divided by the seats and this number: 0 (Hare) or 1 (Droop).

    Notes
    -----
    The Droop quota is taken as it is, votes / (seats + 1), not rounded up to a whole vote: votes may be
    shares, and scaling all of them must change nothing. The unrounded quota is known by Hagenbach-Bischoff's
    name as well [3]_. It can be met ``seats + 1`` times, but only if every party's votes are a whole number
    of quotas. Then all parties have the same claim to their last seat, and one of them loses it: a tie.
    """

    quota_seats: int


ListMethod = HighestAverages | LargestRemainder
"""Any method; made by :func:`highest_averages` or :func:`largest_remainder`."""

_STEPS = {"dhondt": 1, "sainte_lague": 2, "modified_sainte_lague": 2}
_QUOTAS = {"hare": 0, "droop": 1}


def highest_averages(
    divisors: str = "dhondt", *, first_divisor: Fraction = MODIFIED_FIRST_DIVISOR
) -> HighestAverages:
    """Choose a method of highest averages by the name of its divisors.

    Parameters
    ----------
    divisors
        ``dhondt`` (1, 2, 3, …), ``sainte_lague`` (1, 3, 5, …) or ``modified_sainte_lague`` (as before, but
        for the first).
    first_divisor
        Of the modified method only; above 0 and below 3.

    Raises
    ------
    ValueError
        If the name is none of these, or the first divisor is not below the second.

    Examples
    --------
    >>> [str(highest_averages("modified_sainte_lague").divisor(seat)) for seat in (1, 2, 3)]
    ['7/5', '3', '5']
    """
    if divisors not in _STEPS:
        raise ValueError(f"divisors: got {divisors!r}; expected one of {', '.join(_STEPS)}")
    modified = divisors == "modified_sainte_lague"
    return HighestAverages(Fraction(first_divisor) if modified else Fraction(1), _STEPS[divisors])


def largest_remainder(quota: str = "hare") -> LargestRemainder:
    """Choose a method of largest remainder by the name of its quota.

    Parameters
    ----------
    quota
        ``hare`` (votes / seats) or ``droop`` (votes / (seats + 1), not rounded).

    Raises
    ------
    ValueError
        If the name is none of these.
    """
    if quota not in _QUOTAS:
        raise ValueError(f"quota: got {quota!r}; expected one of {', '.join(_QUOTAS)}")
    return LargestRemainder(_QUOTAS[quota])
