"""Write a file so that there is the old one or the new one, never half of one."""

from __future__ import annotations

import contextlib
import errno
import os
import stat
import tempfile
from collections.abc import Iterator
from pathlib import Path
from typing import TextIO

from shiftpred.errors import SettingError, quote

__all__ = ["build_refusal", "open_for_saving", "save_text"]


def save_text(path: str | os.PathLike, text: str) -> None:
    """Write `text` to `path` in one step.

    Parameters
    ----------
    path : str or path
        File to make or replace; its folder must exist.
    text : str
        Written as UTF-8, line ends unchanged.

    Raises
    ------
    SettingError
        If the folder is missing or read-only, the path is a folder, or the disk is full; an older file is left as it was.

    Examples
    --------
    >>> import tempfile, pathlib
    >>> with tempfile.TemporaryDirectory() as folder:
    ...     save_text(pathlib.Path(folder) / "report.txt", "supported")
    ...     (pathlib.Path(folder) / "report.txt").read_text()
    'supported'
    """
    with open_for_saving(path) as stream:
        stream.write(text)


@contextlib.contextmanager
def open_for_saving(path: str | os.PathLike) -> Iterator[TextIO]:
    """Open a text stream whose content takes the place of `path` when the block ends without an error.

    The text goes to a temporary file in the same folder, is flushed to the disk, and then renamed; after an error the
    temporary file is removed and `path` is as it was. A device or pipe (`/dev/null`) is written to directly.

    Parameters
    ----------
    path : str or path

    Yields
    ------
    text stream
        UTF-8, no translation of line ends.

    Raises
    ------
    SettingError
        As for `save_text`.
    """
    shown = f"output file {quote(str(path))}"
    target = Path(os.path.realpath(path))  # through a symbolic link: replace the file, not the link
    if target.is_dir():
        raise SettingError(shown, "a folder", "the name of a file", "add a file name to the folder")
    if not target.parent.is_dir():
        raise SettingError(shown, "a folder that does not exist", "a folder that is there", f"make {target.parent} first")
    temporary = None
    try:
        if target.exists() and not stat.S_ISREG(target.stat().st_mode):
            with open(target, "w", encoding="utf-8", errors="backslashreplace", newline="") as stream:
                yield stream
            return
        handle, temporary = tempfile.mkstemp(prefix=f".{target.name[:80]}.", suffix=".part", dir=target.parent)
        with open(handle, "w", encoding="utf-8", errors="backslashreplace", newline="") as stream:
            yield stream
            stream.flush()
            os.fsync(stream.fileno())
        os.chmod(temporary, _compute_mode(target))
        os.replace(temporary, target)
        temporary = None
        _sync_folder(target.parent)
    except OSError as error:
        refusal = build_refusal(error, shown, f"free space on {target.parent}")
        if refusal is None:
            raise
        raise refusal from error
    finally:
        if temporary is not None:
            with contextlib.suppress(OSError):
                os.unlink(temporary)


def _compute_mode(target: Path) -> int:
    """Return the permissions that the file has already, or those that the user's mask gives a new one."""
    try:
        return stat.S_IMODE(target.stat().st_mode)
    except FileNotFoundError:
        mask = os.umask(0)
        os.umask(mask)
        return 0o666 & ~mask


def _sync_folder(folder: Path) -> None:
    """Make the new name itself last through a power cut, where the system can."""
    with contextlib.suppress(OSError, AttributeError):
        handle = os.open(folder, os.O_RDONLY | os.O_DIRECTORY)
        try:
            os.fsync(handle)
        finally:
            os.close(handle)


def build_refusal(error: OSError, shown: str, make_room: str) -> SettingError | None:
    """Turn the operating system's refusal to write into ours; None for anything that has nothing to do with writing."""
    if error.errno in (errno.EACCES, errno.EPERM, errno.EROFS):
        accepted = "a folder with write permission"
        return SettingError(shown, "a place that may not be written to", accepted, "another folder with --output")
    if error.errno in (errno.ENOSPC, errno.EDQUOT, errno.EFBIG):
        came = "a full disk"
        return SettingError(shown, came, "room for the new file", make_room)
    if error.errno in (errno.ENAMETOOLONG, errno.EINVAL):
        return SettingError(shown, "a name that this file system refuses", "a shorter, plainer name", "report.html")
    return None
