"""What every table of ``contest.toml`` has in common."""

from __future__ import annotations

from pydantic import BaseModel, ConfigDict


class ContestTable(BaseModel):
    """A table of the contest file: it knows its keys, takes no other, and is never changed once read."""

    model_config = ConfigDict(frozen=True, extra="forbid", populate_by_name=True)
