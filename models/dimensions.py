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
DAY = "day"
"""Every day; ``date`` runs in weeks."""
ERA = "era"
"""A house, or one of its ways of working where it has had several."""
MODE = "mode"
POPULATION = "population"
FORMATION = "formation"
"""An alliance that some polls give as one figure."""
