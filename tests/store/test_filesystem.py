"""Network filesystems as the mount table tells them."""

from __future__ import annotations

import pytest

from tui.store.filesystem import network_type

TABLE = r"""/dev/sda1 / ext4 rw 0 0
server:/export /home nfs4 rw 0 0
//box/share /mnt/my\040share cifs rw 0 0
me@host: /mnt/far fuse.sshfs rw 0 0
/dev/fuse /mnt/near fuse.ntfs-3g rw 0 0
tmpfs /home/local tmpfs rw 0 0
"""


@pytest.mark.parametrize(
    ("path", "kind"),
    [
        ("/data/queue.db", ""),
        ("/home/heron/queue.db", "nfs4"),
        ("/homely/queue.db", ""),
        ("/home/local/queue.db", ""),
        ("/mnt/my share/queue.db", "cifs"),
        ("/mnt/far/queue.db", "fuse.sshfs"),
        ("/mnt/near/queue.db", ""),
    ],
)
def test_the_innermost_mount_counts(tmp_path, path, kind):
    table = tmp_path / "mounts"
    table.write_text(TABLE)
    assert network_type(path, str(table)) == kind


def test_without_a_mount_table_all_is_local(tmp_path):
    assert network_type("/home/queue.db", str(tmp_path / "none")) == ""
