"""How long work tells whoever waits how far it is."""

from __future__ import annotations

from collections.abc import Callable

# Called with what is being done, and the part done (0–1), None where that cannot be said.
type Progress = Callable[[str, float | None], None]


def no_progress(stage: str, part: float | None) -> None:
    """Tell nobody."""
