"""One folder for one run: a lock that the operating system drops when its process ends, however it ends."""

from __future__ import annotations

import contextlib
import os
from collections.abc import Iterator
from pathlib import Path

__all__ = ["hold_folder"]

FILE = ".running"


@contextlib.contextmanager
def hold_folder(folder: Path) -> Iterator[None]:
    """Hold a folder while the block runs.

    Parameters
    ----------
    folder : path
        Must exist; the file `.running` in it carries the lock and, for people, the number of the process.

    Raises
    ------
    BlockingIOError
        If another process holds it.
    OSError
        If the folder cannot be written to.
    """
    path = folder / FILE
    handle = _open_locked(path)
    try:
        os.ftruncate(handle, 0)
        os.write(handle, str(os.getpid()).encode())
        yield
    finally:
        if os.name == "nt":  # an open file cannot be removed there
            os.close(handle)
            with contextlib.suppress(OSError):
                path.unlink(missing_ok=True)
        else:
            path.unlink(missing_ok=True)
            os.close(handle)


def _open_locked(path: Path) -> int:
    while True:
        handle = os.open(path, os.O_CREAT | os.O_RDWR, 0o666)
        try:
            _lock(handle)
            # The run before may have removed the file between our opening and locking it: then this is a lock on nothing.
            if os.path.exists(path) and os.path.samestat(os.fstat(handle), os.stat(path)):
                return handle
        except FileNotFoundError:
            pass
        except BaseException:
            os.close(handle)
            raise
        os.close(handle)


def _lock(handle: int) -> None:
    if os.name == "nt":
        import msvcrt

        try:
            os.lseek(handle, 1_000_000, os.SEEK_SET)  # beyond the text, which others may want to read
            msvcrt.locking(handle, msvcrt.LK_NBLCK, 1)
            os.lseek(handle, 0, os.SEEK_SET)
        except OSError:
            raise BlockingIOError from None
    else:
        import fcntl

        fcntl.flock(handle, fcntl.LOCK_EX | fcntl.LOCK_NB)
