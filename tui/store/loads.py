"""When rows came into the file: the table `load`, one row for each call that added something."""

from __future__ import annotations

import sqlite3

from tui.store.names import checked_utc, later_utc


class Loads:
    """The rows of the table `load` that one call to save needs: made when first asked for, later than all on file."""

    def __init__(self, connection: sqlite3.Connection, utc: str) -> None:
        self.connection = connection
        self.utc = checked_utc(utc)
        self.ids: list[int] = []

    def id_at(self, step: int) -> int:
        """The id of the load `step` microseconds after the first; steps are taken one by one."""
        while len(self.ids) <= step:
            last = self.connection.execute("SELECT COALESCE(MAX(utc), '') FROM load").fetchone()[0]
            self.utc = later_utc(self.utc, last)
            self.ids.append(self.connection.execute("INSERT INTO load (utc) VALUES (?)", (self.utc,)).lastrowid)
        return self.ids[step]
