"""The codes of a contest, with what each stands for."""

from __future__ import annotations

from dataclasses import dataclass
from datetime import date

from aggregator.inputs.contest import OTHERS, Alliance, Contest
from aggregator.release.table_words import Level


@dataclass(frozen=True)
class Code:
    """A party, an alliance or the others.

    Attributes
    ----------
    code, name
        As the contest has them.
    level
        What the code stands for.
    members
        Codes whose draws are summed: the code itself, or the members of the alliance.
    colour
        Colour the contest gives it, None where it gives none.
    alliance
        The alliance behind the code, None for a party and for others.
    """

    code: str
    name: str
    level: Level
    members: tuple[str, ...]
    colour: str | None = None
    alliance: Alliance | None = None

    def exists_on(self, day: date) -> bool:
        """Whether the code can be summed on a day: a party always, an alliance while it is active."""
        return self.alliance is None or self.alliance.active_on(day)


def contest_codes(contest: Contest) -> tuple[Code, ...]:
    """All codes of a contest: parties in file order, others, then alliances."""
    colours = {party.code: party.colour for party in contest.parties}
    names = contest.party_names
    parties = tuple(
        Code(code, names[code], Level.OTHERS if code == OTHERS else Level.PARTY, (code,), colours.get(code))
        for code in contest.party_codes
    )
    alliances = tuple(Code(a.code, a.name, Level.ALLIANCE, a.members, a.colour, a) for a in contest.alliances)
    return parties + alliances
