"""Where a store is: a file, or a database server by its SQLAlchemy URL."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

import sqlalchemy as sa

from .errors import StoreError

_SHARED = {
    "nfs",
    "nfs4",
    "cifs",
    "smbfs",
    "smb3",
    "lustre",
    "gpfs",
    "beegfs",
    "afs",
    "ceph",
    "glusterfs",
    "fuse.glusterfs",
    "fuse.sshfs",
}
"""Shared between machines, while the write-ahead log needs memory of one machine (sqlite.org/wal.html)."""


@dataclass(frozen=True)
class Location:
    """A store file (``path``) or a server (``path`` is None); prints without any password."""

    url: sa.URL
    path: Path | None

    def __str__(self) -> str:
        return str(self.path) if self.path else self.url.render_as_string(hide_password=True)

    @property
    def exists(self) -> bool:
        """Is there a file with something in it? A server is taken to be there."""
        return self.path is None or (self.path.is_file() and self.path.stat().st_size > 0)

    @property
    def lock_path(self) -> Path | None:
        """The side file that the coordinator locks."""
        return self.path.with_name(self.path.name + ".lock") if self.path else None


def locate(target: str | Path) -> Location:
    """Read a path or a URL; :class:`StoreError` when it is neither."""
    if isinstance(target, Path) or "://" not in target:
        return _file(Path(target))
    try:
        url = sa.make_url(target)
    except sa.exc.ArgumentError:
        raise StoreError(f"{target} is neither a file nor a database URL like postgresql+psycopg://host/name") from None
    if url.get_backend_name() != "sqlite":
        return Location(url, None)
    if not url.database or url.database == ":memory:":
        raise StoreError("a store is kept in a file: give a path, for example night.db")
    return _file(Path(url.database))


def _file(path: Path) -> Location:
    if path.is_dir():
        raise StoreError(f"{path} is a folder: name a file in it, for example {path / 'night.db'}")
    return Location(sa.URL.create("sqlite", database=str(path.absolute())), path)


def refuse_shared_disk(path: Path, mounts: Path = Path("/proc/self/mounts")) -> None:
    """Raise :class:`StoreError` when the file would be on a network disk (known on Linux only)."""
    kind = _file_system(path.absolute().parent.resolve(), mounts)
    if kind in _SHARED:
        raise StoreError(
            f"{path} is on a network disk ({kind}), where a store can be damaged: "
            "keep it on a local disk and copy it when the screen is done"
        )


def _file_system(folder: Path, mounts: Path) -> str | None:
    """Type of the deepest mount that holds the folder."""
    if not mounts.exists():
        return None
    entries = (line.split() for line in mounts.read_text().splitlines())
    found = [(len(where), kind) for _, where, kind, *_ in entries if folder.is_relative_to(_unescaped(where))]
    # The last of equally deep mounts covers the earlier ones.
    return max(enumerate(found), key=lambda item: (item[1][0], item[0]))[1][1] if found else None


def _unescaped(mount_point: str) -> str:
    return mount_point.encode().decode("unicode_escape")
