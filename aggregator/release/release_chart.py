"""What every chart of a release is made of, and the words that all of them share."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

import altair as alt

from aggregator.inputs.contest import Silence
from aggregator.release.chart_style import Frame, Layout, frame_chart
from aggregator.release.contents import ReleaseContents


@dataclass(frozen=True)
class ReleaseChart:
    """One chart of a release, ready to be drawn in any layout.

    Attributes
    ----------
    name
        Its file name, without ending.
    title, reading, alt_text
        What it shows, how to read it, and what it says, in words and numbers.
    draw
        Builds the bare chart for a layout.
    """

    name: str
    title: str
    reading: str
    alt_text: str
    draw: Callable[[Layout], alt.TopLevelMixin]

    def framed(self, *, frame: Frame, layout: Layout) -> dict[str, Any]:
        """Build the chart's specification, with title, source, caution and alarms around it."""
        return frame_chart(
            self.draw(layout),
            title=self.title,
            reading=self.reading,
            description=self.alt_text,
            frame=frame,
            layout=layout,
        )


def silence_everywhere(contents: ReleaseContents) -> list[Silence]:
    """Silence windows of the whole country: a chart of it shows no region's own."""
    return [window for window in contents.contest.release.silence if window.regions is None]


def silence_reading(contents: ReleaseContents) -> str:
    """Say what the grey stripe is, where there is one."""
    return " Grey stripe: no publication by law." if silence_everywhere(contents) else ""


def with_alarms(text: str, contents: ReleaseContents) -> str:
    """Put why a release must not be relied on before the words of a chart."""
    return " ".join([*(f"{alarm.rstrip('.')}." for alarm in contents.alarms), text])
