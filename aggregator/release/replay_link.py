"""Where a release finds the latest replay of its contest."""

from __future__ import annotations

from pathlib import Path
from urllib.parse import quote

REPLAYS = "replays"
REPORT_PAGE = "report/index.html"


def replay_link(contest_folder: Path, *, up: int) -> str | None:
    """Link to the report of the contest's latest replay; None where there is none.

    Parameters
    ----------
    contest_folder
        May hold ``replays/<from>_<to>/report/index.html``; the last name wins, which is the latest start.
    up
        Folders between the contest folder and the page.
    """
    pages = sorted((contest_folder / REPLAYS).glob(f"*/{REPORT_PAGE}"))
    if not pages:
        return None
    return "../" * up + quote(pages[-1].relative_to(contest_folder).as_posix())
