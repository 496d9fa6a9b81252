"""The names of the labelled dimensions, defined once.

Every labelled array of the project uses these names. Coordinates are labels a reader knows
(a party's code, a house's name, a day), never bare integers.
"""

CHAIN = "chain"
DRAW = "draw"
PARTY = "party"
REGION = "region"
HOUSE = "house"
DATE = "date"
POLL = "poll"
SEAT = "seat"
