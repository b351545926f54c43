"""What the desk says to teach: the first three lines, the words, the reasons."""

from __future__ import annotations

from tui.desk.text import RULING_MEANINGS

ORIENTATION = (
    "Each line is a star that a search called odd; try to explain it away.",
    "m: the star that the fewest have finished. p: three stars to practise on.",
    "Rulings on a star stay sealed until you are done with it. ? tells more.",
)
READER_LINE = "You are reading without a handle. To rule: plainlight join QUEUE HANDLE, then review --as HANDLE."

WHAT_FOR = {
    "queue": (
        "The queue is the list of odd stars. Left to right: its name, its oddness, the band that is farthest from what "
        "the star alone should shine and by how many sigma, where each of the five checks stands, the outcome, and how "
        "much of it is yours to do.",
        "m: the star that the fewest have finished, of those that need you and that nobody else has on screen. "
        "p: three practice stars, before you rule on real ones.",
    ),
    "candidate": (
        "One star, one question at a time. Look first where the points leave the curve, then at the numbers, then "
        "rule: could this check alone make these fluxes? A letter chooses, Enter records; until Enter nothing is kept "
        "but your note.",
        "That a fit is adequate is not yet an explanation: free parameters absorb much. Read the cautions.",
    ),
    "tally": (
        "The team's standing, in the order in which one should ask: is it done, can it be trusted, what is left, what "
        "does it mean. It counts everyone's rulings but names only stars that you are done with, so that it steers "
        "nobody.",
    ),
    "split": (
        "You and a colleague ruled differently on this check, each without seeing the other. Read what each of you "
        "noted, look at the numbers again, then rule once more; it is marked as made with the others in view, and "
        "agreement is measured on the first rulings only.",
        "Changing your mind is no defeat and keeping it no stubbornness: say in the note what decided it.",
    ),
    "story": ("Everything that happened to this star, in time order, as far as you may see it.",),
}

WORDS = (
    ("=expl", RULING_MEANINGS["explains"]),
    ("<short", RULING_MEANINGS["short"]),
    ("~uncl", "you ruled that these data cannot tell"),
    (".todo", "you have not ruled it; whether others have stays sealed"),
    (":open", "too few sure rulings so far"),
    ("/split", "sure rulings that disagree"),
    ("-nodata", "the program has too few data to test it: nothing to rule"),
    ("*", "stale: the evidence that a ruling rests on has changed since in a way that matters"),
    (".sealed", "the outcome opens for you once you are done with the star"),
    ('"', "after a check's name: a note of yours begun there and not recorded"),
    ("done", "you ruled `explains` on a check, or every check that can be tested"),
    ("3/5", "yours: you ruled on three of the five checks that can be ruled"),
    ("again", "yours: a split asks you once more, or your ruling is stale"),
    ("--", "yours: it needs nobody now, though you are not done with it"),
    ("ordinary", "enough reviewers ruled that the star alone explains it: it was not odd"),
    ("explained", "enough reviewers hold one of the four natural explanations, though perhaps not the same one"),
    ("unexplained", "enough reviewers ruled that the star and all four fall short. It is no detection: only these "
                    "checks, with these data"),  # fmt: skip
    ("pending", "not settled yet, with the reason"),
    ("oddness", "how far from a plain star the data are, in sigma, as a Gaussian would count it"),
    ("pull", "measured minus model, in units of the error"),
)

BREAK_AFTER_S = 50 * 60
BREAK_LINE = "{minutes} minutes without a break. Tired eyes see patterns; your place is kept."
TOO_SMALL = (
    "This terminal is {width} columns by {height} lines. The desk needs 80 by 24: make it larger and it comes back as "
    "it was. Or leave with ctrl+c and use the commands: plainlight list, show, rule."
)
