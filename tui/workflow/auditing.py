"""Is the queue sound, and does it still hold what a reviewer was given a receipt for?"""

from __future__ import annotations

import os
from collections.abc import Sequence
from contextlib import closing
from dataclasses import dataclass
from pathlib import Path

from tui.errors import TableError, reason_of
from tui.store.connect import open_queue
from tui.workflow.counting import counted

CHAIN_LIMIT = (
    "A chain alone cannot show that its newest rulings were cut off, nor that someone wrote a whole chain anew: "
    "receipts that reviewers keep can."
)


@dataclass(frozen=True, slots=True)
class Audited:
    """What an audit found, as lines for a person."""

    lines: tuple[str, ...]
    faults: tuple[str, ...]


def audit_queue(path: str, *, repair: bool = False, receipts: Sequence[str] = ()) -> Audited:
    """Check file, chains, references and derived tables; with `repair` the derived ones are written anew.

    Args:
        receipts: texts of receipts, or paths of files that hold one a line.
    Raises:
        InputError: a text that is no receipt.
        StoreError: the file cannot be opened as a queue.
    """
    from tui.store.audit import audit

    with closing(open_queue(path, write=repair)) as connection:
        found = audit(connection, repair, receipt_texts(receipts))
    faults = tuple(f"{fault.kind}: {fault.place}: {fault.text}" for fault in found.faults)
    what = (("candidates", found.candidates), ("measurements", found.measurements), ("rulings", found.rulings))
    what = (*what, ("reviewers", found.reviewers))
    lines = [f"{path}: {', '.join(counted(count, name) for name, count in what)}."]
    lines.append(f"Queue digest {found.queue_digest}")
    lines += [f"Receipt of {handle}: {receipt}" for handle, receipt in sorted(found.heads.items())]
    if repair:
        lines.append(f"{counted(found.repaired, 'derived rows')} written anew.")
    if receipts:
        lines.append(f"{counted(len(receipts), 'receipts')} checked.")
    sound = "Sound: file, references, every chain, every derived state."
    lines.append(f"{counted(len(faults), 'faults')}." if faults else sound)
    return Audited((*lines, CHAIN_LIMIT), faults)


def receipt_texts(given: Sequence[str]) -> list[str]:
    """Receipts as texts; a file gives every line that is not empty."""
    texts: list[str] = []
    for one in given:
        lines = lines_of(one) if os.path.isfile(one) else [one]
        texts += [line.strip() for line in lines if line.strip()]
    return texts


def lines_of(path: str) -> list[str]:
    """The lines of a file of receipts. TableError where it cannot be read as text."""
    try:
        return Path(path).read_text(encoding="utf-8").splitlines()
    except (OSError, UnicodeDecodeError) as error:
        raise TableError(path, f"the receipts cannot be read: {reason_of(error)}.") from error


def write_backup(path: str, target: str) -> str:
    """Copy the queue to one file while others work; the sentence that says so.

    Raises:
        StoreError: `target` exists, or cannot be written.
    """
    from tui.store.audit import backup

    with closing(open_queue(path, write=False)) as connection:
        backup(connection, target)
    return f"Backup written: {target}"
