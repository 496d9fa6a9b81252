"""Seats in exact arithmetic: the readable form of every method, and the judge of ties.

Nothing here is rounded, so a tie is found if and only if there is one. A tie is not broken here but
reported: which parties have the same claim, and to how many seats.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction
from math import floor

from aggregator.seats.apportion.list_method import HighestAverages, LargestRemainder, ListMethod


@dataclass(frozen=True)
class ExactApportionment:
    """Seats beyond dispute, and the tie there may be about the last ones.

    Attributes
    ----------
    seats
        Seats of each party that no tie touches.
    tied
        Positions of the parties with the same claim to the contested seats; empty without a tie.
    contested
        Seats among the tied parties: fewer than there are parties, and none gets two of them.
    """

    seats: tuple[int, ...]
    tied: tuple[int, ...]
    contested: int


def apportion_exactly(
    votes: Sequence[int | Fraction],
    *,
    seats: int,
    method: ListMethod,
    start: Sequence[int] | None = None,
) -> ExactApportionment:
    """Share seats out among parties in rational arithmetic.

    Parameters
    ----------
    votes
        Votes of each party, zero or more; any unit.
    seats
        Seats to share out, those of ``start`` among them.
    method
        From :func:`highest_averages` or :func:`largest_remainder`.
    start
        Seats that parties hold already; highest averages only, which goes on from there.

    Returns
    -------
    ExactApportionment
        ``sum(seats) + contested`` equals the seats asked for.

    Raises
    ------
    ValueError
        If votes are negative, none is above zero though there are seats, or ``start`` is out of place.

    Examples
    --------
    An exact tie of the modified Sainte-Laguë method: 100000 / 7 = 20000 / 1.4.

    >>> from aggregator.seats.apportion.list_method import highest_averages
    >>> method = highest_averages("modified_sainte_lague")
    >>> apportion_exactly([100_000, 80_000, 30_000, 20_000], seats=8, method=method)
    ExactApportionment(seats=(3, 3, 1, 0), tied=(0, 3), contested=1)
    """
    exact_votes = [Fraction(of_party) for of_party in votes]
    held = [0] * len(exact_votes) if start is None else [int(of_party) for of_party in start]
    if any(of_party < 0 for of_party in exact_votes):
        raise ValueError("votes: a party has fewer than none")
    if sum(held) > seats:
        raise ValueError(f"start: {sum(held)} seats are held already; there are {seats} in all")
    if sum(held) < seats and not any(exact_votes):
        raise ValueError("votes: no party has any, so nobody can have the seats")
    if isinstance(method, HighestAverages):
        return _by_highest_averages(exact_votes, seats, method, held)
    if any(held):
        raise ValueError("start: only highest averages can go on from seats held already")
    return _by_largest_remainder(exact_votes, seats, method)


def in_order_of_claim(
    tied: Sequence[int], *, votes: Sequence[float], lot: Sequence[float], ties: str
) -> list[int]:
    """Order tied parties by the stated rule: the first get the contested seats.

    Parameters
    ----------
    tied
        Positions of parties.
    votes, lot
        Votes and ticket of every party, tied or not.
    ties
        ``lot``: the highest ticket first. ``most_votes``: the most votes first, then the highest ticket.
    """
    if ties == "most_votes":
        return sorted(tied, key=lambda party: (-votes[party], -lot[party]))
    return sorted(tied, key=lambda party: -lot[party])


def _by_highest_averages(
    votes: list[Fraction], seats: int, method: HighestAverages, held: list[int]
) -> ExactApportionment:
    held = list(held)
    averages = [votes[party] / method.divisor(held[party] + 1) for party in range(len(votes))]
    still_open = seats - sum(held)
    while still_open:
        highest = max(averages)
        those = [party for party, average in enumerate(averages) if average == highest]
        if len(those) > still_open:
            return ExactApportionment(tuple(held), tuple(those), still_open)
        for party in those:
            held[party] += 1
            averages[party] = votes[party] / method.divisor(held[party] + 1)
        still_open -= len(those)
    return ExactApportionment(tuple(held), (), 0)


def _by_largest_remainder(votes: list[Fraction], seats: int, method: LargestRemainder) -> ExactApportionment:
    if not seats:
        return ExactApportionment((0,) * len(votes), (), 0)
    quota = sum(votes) / (seats + method.quota_seats)
    quotas = [of_party / quota for of_party in votes]
    full = [floor(of_party) for of_party in quotas]
    if sum(full) > seats and max(full) > seats:
        return ExactApportionment(tuple(min(number, seats) for number in full), (), 0)
    if sum(full) > seats:
        standing = tuple(party for party, number in enumerate(full) if number)
        without_last = tuple(max(number - 1, 0) for number in full)
        return ExactApportionment(without_last, standing, seats - sum(without_last))
    remainders = [of_party - number for of_party, number in zip(quotas, full, strict=True)]
    still_open = seats - sum(full)
    cut = sorted(remainders, reverse=True)[still_open - 1] if still_open else Fraction(1)
    above = [party for party, remainder in enumerate(remainders) if remainder > cut]
    level = [party for party, remainder in enumerate(remainders) if remainder == cut]
    for party in above:
        full[party] += 1
    if len(above) + len(level) == still_open:
        for party in level:
            full[party] += 1
        level = []
    return ExactApportionment(tuple(full), tuple(level), still_open - len(above) if level else 0)
