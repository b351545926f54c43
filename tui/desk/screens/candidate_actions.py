"""Moving through the plot, comparing fits, and probing by hand."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

from textual import work

from tui.desk.widgets.rows_view import RowsView
from tui.errors import TuiError

if TYPE_CHECKING:
    from tui.desk.screens.candidate import CandidateScreen
    from tui.desk.screens.walk import Hand, Walk
    from tui.workflow.session import Session

NEARER = 0.6  # share of the view that one zoom step leaves
PAN = 0.25  # share of the view that one step moves
LARGE = 10  # nudges in one large step


class MovesThroughPlot:
    """Arrows walk the points, plus and minus zoom; the same keys scroll a further page."""

    def action_point(self: CandidateScreen, step: int) -> None:
        """The neighbouring point, told in words."""
        if self.walk.page == 0:
            self.walk.plot_view = self.walk.plot_view.stepped(self.walk.drawn, step)
            self.draw_view()

    def action_zoom(self: CandidateScreen, direction: int) -> None:
        """Nearer or farther, about the cursor."""
        factor = NEARER if direction > 0 else 1 / NEARER
        self.walk.plot_view = self.walk.plot_view.zoomed(self.walk.drawn, factor)
        self.draw_view()

    def action_pan(self: CandidateScreen, direction: int) -> None:
        """Along the wavelengths, when zoomed."""
        self.walk.plot_view = self.walk.plot_view.panned(self.walk.drawn, PAN * direction)
        self.draw_view()

    def action_quantity(self: CandidateScreen) -> None:
        """F_nu or nu F_nu."""
        self.walk.plot_view = replace(self.walk.plot_view, nu_fnu=not self.walk.plot_view.nu_fnu)
        self.draw_view()

    def action_plot(self: CandidateScreen) -> None:
        """The plot alone; from a page, the plot with the numbers."""
        walk = self.walk
        walk.plot_only = not walk.plot_only if walk.page == 0 else False
        walk.page = 0
        self.draw()

    def action_up(self: CandidateScreen) -> None:
        """The fit before; by hand, more; on a page, a line up."""
        self.move(-1)

    def action_down(self: CandidateScreen) -> None:
        """The next fit; by hand, less; on a page, a line down."""
        self.move(1)

    def action_page_up(self: CandidateScreen) -> None:
        """A screen up; by hand, a large step up."""
        self.move(-1, large=True)

    def action_page_down(self: CandidateScreen) -> None:
        """A screen down; by hand, a large step down."""
        self.move(1, large=True)

    def move(self: CandidateScreen, lines: int, large: bool = False) -> None:
        """What the up and down arrows do here."""
        walk = self.walk
        if walk.page:
            view = self.query_one("#walk-page", RowsView)
            view.scroll_rows(lines * (max(1, view.size.height - 2) if large else 1))
        elif walk.hand is not None:
            walk.nudge(-lines * (LARGE if large else 1))
            self.probe()
        elif walk.fits > 1:
            self.action_fit((walk.fit_index + lines) % walk.fits)

    def action_fit(self: CandidateScreen, index: int) -> None:
        """Draw another of the check's fits."""
        self.walk.fit_index = min(max(index, 0), max(0, self.walk.fits - 1))
        self.walk.hand = None
        self.draw()
        self.show_curve(self.walk, self.walk.check, self.walk.fit_index)

    def action_compare(self: CandidateScreen) -> None:
        """Ask for the check to compare with; again: compare no more."""
        walk = self.walk
        if walk.asking_compare or walk.compared:
            walk.asking_compare, walk.compared = False, ""
        else:
            walk.asking_compare, walk.page = True, 0
        self.draw()

    def action_reset(self: CandidateScreen) -> None:
        """By hand: the program's own fit again. Else the whole plot."""
        if self.walk.hand is not None:
            self.walk.hand = self.walk.by_hand(self.walk.hand.chosen)
        else:
            self.walk.plot_view = replace(self.walk.plot_view, x_range=None)
        self.draw()


class ProbesByHand:
    """Numbers changed by hand: the session fits the rest, chi-square and curve follow."""

    def action_hand(self: CandidateScreen) -> None:
        """Begin, or leave with everything as the program fitted it."""
        walk = self.walk
        if walk.hand is not None:
            walk.hand = None
        elif walk.fit is None:
            self.say("There is no fit to change here.")
            return
        else:
            walk.page, walk.asking_compare = 0, False
            walk.hand = walk.by_hand()
        self.draw()

    def next_param(self: CandidateScreen, step: int) -> None:
        """The next number to change."""
        hand = self.walk.hand
        if hand is not None and hand.params:
            hand.chosen = (hand.chosen + step) % len(hand.params)
            self.draw()

    def action_drop(self: CandidateScreen) -> None:
        """Leave the band under the cursor out, or take it in again."""
        walk, measurement = self.walk, self.walk.measurement_under_cursor()
        if walk.hand is None:
            self.say("Space drops a band by hand: h begins, Left and Right choose the band.")
        elif measurement is None:
            self.say("Left and Right choose the band to drop.")
        else:
            walk.hand.dropped ^= {measurement.band}
            self.probe()

    def action_release(self: CandidateScreen) -> None:
        """Let the chosen number be fitted again."""
        if self.walk.hand is not None and self.walk.hand.fixed.pop(self.walk.hand.param, None) is not None:
            self.probe()

    def probe(self: CandidateScreen) -> None:
        """Fit with what is held and dropped now; a wish that was overtaken is never computed."""
        hand = self.walk.hand
        if hand is None:
            return
        if not hand.touched:
            hand.fit = hand.curve = None
            self.draw()
            return
        hand.wish += 1
        self.run_probe(self.walk, hand, hand.wish)

    @work(group="probe", exit_on_error=False)
    async def run_probe(self: CandidateScreen, walk: Walk, hand: Hand, wish: int) -> None:
        """Ask the session off this thread and draw what comes, unless the reviewer moved on."""
        check, fixed, dropped, model = walk.check, dict(hand.fixed), frozenset(hand.dropped), walk.model

        def job(session: Session):
            return session.probe(walk.name, check, fixed, dropped, model) if wish == hand.wish else None

        try:
            found = await self.reads.ask(job)
        except TuiError as error:
            if self.is_here(walk):
                self.say(str(error), is_error=True)
            return
        if found is not None and self.is_here(walk) and walk.hand is hand:
            hand.fit, hand.curve = found
            self.draw()
