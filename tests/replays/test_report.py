"""The report of a replay: whole or not at all, true to its tables, and readable without trust."""

from __future__ import annotations

import json
import re
from dataclasses import replace
from datetime import date
from html import unescape
from pathlib import Path

import pandas as pd
import pytest

from aggregator.errors import MachineError, UsageError
from aggregator.release import write_release
from aggregator.release.schema_docs import describe_schema
from aggregator.release.table_files import check_table
from aggregator.replays import write_report
from aggregator.replays.pooling import pool_replays
from aggregator.replays.replay_cautions import REPLAY_CAUTIONS
from aggregator.replays.replay_charts import build_replay_charts
from aggregator.replays.replay_page import build_replay_page
from aggregator.replays.replay_schemas import REPLAY_SCHEMAS
from aggregator.replays.replay_words import opening_sentences, rival_sentences
from aggregator.replays.report_contents import contents_of_pool, contents_of_replay
from aggregator.replays.score_replay import ReplayScores, score_replay
from aggregator.replays.write_report import write_replay_report
from tests.release.made_up_desk import made_up_run
from tests.replays.made_up_replay import MadeUpReplay, made_up_replay

DOCS = Path(__file__).parents[2] / "docs"


@pytest.fixture(scope="module")
def replay(tmp_path_factory: pytest.TempPathFactory) -> MadeUpReplay:
    return made_up_replay(tmp_path_factory.mktemp("contest"), dates=7)


@pytest.fixture(scope="module")
def scores(replay: MadeUpReplay) -> ReplayScores:
    return score_replay(replay.records, inputs=replay.inputs, outcome=replay.outcome)


@pytest.fixture(scope="module")
def written(replay, scores, tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A replay's folder with finished fits, its report written."""
    out = tmp_path_factory.mktemp("replay")
    (out / "fits").mkdir()
    (out / "fits" / "a.nc").write_text("a finished fit", encoding="utf-8")
    return write_replay_report(scores, replay.records, inputs=replay.inputs, out=out)


def contents(replay, scores):
    return contents_of_replay(scores, records=replay.records, contest=replay.inputs.contest)


def page(replay, scores) -> str:
    return build_replay_page(contents(replay, scores), charts=())


def test_the_report_lies_beside_the_fits_and_every_file_is_as_the_manifest_says(written):
    folder = written.parent
    assert written == folder.parent / "report" / "index.html"
    assert (folder.parent / "fits" / "a.nc").is_file()
    manifest = json.loads((folder / "manifest.json").read_text(encoding="utf-8"))
    found = {p.relative_to(folder).as_posix() for p in folder.rglob("*") if p.is_file()}
    assert set(manifest["outputs"]) == found - {"manifest.json"}
    assert manifest["replays"] == 7
    assert sorted(p.name for p in folder.parent.iterdir()) == ["fits", "report"]


def test_the_page_fetches_nothing_and_runs_nothing(written):
    text = written.read_text(encoding="utf-8")
    assert text.startswith("<!doctype html>")
    assert "<script" not in text
    outside = re.findall(r'(?:src|href)="(?!#)([^"]*)"', text)
    assert all((written.parent / link).is_file() for link in outside)


def test_the_page_shows_every_chart_for_screen_and_phone_with_a_description(written):
    text = written.read_text(encoding="utf-8")
    charts = json.loads((written.parent / "charts" / "alt_texts.json").read_text(encoding="utf-8"))
    assert len(charts) == 7
    for name in charts:
        assert f'id="{name}-title"' in text and f'id="{name}-narrow-title"' in text


def test_every_table_keeps_its_schema(replay, scores):
    found = {schema.path: (schema, table) for schema, table in contents(replay, scores).with_schemas()}
    assert set(found) == {schema.path for schema in REPLAY_SCHEMAS}
    for schema, table in found.values():
        check_table(table, schema=schema)


@pytest.mark.parametrize("schema", REPLAY_SCHEMAS, ids=lambda schema: schema.path)
def test_formats_describes_every_column_of_every_table(schema):
    """On a failure, put the text of ``describe_schema`` in the place of the old one."""
    assert describe_schema(schema) in (DOCS / "formats.md").read_text(encoding="utf-8")


def test_there_is_reading_help_for_every_chart(replay, scores):
    text = (DOCS / "reading_the_charts.md").read_text(encoding="utf-8")
    for chart in build_replay_charts(contents(replay, scores)):
        assert f"`{chart.name}`" in text


def test_the_cautions_page_gives_every_caution_word_for_word():
    text = " ".join((DOCS / "cautions.md").read_text(encoding="utf-8").split())
    for caution in REPLAY_CAUTIONS:
        assert f"**{caution.heading}** {caution.text}" in text


def test_a_second_report_takes_the_place_of_the_first(replay, written, monkeypatch):
    first = (written.parent / "manifest.json").read_text(encoding="utf-8")
    (written.parent / "stray.txt").write_text("from yesterday", encoding="utf-8")
    monkeypatch.setattr(write_report, "write_charts", lambda *_args, **_kwargs: ())
    fewer = score_replay(replay.records[:1], inputs=replay.inputs, outcome=replay.outcome)
    out = written.parent.parent
    write_replay_report(fewer, replay.records[:1], inputs=replay.inputs, out=out)
    second = json.loads((written.parent / "manifest.json").read_text(encoding="utf-8"))
    assert second["replays"] == 1 and json.loads(first)["replays"] == 7
    assert not (written.parent / "stray.txt").exists()
    assert sorted(p.name for p in out.iterdir()) == ["fits", "report"]


def test_a_full_disk_leaves_the_earlier_report_and_nothing_else(replay, scores, tmp_path, monkeypatch):
    report = tmp_path / "report"
    report.mkdir()
    (report / "manifest.json").write_text('{"kind": "replay report"}', encoding="utf-8")

    def full(*_args, **_kwargs):
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(write_report, "write_charts", full)
    with pytest.raises(MachineError, match=r"replay report could not be written to .* the disk is full"):
        write_replay_report(scores, replay.records, inputs=replay.inputs, out=tmp_path)
    assert [p.name for p in tmp_path.iterdir()] == ["report"]
    assert [p.name for p in report.iterdir()] == ["manifest.json"]


def test_a_folder_that_is_no_report_is_not_replaced(replay, scores, tmp_path):
    (tmp_path / "report").mkdir()
    (tmp_path / "report" / "mine.txt").write_text("keep", encoding="utf-8")
    with pytest.raises(UsageError, match="already holds something that is no replay report"):
        write_replay_report(scores, replay.records, inputs=replay.inputs, out=tmp_path)
    assert (tmp_path / "report" / "mine.txt").read_text(encoding="utf-8") == "keep"


def test_names_from_the_desk_cannot_become_markup(replay, scores):
    contest = replay.inputs.contest
    party = contest.parties[0].model_copy(update={"name": "<b>Ferry</b> & Co"})
    renamed = contest.model_copy(update={"parties": (party, *contest.parties[1:])})
    text = build_replay_page(
        contents_of_replay(replace_title(scores, "<i>Isles</i>"), records=replay.records, contest=renamed),
        charts=(),
    )
    assert "<b>Ferry" not in text and "<i>Isles" not in text
    assert "&lt;b&gt;Ferry&lt;/b&gt; &amp; Co" in text


def replace_title(scores: ReplayScores, title: str) -> ReplayScores:
    return replace(scores, title=title, scores=scores.scores.assign(contest=title))


def test_the_page_says_that_it_stays_at_the_desk_and_gives_every_caution(replay, scores):
    text = " ".join(unescape(page(replay, scores)).replace("\u00a0", " ").split())
    assert "For the desk, not for publication." in text
    for caution in REPLAY_CAUTIONS:
        assert caution.heading in text and caution.text in text


def test_the_opening_gives_the_coverage_of_the_summary_table(replay, scores):
    gathered = contents(replay, scores)
    row = gathered.summary.query(
        "method == 'fieldfold' and quantity == 'support' and where == 'country' and lead == 'all'"
    ).iloc[0]
    expected = (
        "Over 7 weekly replays the 90 % intervals for support held the result in "
        f"{row['inside_90']:.0f} % of cases, the 50 % intervals in {row['inside_50']:.0f} %."
    )
    assert opening_sentences(gathered)[0] == expected


def test_a_rival_that_comes_nearer_is_named_in_the_opening_and_one_that_does_not_is_not(replay, scores):
    for nearer, expected in (
        ("rival", "a rival came nearer than this model in this election: the latest poll for support"),
        (
            "no clear difference",
            "no rival came clearly nearer to the result than this model in this election",
        ),
    ):
        table = scores.comparisons.assign(nearer="no clear difference")
        chosen = (table["rival"] == "latest_poll") & (table["lead"] == "all")
        table.loc[chosen, "nearer"] = nearer
        gathered = replace(contents(replay, scores), comparisons=table)
        assert expected in opening_sentences(gathered)[-1]


def test_no_sentence_says_nearer_where_the_table_says_no_clear_difference(replay, scores):
    gathered = contents(replay, scores)
    undecided = replace(gathered, comparisons=gathered.comparisons.assign(nearer="no clear difference"))
    assert rival_sentences(undecided)
    assert not any("nearer" in sentence for sentence in rival_sentences(undecided))


def test_a_fit_that_did_not_pass_is_an_alarm_on_page_tables_and_charts(replay, scores):
    first = replay.records[0]
    failed = [replace(first, facts={**first.facts, "passed": False}), *replay.records[1:]]
    gathered = contents_of_replay(scores, records=failed, contest=replay.inputs.contest)
    alarm = "CHECKS FAILED for 1 of 7"
    assert alarm in gathered.alarms[0]
    assert alarm in build_replay_page(gathered, charts=())
    assert gathered.frame.alarms == gathered.alarms
    assert all(alarm in chart.alt_text for chart in build_replay_charts(gathered))


def test_a_contest_without_seats_has_a_whole_report_without_them(replay, tmp_path, monkeypatch):
    by_region = replay.outcome.groupby("region", as_index=False)[
        list(replay.inputs.contest.party_codes)
    ].sum()
    found = score_replay(replay.records[:2], inputs=replay.inputs, outcome=by_region.assign(seat="", name=""))
    gathered = contents_of_replay(found, records=replay.records[:2], contest=replay.inputs.contest)
    assert not any(
        "seat" in chart.name or chart.name == "reliability" for chart in build_replay_charts(gathered)
    )
    monkeypatch.setattr(write_report, "write_charts", lambda *_args, **_kwargs: ())
    page = write_replay_report(found, replay.records[:2], inputs=replay.inputs, out=tmp_path)
    written = {path.name for path in (page.parent / "tables").iterdir()}
    assert written == {Path(schema.path).name for schema in REPLAY_SCHEMAS} - {
        "seat_scores.csv",
        "reliability.csv",
    }
    assert "seats" not in " ".join(opening_sentences(gathered))


def test_several_contests_are_pooled_with_the_contest_as_unit(replay, scores):
    other = replace(scores, title="Isles 2029", scores=scores.scores.assign(contest="Isles 2029"))
    gathered = contents_of_pool(pool_replays([scores, other]))
    text = build_replay_page(gathered, charts=())
    assert "The unit is the contest: 2 of them" in text
    assert "Isles 2029" in text
    names = {chart.name for chart in build_replay_charts(gathered)}
    assert names == {
        "support_error_by_days", "seats_error_by_days", "places", "reliability", "measured_staleness",
    }  # fmt: skip


def _leave_replays(folder: Path) -> Path:
    """Leave two reports in a contest folder; the page of the later one."""
    for name in ("2033-01-02_2033-03-06", "2033-02-06_2033-03-06"):
        report = folder / "replays" / name / "report"
        report.mkdir(parents=True)
        (report / "index.html").write_text("", encoding="utf-8")
    return report / "index.html"


@pytest.mark.parametrize(("passed", "unpublished"), [(True, ()), (False, ("P001",))])
def test_a_release_links_to_the_latest_replay_of_its_contest_wherever_its_page_lies(
    tmp_path, monkeypatch, passed, unpublished
):
    monkeypatch.setattr(write_release, "write_charts", lambda *_args, **_kwargs: ())
    folder = tmp_path / "contest"
    latest = _leave_replays(folder)
    written = write_release.write_release(**made_up_run(folder, passed=passed, unpublished=unpublished))  # type: ignore[arg-type]
    found = re.findall(r'href="([^"]*replays[^"]*)"', written.page.read_text(encoding="utf-8"))
    assert [(written.page.parent / link).resolve() for link in found] == [latest.resolve()]


def test_a_release_without_a_replay_or_in_a_place_of_its_own_links_to_none(tmp_path, monkeypatch):
    monkeypatch.setattr(write_release, "write_charts", lambda *_args, **_kwargs: ())
    run = made_up_run(tmp_path / "contest")
    without = write_release.write_release(**run)  # type: ignore[arg-type]
    _leave_replays(tmp_path / "contest")
    elsewhere = write_release.write_release(**run, out=tmp_path / "elsewhere")  # type: ignore[arg-type]
    for written in (without, elsewhere):
        assert "replays/" not in written.page.read_text(encoding="utf-8")


def test_the_dates_of_a_report_are_those_of_its_fits(replay, scores):
    fits = contents(replay, scores).fits
    assert fits is not None
    assert fits["as_of"].tolist() == [pd.Timestamp(str(fit.facts["as_of"])) for fit in replay.records]
    assert fits["last_fieldwork"].max().date() < date(2033, 5, 15)


def test_a_sentence_gives_the_two_errors_in_the_order_in_which_it_names_the_methods(replay, scores):
    table = scores.comparisons.assign(own_error=1.0, rival_error=2.0, nearer="no clear difference")
    chosen = (table["rival"] == "last_result") & (table["where"] == "country")
    said = {}
    for nearer in ("fieldfold", "rival"):
        gathered = replace(contents(replay, scores), comparisons=table.assign(nearer=nearer)[chosen])
        said[nearer] = rival_sentences(gathered)[0]
    assert said["fieldfold"] == (
        "Support in the country: this model was nearer than the last result "
        "(mean error 1.0 against 2.0 points)."
    )
    assert said["rival"] == (
        "Support in the country: the last result was nearer than this model "
        "(mean error 2.0 against 1.0 points)."
    )
