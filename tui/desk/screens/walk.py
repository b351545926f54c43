"""Where a reviewer is on their way through one candidate: what is loaded, shown, chosen and begun. No terminal here."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import TYPE_CHECKING

from tui.desk.widgets.plot_data import PlotData, PlotView
from tui.desk.widgets.plot_points import fit_of, plot_curves, plot_points, spectrum_curve, spectrum_pulls
from tui.model import CHECK_TITLES, CHECKS, Band, Candidate, Evidence, Fit, Measurement, Param
from tui.workflow.records import CandidateView, Cutout, StoryLine

if TYPE_CHECKING:
    from tui.checks import Curve
    from tui.workflow.dip_curves import DipCurve
    from tui.workflow.lookalikes import LookAlikes

STEP = 0.02  # of a parameter's value: one nudge by hand where the fit gives no interval
LEAST_STEP = 1e-6
ONLY_UNCLEAR = "No data test this check: only u (unclear) can be ruled here, and nothing need be."


@dataclass(frozen=True)
class Loaded:
    """All that is known of one candidate the moment it is opened, or after a ruling."""

    candidate: Candidate
    view: CandidateView
    bands: Mapping[str, Band]


@dataclass(repr=False)
class Hand:
    """Probing by hand: what is held, what is dropped, and what came of it."""

    params: tuple[str, ...]
    chosen: int = 0
    left_out: frozenset[str] = frozenset()  # bands that the fit begun from did without
    fixed: dict[str, float] = field(default_factory=dict)
    dropped: set[str] = field(default_factory=set)
    fit: Fit | None = None
    curve: Curve | None = None
    wish: int = 0  # counts what was asked for: only the newest is computed

    @property
    def param(self) -> str:
        """The parameter that the arrows change, or '' where the fit has none."""
        return self.params[self.chosen] if self.params else ""

    @property
    def touched(self) -> bool:
        """Whether anything is held, dropped or taken in again."""
        return bool(self.fixed) or self.dropped != self.left_out


@dataclass(repr=False)
class Walk:
    """The state of the page; the screen changes it and draws from it."""

    name: str
    check: str = CHECKS[0]
    loaded: Loaded | None = None
    p_min: float = 0.01  # of the queue's settings: below it a fit is refused
    evidence: dict[str, Evidence] = field(default_factory=dict)
    curves: dict[tuple[str, int], Curve | None] = field(default_factory=dict)
    story: tuple[StoryLine, ...] = ()
    cutouts: tuple[Cutout, ...] = ()
    dip_curves: tuple[DipCurve, ...] = ()
    look_alikes: LookAlikes | None = None  # looked for when their page is turned to
    looking: bool = False
    alike_trouble: str = ""  # why there are none
    stretch: int = 1
    first_cutout: int = 0
    fit_index: int = 0
    chosen: str = ""  # ruling chosen and not yet recorded
    stands: bool = False  # what is chosen is the reader's own ruling once more, with its note
    recorded: tuple[str, ...] = ()  # what was just recorded, at less and less length; it goes with the next key
    notes: dict[str, str] = field(default_factory=dict)  # check -> note begun and not recorded
    message: str = ""
    is_lesson: bool = False  # what is said is read in full before anything else: the answers of a practice star
    trouble: str = ""  # why there is no evidence
    page: int = 0
    plot_view: PlotView = field(default_factory=PlotView)
    plot_only: bool = False
    asking_compare: bool = False
    compared: str = ""
    hand: Hand | None = None
    recording: bool = False
    drawn: PlotData = field(default_factory=PlotData)  # what the plot shows, as `redrawn` last made it

    def __repr__(self) -> str:
        """Short: background work is described by its arguments each time it starts."""
        return f"Walk({self.name!r}, {self.check!r})"

    @property
    def note(self) -> str:
        """The note begun on the check on view; where a ruling is to stand, its own unless another was begun."""
        begun = self.notes.get(self.check, "")
        return begun or (self.loaded.view.own[self.check].note if self.stands else "")

    @property
    def is_done(self) -> bool:
        """Whether the reader is done with this candidate, and it asks them nothing more."""
        view = self.loaded.view if self.loaded else None
        return view is not None and view.done and not view.needs_me

    @property
    def is_split(self) -> bool:
        """Whether the rulings on the check on view part, as far as the reader may know."""
        return self.loaded is not None and self.loaded.view.states.get(self.check) == "split"

    def choose(self, ruling: str, stands: bool = False) -> None:
        """Choose a ruling; nothing is recorded yet."""
        self.chosen, self.stands, self.asking_compare = ruling, stands, False

    def take(self, loaded: Loaded) -> None:
        """Take in what the queue says of the candidate now; notes begun go with it."""
        self.loaded = loaded
        self.notes = {check: text for check, text in loaded.view.drafts.items() if text}

    @property
    def own_evidence(self) -> Evidence | None:
        """The evidence of the check on view."""
        return self.evidence.get(self.check)

    @property
    def fit(self) -> Fit | None:
        """The fit that is drawn: by hand where something was changed, else the check's."""
        if self.hand is not None and self.hand.fit is not None:
            return self.hand.fit
        return fit_of(self.own_evidence, self.fit_index)

    @property
    def model(self) -> str:
        """The model of the fit that the program made and that is chosen; '' where there is none."""
        made = fit_of(self.own_evidence, self.fit_index)
        return made.model if made else ""

    @property
    def fits(self) -> int:
        """How many fits the check has."""
        return len(self.own_evidence.fits) if self.own_evidence else 0

    def by_hand(self, chosen: int = 0) -> Hand:
        """Probing begun anew from the fit that the program made and that is drawn; what it did without stays out."""
        made, own = fit_of(self.own_evidence, self.fit_index), self.own_evidence
        left_out = frozenset(own.bands if own else ()) - frozenset(made.pulls if made else ())
        return Hand(tuple(made.params if made else ()), chosen, left_out, dropped=set(left_out))

    def go(self, check: str, keep_message: bool = False) -> None:
        """Turn to another check; nothing chosen, held or compared is carried over."""
        self.check = check
        self.fit_index = 0
        self.chosen = self.compared = ""
        self.stands, self.recorded = False, ()
        self.message = self.message if keep_message else ""
        self.hand, self.asking_compare = None, False

    def redrawn(self) -> PlotData:
        """What the plot is to show now."""
        self.drawn = self._plot() if self.loaded is not None else PlotData(message="reading ...")
        return self.drawn

    def _plot(self) -> PlotData:
        own = self.own_evidence
        curve = self.hand.curve if self.hand and self.hand.curve else self.curves.get((self.check, self.fit_index))
        other = self.evidence.get(self.compared) if self.compared else None
        points = plot_points(
            self.loaded.candidate,
            self.loaded.bands,
            self.fit,
            fitted=own.bands if own else (),
            dropped=self.hand.dropped if self.hand else (),
            other=other.best if other else None,
        )
        curves = plot_curves(
            curve, self.curves.get((self.compared, 0)), CHECK_TITLES.get(self.compared, "")
        ) + spectrum_curve(self.loaded.candidate)
        spectrum = spectrum_pulls(self.loaded.candidate, self.fit, curve)
        return PlotData(points, curves, spectrum, self._plot_message(own))

    def measurement_under_cursor(self) -> Measurement | None:
        """The measurement that the plot's cursor is on."""
        if self.loaded is None or self.plot_view.cursor is None:
            return None
        drawn = [one for one in self.loaded.candidate.measurements if self._has_place(one)]
        return drawn[self.plot_view.cursor] if self.plot_view.cursor < len(drawn) else None

    def nudge(self, direction: int) -> None:
        """Hold the chosen parameter a step higher or lower than it stands."""
        hand, fit = self.hand, self.fit
        if hand is None or fit is None or hand.param not in fit.params:
            return
        value = hand.fixed.get(hand.param, fit.params[hand.param].value)
        start = fit_of(self.own_evidence, self.fit_index)
        step = nudge_step(start.params.get(hand.param) if start else None, value)
        hand.fixed[hand.param] = max(value + direction * step, 0.0)

    def _plot_message(self, own: Evidence | None) -> str:
        if self.trouble:
            return self.trouble
        if own is None:
            return "computing the evidence ..."
        return "" if own.fits else "nothing could be fitted: these are the measurements alone"

    def _has_place(self, measurement: Measurement) -> bool:
        band = self.loaded.bands.get(measurement.band) if self.loaded else None
        return band is not None and band.pivot_um > 0


def nudge_step(param: Param | None, value: float) -> float:
    """How far one key press moves a parameter: half its interval's half width, or a small share of its value."""
    width = (param.high - param.low) / 4 if param is not None and not param.limit else 0.0
    if not 0 < width < float("inf"):
        width = 0.0
    return max(width, STEP * abs(value) if not width else 0.0, LEAST_STEP if value == 0 else 0.0) or 0.05


def first_check(view: CandidateView, resumed: str = "") -> str:
    """The check to open at: where the reviewer was, else the first they have still to rule, else the first."""
    if resumed in CHECKS:
        return resumed
    return next((check for check in CHECKS if check in view.to_rule), CHECKS[0])


def next_to_rule(view: CandidateView, after: str) -> str | None:
    """The next check in walking order that this reviewer has still to rule, round to the start once."""
    start = CHECKS.index(after) + 1
    order = CHECKS[start:] + CHECKS[:start]
    return next((check for check in order if check in view.to_rule and check != after), None)


def refusal(view: CandidateView, check: str, ruling: str) -> str:
    """Why a ruling cannot be chosen here, as a plain sentence; '' where it can."""
    if ruling == "withdrawn" and check not in view.own:
        return "There is no ruling of yours to withdraw on this check."
    if ruling in ("explains", "short") and view.states.get(check) == "nodata":
        return ONLY_UNCLEAR
    return ""


def step_check(check: str, step: int) -> str:
    """The neighbour of a check in walking order, round the ends."""
    return CHECKS[(CHECKS.index(check) + step) % len(CHECKS)]
