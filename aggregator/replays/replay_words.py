"""What a replay shows, in sentences made from its tables; none says more than its number."""

from __future__ import annotations

import pandas as pd

from aggregator.release.rounding import points_text, share_text, whole_text
from aggregator.release.table_words import Level
from aggregator.replays.methods import (
    EVERY_LEAD,
    METHOD_NAMES,
    RIVALS,
    Method,
    Nearer,
    Quantity,
    Where,
)
from aggregator.replays.report_contents import ReportContents

_OF = {
    (Quantity.SUPPORT, Where.COUNTRY): "support in the country",
    (Quantity.SUPPORT, Where.REGIONS): "support in the regions",
    (Quantity.SEATS, Where.COUNTRY): "seats",
}
UNIT = {Quantity.SUPPORT: "points", Quantity.SEATS: "seats"}
COMPARED = tuple(_OF)


def named(quantity: Quantity, where: Where) -> str:
    """What is compared, in words."""
    return _OF[quantity, where]


def opening_sentences(contents: ReportContents) -> tuple[str, ...]:
    """Sentences an editor can use: how often intervals held, how far off, seats, rivals."""
    quantities = (Quantity.SUPPORT, Quantity.SEATS) if contents.has_seats else (Quantity.SUPPORT,)
    found = [_coverage_sentence(contents, quantity) for quantity in quantities]
    found += [_last_day_sentence(contents), _seats_sentence(contents), _rivals_sentence(contents)]
    return tuple(sentence for sentence in found if sentence)


def _coverage_sentence(contents: ReportContents, quantity: Quantity) -> str:
    row = summary_row(contents.summary, method=Method.FIELDFOLD, quantity=quantity, where=Where.COUNTRY)
    if row is None:
        return ""
    what = "support" if quantity is Quantity.SUPPORT else "seats"
    place = f" of {contents.title}" if contents.is_pooled else ""
    return (
        f"Over {whole_text(row['dates'])} {contents.rhythm}replays{place} the 90 % intervals for {what} "
        f"held the result in {whole_text(row['inside_90'])} % of cases, the 50 % intervals in "
        f"{whole_text(row['inside_50'])} %."
    )


def _last_day_sentence(contents: ReportContents) -> str:
    if contents.is_pooled:
        return ""
    rows = contents.last_day
    rows = rows[(rows["quantity"] == Quantity.SUPPORT) & (rows["level"] != Level.ALLIANCE)]
    names = {look.code: look.name for look in contents.looks}
    worst = rows.sort_values("error", key=lambda errors: errors.abs(), kind="stable").iloc[-1]
    held = "inside" if worst["inside_90"] == 1 else "outside"
    return (
        f"{days_text(int(rows['days_before'].iloc[0]))} before polling day, the last replay, support was "
        f"off by {share_text(rows['error'].abs().mean(), unit=False)} points on average; most for "
        f"{names[worst['code']]}, {share_text(worst['estimate'])} against {share_text(worst['truth'])}, "
        f"{held} its 90 % interval."
    )


def _seats_sentence(contents: ReportContents) -> str:
    table = contents.seat_scores
    if contents.is_pooled or table.empty:
        return ""
    last = table[table["as_of"] == table["as_of"].max()].set_index("method")
    if Method.FIELDFOLD not in last.index:
        return ""
    own = last.loc[Method.FIELDFOLD]
    text = (
        f"On that day the likeliest winner lost in {_seats_text(own['leaders_wrong'])} of "
        f"{whole_text(own['seats'])} seats"
    )
    if Method.UNIFORM_SWING in last.index:
        text += f"; uniform swing had {_seats_text(last.loc[Method.UNIFORM_SWING]['leaders_wrong'])} wrong"
    return f"{text}."


def _seats_text(number: float) -> str:
    return whole_text(number) if number == round(number) else f"{number:.1f}"


def _rivals_sentence(contents: ReportContents) -> str:
    every = contents.comparisons[contents.comparisons["lead"] == EVERY_LEAD.label]
    nearer = [_came_nearer(row) for row in every.to_dict("records") if row["nearer"] == Nearer.RIVAL]
    scope = "over these contests" if contents.is_pooled else "in this election"
    if nearer:
        return f"Over all replayed days a rival came nearer than this model {scope}: {'; '.join(nearer)}."
    return f"Over all replayed days no rival came clearly nearer to the result than this model {scope}."


def _came_nearer(row: dict[object, object]) -> str:
    quantity, where = Quantity(str(row["quantity"])), Where(str(row["where"]))
    return (
        f"{METHOD_NAMES[Method(str(row['rival']))]} for {named(quantity, where)} ({_errors(row, quantity)})"
    )


def _errors(row: dict[object, object], quantity: Quantity) -> str:
    rival, own = (float(row[name]) for name in ("rival_error", "own_error"))  # type: ignore[arg-type]
    # Two that differ clearly must not read the same.
    alike = share_text(rival) == share_text(own) and row["nearer"] != Nearer.NO_CLEAR_DIFFERENCE
    digits = 2 if alike else 1
    # In the order in which the sentence names the two.
    first, second = (own, rival) if row["nearer"] == Nearer.FIELDFOLD else (rival, own)
    return f"mean error {first:.{digits}f} against {second:.{digits}f} {UNIT[quantity]}"


def rival_sentences(contents: ReportContents) -> tuple[str, ...]:
    """One sentence per rival and quantity over all days, then each band of days a rival was nearer in."""
    table = contents.comparisons
    sentences = []
    for quantity, where in COMPARED:
        here = table[(table["quantity"] == quantity) & (table["where"] == where)]
        for rival in RIVALS:
            every = here[(here["rival"] == rival) & (here["lead"] == EVERY_LEAD.label)]
            sentences += [_comparison_sentence(row, quantity, where) for row in every.to_dict("records")]
    bands = table[(table["nearer"] == Nearer.RIVAL) & (table["lead"] != EVERY_LEAD.label)]
    for row in bands.to_dict("records"):
        sentences.append(f"With {row['lead']} days to go, nearer than this model: {_came_nearer(row)}.")
    return tuple(sentences)


def _comparison_sentence(row: dict[object, object], quantity: Quantity, where: Where) -> str:
    rival = METHOD_NAMES[Method(str(row["rival"]))]
    said = {
        Nearer.FIELDFOLD: f"this model was nearer than {rival}",
        Nearer.RIVAL: f"{rival} was nearer than this model",
        Nearer.NO_CLEAR_DIFFERENCE: f"no clear difference between {rival} and this model",
    }[Nearer(str(row["nearer"]))]
    text = named(quantity, where)
    return f"{text[0].upper()}{text[1:]}: {said} ({_errors(row, quantity)})."


def unit_sentence(contents: ReportContents) -> str:
    """Say what the comparisons count."""
    if contents.is_pooled:
        return (
            f"The unit is the contest: {len(contents.titles)} of them, each counted once. A difference "
            "within its own standard error over contests is called no clear difference."
        )
    units = contents.comparisons.loc[contents.comparisons["lead"] == EVERY_LEAD.label, "units"]
    low, high = (0.0, 0.0) if units.empty else (float(units.min()), float(units.max()))
    counted = f"{low:.0f}" if round(low) == round(high) else f"{low:.0f} to {high:.0f}"
    return (
        "A difference within its own standard error is called no clear difference. Neighbouring dates are "
        f"almost the same forecast: the {whole_text(contents.replays)} dates count as {counted} here. All "
        "of them stand on one election, and which method is better in general only several elections can "
        "say."
    )


def staleness_sentence(contents: ReportContents) -> str:
    """Say how measured errors of polls compare with the formula, where both were measured."""
    rows = contents.staleness[
        (contents.staleness["code"] == "") & contents.staleness["expected_error"].notna()
    ]
    both = rows[rows["poll_error"].notna()]
    if both.empty:
        return "No poll was taken at a distance from polling day of which a replayed date speaks."
    weight = both["polls"] / both["polls"].sum()
    measured = float(((both["poll_error"] ** 2 * weight).sum()) ** 0.5)
    formula = float(((both["expected_error"] ** 2 * weight).sum()) ** 0.5)
    return (
        f"{whole_text(both['polls'].sum())} single polls missed by {share_text(measured, unit=False)} "
        "points (root mean square over parties), where the formula expects "
        f"{share_text(formula, unit=False)} of a poll of 1,000: a difference of "
        f"{points_text(measured - formula)}. Polls of one election share an error, so that one election may "
        "well lie above or below the formula."
    )


def days_text(days: int) -> str:
    """Word a number of days at the start of a sentence."""
    return "One day" if days == 1 else f"{days} days"


def summary_row(
    summary: pd.DataFrame, *, method: Method, quantity: Quantity, where: Where, lead: str = EVERY_LEAD.label
) -> pd.Series | None:
    """Pick one row of ``summary.csv``; None where there is none."""
    rows = summary[
        (summary["method"] == method)
        & (summary["quantity"] == quantity)
        & (summary["where"] == where)
        & (summary["lead"] == lead)
    ]
    return None if rows.empty else rows.iloc[0]
