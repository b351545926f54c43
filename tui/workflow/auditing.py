"""Is the queue sound, and does it still hold what a reviewer was given a receipt for?"""

from __future__ import annotations

import os
from contextlib import closing
from dataclasses import dataclass

from tui.errors import InputError
from tui.store.connect import open_queue

CHAIN_LIMIT = (
    "A chain alone cannot show that its newest rulings were cut off, nor that someone wrote a whole chain anew: "
    "receipts that reviewers keep can."
)


@dataclass(frozen=True, slots=True)
class Audited:
    """What an audit found, as lines for a person."""

    lines: tuple[str, ...]
    faults: tuple[str, ...]


def audit_queue(path: str, *, repair: bool = False) -> Audited:
    """Check file, chains, references and derived tables; with `repair` the derived ones are written anew.

    Raises:
        StoreError: the file cannot be opened as a queue.
    """
    from tui.store.audit import audit

    with closing(open_queue(path, write=repair)) as connection:
        found = audit(connection, repair=repair)
    faults = tuple(f"{fault.kind}: {fault.place}: {fault.text}" for fault in found.faults)
    what = (("candidates", found.candidates), ("measurements", found.measurements), ("rulings", found.rulings))
    lines = [f"{path}: {', '.join(f'{count} {name}' for name, count in what)}, {found.reviewers} reviewers."]
    lines.append(f"Queue digest {found.queue_digest}")
    lines += [f"Receipt of {handle}: {receipt}" for handle, receipt in sorted(found.heads.items())]
    if repair:
        lines.append(f"{found.repaired} derived rows written anew.")
    lines.append(f"{len(faults)} faults." if faults else "Sound: file, references, every chain, every derived state.")
    return Audited((*lines, CHAIN_LIMIT), faults)


def write_backup(path: str, target: str) -> str:
    """Copy the queue to one file while others work; the sentence that says so.

    Raises:
        InputError: `target` exists.
    """
    from tui.store.audit import backup

    if os.path.lexists(target):
        raise InputError(f"{target} exists already; choose another name for the backup.")
    with closing(open_queue(path, write=False)) as connection:
        backup(connection, target)
    return f"Backup written: {target}"
