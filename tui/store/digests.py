"""One digest for all that a queue holds of worth: candidates, measurements, rulings, settings.

Claims, drafts, derived rows and uncited evidence do not enter. Two files that hold the same rows give
the same digest, in whatever order the rows arrived.
"""

from __future__ import annotations

import hashlib
import sqlite3

# Each query gives rows of text in an order that depends on their content alone.
PARTS = (
    "SELECT name FROM candidate ORDER BY name",
    "SELECT name, t.source, t.digest, load.utc FROM candidate_version AS t "
    "JOIN candidate ON candidate.id = candidate_id JOIN load ON load.id = load_id "
    "ORDER BY name, t.source, t.digest, load.utc",
    "SELECT name, band, t.source, epoch, t.digest, load.utc FROM measurement AS t "
    "JOIN candidate ON candidate.id = candidate_id JOIN load ON load.id = load_id "
    "ORDER BY name, band, t.source, epoch, t.digest, load.utc",
    *(
        f"SELECT DISTINCT name, t.source, t.digest, load.utc FROM {table} AS t "
        "JOIN candidate ON candidate.id = candidate_id JOIN load ON load.id = load_id "
        "ORDER BY name, t.source, t.digest, load.utc"
        for table in ("neighbour", "dip", "spectrum", "cutout")
    ),
    "SELECT digest FROM attachment ORDER BY digest",
    "SELECT hash FROM ruling ORDER BY hash",
    "SELECT id, name, value, utc, reviewer_id FROM setting ORDER BY id",
)


def queue_digest(connection: sqlite3.Connection) -> str:
    """SHA-256 over the rows of `PARTS`, 64 hex digits."""
    total = hashlib.sha256()
    for number, query in enumerate(PARTS):
        total.update(f"part {number}\n".encode())
        cursor = connection.execute(query)
        while rows := cursor.fetchmany(5000):
            for row in rows:
                total.update(("\x1f".join(row) + "\x1e").encode("utf-8", "surrogatepass"))
    return total.hexdigest()
