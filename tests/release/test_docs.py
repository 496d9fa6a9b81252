"""What the documentation says about a release is what the code does."""

from dataclasses import asdict
from pathlib import Path

import pytest

from aggregator.release.cautions import CAUTIONS
from aggregator.release.likelihood_words import LIKELIHOOD_SCALE
from aggregator.release.prior_words import describe_priors
from aggregator.release.schema_docs import describe_schema
from aggregator.release.table_schemas import ALL_SCHEMAS
from models.priors import Priors

DOCS = Path(__file__).parents[2] / "docs"
CHARTS = (
    "support_over_time",
    "alliances_over_time",
    "seats_on_polling_day",
    "seats_over_time",
    "combinations",
    "deciding_seats",
    "seats_against_votes",
    "house_leans",
    "poll_worth",
)


@pytest.mark.parametrize("schema", ALL_SCHEMAS, ids=lambda schema: schema.path)
def test_formats_describes_every_column_of_every_table(schema):
    """On a failure, put the text of ``describe_schema`` in the place of the old one."""
    assert describe_schema(schema) in (DOCS / "formats.md").read_text(encoding="utf-8")


def test_formats_names_the_likelihood_scale_in_full():
    text = " ".join((DOCS / "formats.md").read_text(encoding="utf-8").split())
    for band in LIKELIHOOD_SCALE:
        assert f"{band.word} {band.low * 100:.0f}–{band.high * 100:.0f} %" in text


def test_the_cautions_page_gives_every_caution_word_for_word():
    text = " ".join((DOCS / "cautions.md").read_text(encoding="utf-8").split())
    for caution in CAUTIONS:
        assert f"**{caution.heading}** {caution.text}" in text


@pytest.mark.parametrize("chart", CHARTS)
def test_there_is_reading_help_for_every_chart(chart):
    assert f"`{chart}`" in (DOCS / "reading_the_charts.md").read_text(encoding="utf-8")


def test_the_method_note_puts_every_prior_of_the_model_into_words_with_its_value():
    rows = {row.setting: row for row in describe_priors(asdict(Priors()))}
    assert list(rows) == list(asdict(Priors()))
    assert rows["region_ratio_most"].value == "2"
    assert rows["drift_log_median"].value == "0.035"  # the median itself, not its logarithm
    assert rows["error_floor_log_median"].value == "0.0004"
