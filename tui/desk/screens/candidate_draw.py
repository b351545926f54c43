"""What the parts of a candidate's page say, from the state of the walk."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import TYPE_CHECKING

from tui.desk.screens.candidate_keys import offered, writing
from tui.desk.screens.questions import STRONG, caution_line, look_at, oddness_words, question
from tui.desk.screens.walk import Walk
from tui.desk.text import RULING_WORDS, fit, number, safe, short_band, signed
from tui.desk.widgets.aligned import table
from tui.desk.widgets.check_line import check_row, title_row
from tui.desk.widgets.fact_words import catalogue_pairs
from tui.desk.widgets.numbers import (
    WIDE,
    Beside,
    adequate_word,
    fit_title,
    fits_table,
    formal_row,
    number_columns,
    number_rows,
    param_rows,
    tenth,
)
from tui.desk.widgets.plot_points import point_words
from tui.desk.widgets.rule_block import RuleFacts, advice_parts, advice_rows, key_rows, rule_row
from tui.desk.widgets.rows import Row, Span, fit_row, paragraph, row
from tui.model import CHECK_TITLES, CHECKS

if TYPE_CHECKING:
    from tui.workflow.session import Session

READ_ONLY = "read only: nothing can be ruled or kept"
READER_ONLY = "you read without a handle. To rule: plainlight join QUEUE HANDLE"
WAITING = "computing the evidence: rulings open when the numbers are here"
SPLIT = "The rulings on this check are split: N shows all notes side by side, and you may rule once more there."
FACTS = ("ra", "dec", "parallax", "parallax_error", "ruwe", "sp_type", "otype", "age_myr", "logg", "av_max")
KEY_ROWS = 2
BEST_WIDE = 32  # cells of a check's title with its best model


def draw_head(walk: Walk, width: int, height: int, right: Sequence[str]) -> list[Row]:
    """Name and standing, the five checks, the question."""
    view = walk.loaded.view if walk.loaded else None
    rows = [
        title_row(width, walk.name, oddness_words(walk.evidence.get("star")), view, right),
        check_row(width, view, walk.check),
    ]
    asked = question(walk.check, walk.evidence, width - 2) if walk.evidence else "computing the evidence ..."
    if walk.trouble and not walk.evidence:
        asked = "There is no evidence for this candidate."
    lines = [[*row(" "), *line] for line in paragraph(asked, width - 2, "question")]
    if height >= 5:
        rows.insert(1, [])
        rows.append([])
    rows = [*rows[: height - 1], *lines] if height < 5 else [*rows[:3], *lines[:2]]
    return [fit_row(line, width, more=" ..") for line in rows]


def draw_numbers(walk: Walk, width: int, height: int) -> list[Row]:
    """The numbers of the fit that is drawn, beside another; with room, all fits and all measurements."""
    own, shown = walk.own_evidence, walk.fit
    if own is None:
        return [row(("computing ..." if not walk.trouble else "no evidence", "quiet"))]
    if shown is None:
        return [row(("no fit", "head")), row(("adequate  ", "quiet"), adequate_word(own))]
    hand = walk.hand
    title = (
        row(("by hand: ", "message"), (safe(shown.model), "head")) if hand else fit_title(width, own, walk.fit_index)
    )
    adequate = "" if hand else adequate_word(own, walk.fit_index, walk.p_min)
    rows = number_rows(width, shown, title, _beside(walk), adequate)
    params = param_rows(width, shown.params, tuple(hand.fixed) if hand else (), hand.param if hand else "")
    rows += [formal_row(shown, walk.p_min), *params] if len(rows) + len(params) < height else params
    if hand is not None:
        rows += _hand_rows(walk, width)
    if walk.compared and walk.evidence.get(walk.compared) is not None:
        rows += _compared_rows(walk, width)[: max(0, height - len(rows))]
    for block in _further_blocks(walk, width):
        if len(rows) + 1 + len(block) <= height:
            rows += [[], *block]
    return [fit_row(line, width) for line in rows]


def _beside(walk: Walk) -> Beside | None:
    """What the shown fit is held against: the fit as it was, the check compared with, else the star alone."""
    compared = walk.evidence.get(walk.compared) if walk.compared else None
    if walk.hand is not None and walk.hand.fit is not None:
        made = walk.own_evidence.fits[walk.fit_index]
        is_same = made.model.partition(" without ")[0] == walk.hand.fit.model  # dropped bands make no other model
        return Beside("as fitted" if is_same else safe(made.model), made)
    if compared is not None and compared.best is not None:
        return Beside(CHECK_TITLES[walk.compared], compared.best)
    star = walk.evidence.get("star")
    if walk.check != "star" and star is not None and star.best is not None:
        return Beside("star alone", star.best)
    return None


def _hand_rows(walk: Walk, width: int) -> list[Row]:
    dropped = sorted(short_band(band) for band in walk.hand.dropped)
    return paragraph("dropped: " + ", ".join(dropped), width, "quiet") if dropped else []


def _further_blocks(walk: Walk, width: int) -> list[list[Row]]:
    """What a wide screen has room for, the most needed first."""
    own = walk.own_evidence
    if width < WIDE or walk.loaded is None:
        return []
    blocks = [fits_table(width, own.fits, walk.fit_index)] if len(own.fits) > 1 and walk.hand is None else []
    return [*blocks, _all_checks(walk, width), points_table(walk, width), facts_rows(walk, width)]


def draw_foot(
    walk: Walk,
    width: int,
    height: int,
    keymap: Mapping[str, str],
    session: Session,
    is_writing: bool = False,
    scrolls: bool = True,
) -> list[Row]:
    """Advice, the ruling line, the keys that work now."""
    room = height - 1 - KEY_ROWS
    rows = advice_rows(width, room, *advice(walk), keeps_look=goes_on(walk)) if room > 0 else []
    rows.append(rule_row(width, rule_facts(walk, session)))
    can_rule = session.reviewer is not None and not session.read_only
    keys = writing(walk.message) if is_writing else offered(walk, keymap, can_rule, scrolls)
    return [fit_row(line, width, more=" ..") for line in [*rows, *key_rows(width, keys, KEY_ROWS)]]


def advice(walk: Walk) -> tuple[str, str, tuple[str, ...], str]:
    """What was just said, the point under the cursor, what to look at, and the caution.

    A further page has the room for itself: only what was said and what calls for another ruling stands beneath it.
    """
    point = ""
    measurement = walk.measurement_under_cursor()
    if measurement is not None and walk.plot_view.cursor is not None and walk.page == 0:
        point = point_words(walk.drawn, walk.plot_view.cursor, measurement)
    stale = walk.loaded.view.stale.get(walk.check, "") if walk.loaded else ""
    is_split = walk.is_split
    caution = (
        f"Your ruling is stale: {stale}." if stale else SPLIT if is_split else caution_line(walk.check, walk.evidence)
    )
    look = look_at(walk.check, walk.fit) if walk.own_evidence is not None and not walk.page else ("",)
    is_told = walk.is_lesson and walk.message and walk.is_done or walk.page and not stale and not is_split
    return walk.message, point, look, "" if is_told else caution


def advice_height(walk: Walk, width: int) -> int:
    """Rows that advice and caution take in full; none on a page where nothing has to be said."""
    said = advice(walk)
    if walk.page and not any((said[0], said[1], said[3])):
        return 0
    return sum(len(part) for part in advice_parts(width, *said, height=2, keeps_look=goes_on(walk)))


def goes_on(walk: Walk) -> bool:
    """Whether this is a practice star with checks left, where the next page is read right beneath the answer."""
    return walk.is_lesson and not walk.is_done


def rule_facts(walk: Walk, session: Session) -> RuleFacts:
    """What the ruling line says now."""
    view = walk.loaded.view if walk.loaded else None
    return RuleFacts(
        reader_only=READER_ONLY if session.reviewer is None else READ_ONLY if session.read_only else "",
        waiting=(
            "no evidence, so nothing can be ruled" if walk.trouble else WAITING if walk.own_evidence is None else ""
        ),
        recording=walk.recording,
        chosen=walk.chosen,
        note=walk.note,
        own=view.own.get(walk.check) if view else None,
        stale=view.stale.get(walk.check, "") if view else "",
        is_nodata=bool(view and view.states.get(walk.check) == "nodata"),
        recorded=walk.recorded,
        with_others=bool(view and view.seal_open),
        is_done=walk.is_done,
    )


def _compared_rows(walk: Walk, width: int) -> list[Row]:
    """The best fit of the check compared with, whose pulls are the + marks."""
    best = walk.evidence[walk.compared].best
    if best is None:
        return [[], row((f"{CHECK_TITLES[walk.compared]}: no fit", "quiet"))]
    return [row(("+ ", "other"), (safe(best.model), "head")), *param_rows(width, best.params)]


def points_table(walk: Walk, width: int) -> list[Row]:
    """Every drawn point by wavelength, with its pull; x: not fitted."""
    points = sorted(walk.drawn.points, key=lambda point: point.wave_um)
    lines = [
        ("x" if point.dropped else "", short_band(point.band), number(point.wave_um),
         f"{'<' if point.limit else ''}{number(point.flux_jy * 1e3)}",
         "limit" if point.limit else number(point.error_high_jy * 1e3, 2), signed(point.pull))
        for point in points
    ]  # fmt: skip
    styles = [
        "dropped" if point.dropped else "limit" if point.limit else "strong" if abs(point.pull) >= STRONG else ""
        for point in points
    ]
    return table(("", "band", "micron", "mJy", "error", "pull"), lines, width, texts=(0, 1), styles=styles)


def facts_rows(walk: Walk, width: int) -> list[Row]:
    """The facts that are asked for most, in a few lines; the others stand on their own page."""
    facts = walk.loaded.candidate.facts
    said = [" ".join(pair) for pair in catalogue_pairs({key: facts[key] for key in FACTS if key in facts})]
    lines = paragraph("   ".join(said), width - 2)[:6] if said else []
    return [row((" facts", "head")), *([*row(" "), *line] for line in lines)] if lines else []


def _all_checks(walk: Walk, width: int) -> list[Row]:
    """One line a check: its best fit, and, with room, what the reader ruled."""
    ruled_too = width >= 64
    best = {check: walk.evidence[check].best if check in walk.evidence else None for check in CHECKS}
    columns = [[tenth(one.chi2) if one else "--" for one in best.values()],
               [str(one.dof) if one else "--" for one in best.values()],
               [tenth(one.bic) if one else "--" for one in best.values()]]  # fmt: skip
    tails = number_columns(("chi2", "dof", "BIC"), columns)
    room = min(BEST_WIDE, width - 1 - len(tails[0]) - (15 if ruled_too else 0))
    head = f" {fit('best fit of each check', room)}{tails[0]}"
    rows = [row((head, "head"), ("  you ruled" if ruled_too else "", "head"))]
    for (check, one), text in zip(best.items(), tails[1:], strict=True):
        own = walk.loaded.view.own.get(check)
        label = fit(f"{CHECK_TITLES[check]}: {safe(one.model) if one else 'no fit'}", room)
        mark, style = (">", "strong") if check == walk.check else (" ", "")
        ruled = (f"  {RULING_WORDS[own.ruling]}", own.ruling) if own and ruled_too else ("", "")
        rows.append([Span(f"{mark}{label}{text}", style, f"check('{check}')"), Span(*ruled)])
    return rows
