"""Files that appear whole or not at all.

Every file of a result is written under a passing name in the folder of its final one, flushed to the
disk, and renamed when all of them are complete. The main file is renamed last: where it stands, its
companions stand.
"""

from __future__ import annotations

import contextlib
import os
import shutil
from collections.abc import Callable, Iterator
from pathlib import Path


class WholeFiles:
    """Collects the files of one result; `commit` makes them appear together."""

    def __init__(self) -> None:
        self._pending: list[tuple[Path, Path]] = []

    @contextlib.contextmanager
    def create(self, path: str | os.PathLike[str]) -> Iterator[Path]:
        """Yields the passing path that the caller writes to; `path` itself is not touched before `commit`."""
        path = Path(path)
        passing = _new_beside(path, _new_file)
        self._pending.append((passing, path))
        try:
            yield passing
            with open(passing, "rb+") as handle:
                os.fsync(handle.fileno())
        except OSError as error:
            raise _about(path, error) from error

    def create_folder(self, path: str | os.PathLike[str]) -> Path:
        """The passing folder for a result that is a folder of files, such as a store of arrays."""
        path = Path(path)
        passing = _new_beside(path, os.mkdir)
        self._pending.append((passing, path))
        return passing

    def commit(self) -> list[Path]:
        """Renames the files in the reverse of the order in which they were created, the first one last."""
        done = []
        while self._pending:
            passing, path = self._pending[-1]
            if passing.is_dir():
                _replace_folder(passing, path)
            else:
                os.replace(passing, path)
            self._pending.pop()
            done.append(path)
        for folder in {path.parent for path in done}:
            _flush_folder(folder)
        return done[::-1]

    def discard(self) -> None:
        """Takes away what was written so far."""
        for passing, _ in self._pending:
            if passing.is_dir():
                shutil.rmtree(passing, ignore_errors=True)
                continue
            with contextlib.suppress(FileNotFoundError):
                os.unlink(passing)
        self._pending.clear()

    def __enter__(self) -> WholeFiles:
        return self

    def __exit__(self, kind: object, *_: object) -> None:
        try:
            if kind is None:
                self.commit()
        finally:
            self.discard()


def _new_file(path: Path) -> None:
    """An empty file with the permissions of any new file; an error if there is one already."""
    os.close(os.open(path, os.O_CREAT | os.O_EXCL | os.O_WRONLY, 0o666))


def _replace_folder(passing: Path, path: Path) -> None:
    """Puts a complete folder in the place of an older one. Two renames: no one call does it."""
    for root, _, names in os.walk(passing):
        for name in names:
            with open(os.path.join(root, name), "rb+") as handle:
                os.fsync(handle.fileno())
        _flush_folder(Path(root))
    if not path.exists():
        os.rename(passing, path)
        return
    older = _new_beside(path, os.mkdir)
    os.rename(path, older)
    os.rename(passing, path)
    shutil.rmtree(older, ignore_errors=True)


def _new_beside(path: Path, make: Callable[[Path], None]) -> Path:
    """What `make` makes in the folder of `path` under a passing name that nobody else has."""
    for attempt in range(10_000):
        passing = path.parent / f".{path.name}.{os.getpid()}-{attempt}.part"
        try:
            make(passing)
        except FileExistsError:
            continue
        except OSError as error:
            raise _about(path, error) from error
        return passing
    raise FileExistsError(f"{path}: the folder is full of unfinished files of this name")


def _about(path: Path, error: OSError) -> OSError:
    """The error with the name of the result, which the caller knows, for that of the passing file."""
    return OSError(error.errno, os.strerror(error.errno), str(path)) if error.errno else error


def _flush_folder(folder: Path) -> None:
    """Makes the renames themselves durable, where the system lets a folder be opened."""
    with contextlib.suppress(OSError):
        descriptor = os.open(folder, os.O_RDONLY)
        try:
            os.fsync(descriptor)
        finally:
            os.close(descriptor)
