"""Make the demo contest ``data_demo/sorrelmark`` again, byte for byte.

Run from the top of the project: ``python -m data_demo.make_sorrelmark``.
"""

from __future__ import annotations

from pathlib import Path

from data_demo.made_up_contest_text import contest_text
from data_demo.made_up_election import MadeUpElection, simulate_scenery
from data_demo.made_up_folder import write_contest_folder
from data_demo.sorrelmark_scenery import SORRELMARK

SEED = 1049
"""Chosen for a chamber that grows, a list about the threshold, and an alliance just short of the line."""

HEADER = """\
# An invented country. Its polls and results were simulated; what was true all along is in truth/.
#
# Notes of the desk on polls.csv and the files beside this one
#
# mode        Online and telephone.
# region      Harrovane and Tibberlow ask in one region now and then; Quillern breaks some national polls
#             down by region: there the national row counts, and the others are kept for reference.
# MV          Ondrell often counts Moorland Voice among others: a blank is not a zero.
# undecided   Set aside, with the chance that in the end they break otherwise than those who chose.
#
# result_last.csv         seats: members that the row elects, more than one in the districts of Tallowgate.
#                         cluster: neighbouring seats that move together.
# result_before_last.csv  The election of 2017, by the seats of 2021: teaches how far seats stray from their
#                         region. Ulgastaith was made since; Even Keel was founded since, and its later
#                         voters were then found among all parties.
# transfers.csv           Where voters go in the run-offs of the Outer Holms: the desk's own judgement, from
#                         the second rounds of earlier years.

"""

RELEASE = """
[release]
publisher = "The Sorrel Gazette, data desk"

# The law forbids publishing polls in this window (both days included): a release made for a day inside
# it is marked "not for publication". Set what the law that applies to you says, or leave it out.
[[release.silence]]
from = 2025-10-05
until = 2025-10-12
time_zone = "UTC"
law = "Sorrelmark Ballot Act, section 17"
"""


def build_sorrelmark() -> MadeUpElection:
    """Simulate Sorrelmark."""
    return simulate_scenery(SORRELMARK, seed=SEED)


def write_sorrelmark(folder: Path) -> None:
    """Write the demo contest folder."""
    election = build_sorrelmark()
    write_contest_folder(election, folder)
    text = HEADER + contest_text(election.scenery) + RELEASE
    (folder / "contest.toml").write_text(text, encoding="utf-8")


if __name__ == "__main__":
    write_sorrelmark(Path(__file__).parent / "sorrelmark")
