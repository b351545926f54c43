"""Is the log of rulings what its writers left? Hashes, predecessors, receipts.

A chain shows that no row was changed, removed from within or put in between. It cannot show that
rows were cut off its end, nor that a whole file was written anew by someone who computed all hashes
again; a receipt, kept by the reviewer outside the file, shows both.
"""

from __future__ import annotations

import re
import sqlite3
from collections.abc import Iterable

from tui.errors import InputError
from tui.model import Ruling
from tui.store.names import is_time
from tui.store.records import Fault
from tui.store.reviewers import handles
from tui.store.rulings import ruling_hash, ruling_log

RECEIPT_FORM = re.compile(r"([a-z0-9_-]{1,32}):(\d{1,12}):([0-9a-f]{64}(?:\+[0-9a-f]{64})*)?")


def chain_faults(connection: sqlite3.Connection) -> list[Fault]:
    """Every row whose hash is not that of its content, or that follows or replaces a row that is not there."""
    by = handles(connection)
    faults: list[Fault] = []
    reviewer_of: dict[str, str] = {}  # hash -> reviewer id
    place_of: dict[str, tuple[str, str, str]] = {}  # ruling id -> candidate, check, reviewer id
    for ruling in ruling_log(connection):
        if not is_time(ruling.utc):
            faults.append(fault(ruling, by, "has a time that is not in the form of the log"))
        if ruling_hash(ruling) != ruling.hash:
            faults.append(fault(ruling, by, "was changed after it was written: its hash is not that of its content"))
        if ruling.previous_hash and reviewer_of.get(ruling.previous_hash) != ruling.reviewer_id:
            faults.append(fault(ruling, by, "follows a ruling of the same reviewer that is not in the log before it"))
        place = (ruling.candidate, ruling.check, ruling.reviewer_id)
        if ruling.replaces and place_of.get(ruling.replaces) != place:
            faults.append(fault(ruling, by, "replaces a ruling that is not in the log before it"))
        reviewer_of[ruling.hash] = ruling.reviewer_id
        place_of[ruling.id] = place
    return faults


def fault(ruling: Ruling, by: dict[str, str], text: str) -> Fault:
    """A fault of one ruling, named so that a person finds it."""
    who = by.get(ruling.reviewer_id, ruling.reviewer_id)
    where = f"{who} on {ruling.check} of {ruling.candidate}, {ruling.utc}"
    return Fault("chain", f"ruling {ruling.id}", f"{where}: {text}.")


def links(connection: sqlite3.Connection, reviewer_id: str) -> dict[str, str]:
    """Hash -> previous hash, of one reviewer's rows."""
    query = "SELECT hash, previous_hash FROM ruling WHERE reviewer_id = ?"
    return dict(connection.execute(query, (reviewer_id,)).fetchall())


def receipt(connection: sqlite3.Connection, reviewer_id: str) -> str:
    """What a reviewer takes away: handle, number of rulings, head of the chain (several after a fork).

    It says of a later file whether those rulings are still in it, all and unchanged.
    """
    previous = links(connection, reviewer_id)
    heads = sorted(set(previous) - set(previous.values()))
    handle = handles(connection).get(reviewer_id, reviewer_id)
    return f"{handle}:{len(previous)}:{'+'.join(heads)}"


def receipt_faults(connection: sqlite3.Connection, receipts: Iterable[str]) -> list[Fault]:
    """What the receipts say that the log does not hold.

    Raises:
        InputError: a text that is no receipt.
    """
    faults: list[Fault] = []
    owners = dict(connection.execute("SELECT hash, reviewer_id FROM ruling").fetchall())
    for text in receipts:
        found = RECEIPT_FORM.fullmatch(text.strip())
        if found is None:
            raise InputError(f"{text.strip()[:60]!r} is no receipt; one reads HANDLE:NUMBER:HASH.")
        handle, number, heads = found[1], int(found[2]), [head for head in (found[3] or "").split("+") if head]
        missing = [head for head in heads if head not in owners]
        if missing:
            text = f"the log lacks the ruling {missing[0][:12]}... that {handle} left last."
            faults.append(Fault("receipt", handle, text))
            continue
        held = sum(len(before(links(connection, owner), heads)) for owner in {owners[head] for head in heads})
        if held != number:
            text = f"{handle} left {number} rulings up to that receipt; the log holds {held} of them."
            faults.append(Fault("receipt", handle, text))
    return faults


def before(previous: dict[str, str], heads: Iterable[str]) -> set[str]:
    """The hashes of a chain up to and with its heads."""
    reached: set[str] = set()
    for head in heads:
        while head in previous and head not in reached:
            reached.add(head)
            head = previous[head]
    return reached
