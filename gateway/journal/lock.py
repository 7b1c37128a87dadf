"""One gateway for one site: a lock on the folder that holds its journal."""

import fcntl
import os
from pathlib import Path
from types import TracebackType
from typing import Self

from gateway.errors import InputError


class Lock:
    """Held for as long as the process lives or until released; the kernel frees it however the process ends."""

    def __init__(self, folder: Path) -> None:
        folder.mkdir(parents=True, exist_ok=True)
        self._path = folder / "lock"
        self._file = os.open(self._path, os.O_RDWR | os.O_CREAT | os.O_CLOEXEC, 0o600)
        try:
            fcntl.flock(self._file, fcntl.LOCK_EX | fcntl.LOCK_NB)
        except OSError:
            holder = os.read(self._file, 20).decode("ascii", "replace").strip() or "unknown"
            os.close(self._file)
            raise InputError(
                f"{self._path}: another gateway (process {holder}) runs this site; stop it first"
            ) from None
        os.truncate(self._file, 0)
        os.pwrite(self._file, str(os.getpid()).encode(), 0)

    def release(self) -> None:
        """Let go of the lock."""
        os.close(self._file)

    def __enter__(self) -> Self:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        self.release()
