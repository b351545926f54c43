"""What the parts of a candidate's page say, from the state of the walk."""

from __future__ import annotations

from collections.abc import Mapping
from typing import TYPE_CHECKING

from tui.desk.screens.candidate_keys import offered, writing
from tui.desk.screens.questions import caution_line, look_at, oddness_words, question
from tui.desk.screens.walk import Walk
from tui.desk.text import RULING_WORDS, fit, number, safe
from tui.desk.widgets.check_line import check_row, title_row
from tui.desk.widgets.numbers import WIDE, fit_rows_of, param_rows
from tui.desk.widgets.plot_points import point_words
from tui.desk.widgets.rule_block import RuleFacts, advice_parts, advice_rows, key_rows, rule_row
from tui.desk.widgets.rows import Row, fit_row, paragraph, row
from tui.model import CHECK_TITLES, CHECKS

if TYPE_CHECKING:
    from tui.workflow.session import Session

READER_ONLY = "you read without a handle. To rule: plainlight join QUEUE HANDLE"
KEY_ROWS = 2


def draw_head(walk: Walk, width: int, height: int, right: str) -> list[Row]:
    """Name and standing, the five checks, the question."""
    view = walk.loaded.view if walk.loaded else None
    rows = [title_row(width, walk.name, oddness_words(walk.evidence.get("star")), view, right), check_row(width, view, walk.check)]
    asked = question(walk.check, walk.evidence) if walk.evidence else "computing the evidence ..."
    if walk.trouble:
        asked = "There is no evidence for this candidate."
    lines = [[*row(" "), *line] for line in paragraph(asked, width - 2, "question")]
    if height >= 5:
        rows.insert(1, [])
        rows.append([])
    rows = [*rows[: height - 1], *lines] if height < 5 else [*rows[:3], *lines[:2]]
    return [fit_row(line, width, more=" ..") for line in rows]


def draw_numbers(walk: Walk, width: int, height: int) -> list[Row]:
    """The numbers of the fit that is drawn; by hand, with what is held; with room, the other checks' fits."""
    hand = walk.hand
    star = walk.evidence.get("star")
    rows = fit_rows_of(width, height, walk.own_evidence, star, walk.fit_index, hand.fit if hand else None)
    if hand is not None and walk.fit is not None:
        rows = rows[: len(rows) - len(walk.fit.params)] + param_rows(width, walk.fit.params, tuple(hand.fixed), hand.param)
        rows += [[], *paragraph("= held  > the arrows change it", width, "quiet")]
        if hand.dropped:
            rows += paragraph("dropped: " + ", ".join(sorted(hand.dropped)), width, "quiet")
    if walk.compared:
        rows += [[], *_compared_rows(walk, width)]
    if width >= WIDE and walk.loaded is not None and height - len(rows) > 8:
        rows += [[], *_all_checks(walk, width)]
    return [fit_row(line, width) for line in rows]


def draw_foot(
    walk: Walk, width: int, height: int, keymap: Mapping[str, str], session: Session, is_writing: bool
) -> list[Row]:
    """Advice, the ruling line, the keys that work now."""
    message, point, look, caution = advice(walk)
    rows = advice_rows(width, height - 1 - KEY_ROWS, message, point, look, caution)
    rows.append(rule_row(width, rule_facts(walk, session)))
    keys = writing() if is_writing else offered(walk, keymap)
    return [fit_row(line, width, more=" ..") for line in [*rows, *key_rows(width, keys, KEY_ROWS)]]


def advice(walk: Walk) -> tuple[str, str, tuple[str, ...], str]:
    """What was just said, the point under the cursor, what to look at, and the caution."""
    point = ""
    measurement = walk.measurement_under_cursor()
    if measurement is not None and walk.plot_view.cursor is not None and walk.page == 0:
        point = point_words(walk.plot(), walk.plot_view.cursor, measurement)
    stale = walk.loaded.view.stale.get(walk.check, "") if walk.loaded else ""
    caution = f"Your ruling is stale: {stale}." if stale else caution_line(walk.check, walk.evidence)
    return walk.message, point, look_at(walk.check, walk.evidence, walk.fit_index), caution


def advice_height(walk: Walk, width: int) -> int:
    """Rows that advice and caution take in full."""
    return sum(len(part) for part in advice_parts(width, *advice(walk), roomy=False))


def rule_facts(walk: Walk, session: Session) -> RuleFacts:
    """What the ruling line says now."""
    view = walk.loaded.view if walk.loaded else None
    return RuleFacts(
        reader_only=READER_ONLY if session.reviewer is None else "",
        waiting=walk.own_evidence is None,
        recording=walk.recording,
        chosen=walk.chosen,
        note=walk.note,
        own=view.own.get(walk.check) if view else None,
        stale=view.stale.get(walk.check, "") if view else "",
        is_nodata=bool(view and view.states.get(walk.check) == "nodata"),
    )


def _compared_rows(walk: Walk, width: int) -> list[Row]:
    found = walk.evidence.get(walk.compared)
    if found is None or found.best is None:
        return [row((f"{walk.compared}: no fit", "quiet"))]
    best = found.best
    rows = [row(("+ ", "other"), (f"{CHECK_TITLES[walk.compared]}: {safe(best.model)}", "head"))]
    if walk.fit is not None:
        rows += paragraph(f"chi2 {best.chi2:.1f} with {best.dof} dof; BIC {best.bic - walk.fit.bic:+.1f} against this fit", width, "quiet")
    return rows + param_rows(width, best.params)


def _all_checks(walk: Walk, width: int) -> list[Row]:
    """One line a check: its best fit, and what the reader ruled."""
    rows = [row((f" {'best fit of each check':<26}{'chi2':>9}{'dof':>5}{'BIC':>9}", "head"), ("  you ruled" if width >= 64 else "", "head"))]
    for check in CHECKS:
        found = walk.evidence.get(check)
        best = found.best if found else None
        own = walk.loaded.view.own.get(check)
        label = fit(f"{CHECK_TITLES[check]}: {safe(best.model)}" if best else f"{CHECK_TITLES[check]}: no fit", 26)
        text = f"{best.chi2:9.1f}{best.dof:5d}{best.bic:9.1f}" if best and abs(best.chi2) < 1e6 else f"{number(best.chi2) if best else '--':>9}"
        mark = ">" if check == walk.check else " "
        ruled = (f"  {RULING_WORDS[own.ruling]}", own.ruling) if own and width >= 64 else ("", "")
        rows.append(row((f"{mark}{label}{text}", "strong" if check == walk.check else "", f"check('{check}')"), ruled))
    return rows
