"""Put a whole new file in the place of an old one, or leave the old one alone."""

from __future__ import annotations

import contextlib
import os
import shutil
import stat
import tempfile
from collections.abc import Iterable
from pathlib import Path

from .refusals import Refusal


def replace_file(target: Path, pieces: Iterable[bytes], like: Path) -> None:
    """Write the pieces beside the target, bring them to the disk, and rename.

    A crash at any moment leaves the old file, or the complete new one. An existing
    target keeps its mode, owner (where allowed) and extended attributes; a new one
    takes the mode of ``like``. A symbolic link stays and its file is replaced.
    Raises :class:`Refusal` when the place cannot be written.
    """
    target = Path(os.path.realpath(target))
    old = _stat(target)
    if old is not None and not stat.S_ISREG(old.st_mode):
        raise Refusal(f"{target} is not an ordinary file, so no workbook can be saved there.")
    if old is not None and not (old.st_mode & stat.S_IWUSR and os.access(target, os.W_OK)):
        raise Refusal(
            f"{target} is write-protected. Lift the protection, or give another name for the result."
        )
    try:
        handle, name = tempfile.mkstemp(prefix=f".{target.name[:100]}.", suffix=".tmp", dir=target.parent)
    except OSError as error:
        raise _cannot(target, error) from error
    beside = Path(name)
    try:
        with os.fdopen(handle, "wb") as file:
            for piece in pieces:
                file.write(piece)
            file.flush()
            _dress(beside, target, old, like)
            os.fsync(file.fileno())
        os.replace(beside, target)
    except BaseException as error:
        with contextlib.suppress(OSError):
            beside.unlink()
        if isinstance(error, OSError):
            raise _cannot(target, error) from error
        raise
    _sync_folder(target.parent)


def _stat(path: Path) -> os.stat_result | None:
    try:
        return path.stat()
    except FileNotFoundError:
        return None
    except OSError as error:
        raise _cannot(path, error) from error


def _cannot(target: Path, error: OSError) -> Refusal:
    reason = error.strerror or str(error)
    return Refusal(
        f"{target} could not be written ({reason}). Nothing was changed. "
        "Close it in other programs, look at the folder's rights and free space, or give another name."
    )


def _dress(beside: Path, target: Path, old: os.stat_result | None, like: Path) -> None:
    if old is None:
        umask = os.umask(0)
        os.umask(umask)
        source = _stat(like)
        mode = 0o666 if source is None else source.st_mode & 0o666
        os.chmod(beside, (mode | stat.S_IWUSR) & ~umask | stat.S_IRUSR)
        return
    if hasattr(os, "chown"):
        with contextlib.suppress(OSError):
            os.chown(beside, old.st_uid, old.st_gid)
    shutil.copystat(target, beside)
    os.utime(beside)


def _sync_folder(folder: Path) -> None:
    # Some systems cannot open a folder; there the rename alone has to do.
    with contextlib.suppress(OSError):
        handle = os.open(folder, os.O_RDONLY)
        try:
            os.fsync(handle)
        finally:
            os.close(handle)
