"""A folder into which files are dropped: which of them are complete, what became of each, and where it is put."""

from __future__ import annotations

import itertools
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING

from sameline.errors import CallError, FindingsError, KnownAlreadyError
from sameline.intake.rawfiles import load

if TYPE_CHECKING:
    from collections.abc import Iterator

    from sameline.lab.laboratory import Lab
    from sameline.lab.outcomes import Taken

TAKEN, HELD = "taken", "held"
"""Folders within the folder: for files that are recorded, and for files with findings."""
_NOT_OURS = (".tmp", ".part", ".partial", ".crdownload", ".lock")  # files that a program is still writing
_Stamp = tuple[int, int]
"""Size, and moment of the last change."""


class Folder:
    """A folder that is looked into again and again.

    Args:
        path: the folder.

    Raises:
        CallError: it is no folder.
    """

    def __init__(self, path: Path) -> None:
        if not path.is_dir():
            raise CallError("there is no such folder", where=str(path), advice="name another, or make it with --make")
        self.path = path
        self._seen: dict[str, _Stamp] = {}

    def complete(self) -> list[Path]:
        """The files that are as they were at the last look, oldest first; the others may still be growing.

        Raises:
            CallError: the folder cannot be read.
        """
        try:
            now = dict(self._stamps())
        except OSError as error:
            raise _trouble("the folder cannot be read", self.path, error) from error
        same = [name for name, stamp in now.items() if self._seen.get(name) == stamp]
        self._seen = now
        return [self.path / name for name in sorted(same, key=lambda name: (now[name][1], name))]

    def _stamps(self) -> Iterator[tuple[str, _Stamp]]:
        for path in self.path.iterdir():
            if path.name.startswith((".", "~")) or path.name.casefold().endswith(_NOT_OURS):
                continue
            try:
                if path.is_file():
                    status = path.stat()
                    yield path.name, (status.st_size, status.st_mtime_ns)
            except OSError:  # it went away meanwhile
                continue


@dataclass(frozen=True, slots=True)
class Handled:
    """What became of a file.

    Attributes:
        name: the file's name as it was dropped.
        place: where it is now; None where it could not be read and was left.
        says: why, a line each: findings, or where its runs are.
        taken: what was recorded of it, if anything was.
    """

    name: str
    place: Path | None
    says: tuple[str, ...] = ()
    taken: Taken | None = None

    @property
    def held(self) -> bool:
        """Whether it waits to be mended."""
        return self.place is None or self.place.parent.name == HELD


def handle(lab: Lab, path: Path, *, as_they_stand: bool = False) -> Handled:
    """Take in one file and move it to `taken` or `held`, there with its findings beside it.

    It is recorded first and moved then. Where the work is stopped in between, the file is known by its content next
    time, and is only moved.

    Raises:
        SamelineError: the store cannot be used, the acting person is not known, or the file cannot be moved; it stays
            where it is.
    """
    try:
        raw = load(path)
    except CallError as error:
        return Handled(path.name, None, (str(error),))
    try:
        taken = lab.take([raw], as_they_stand=as_they_stand)
    except KnownAlreadyError as error:
        says = (error.message, *error.findings, *([error.advice] if error.advice else []))
        return Handled(path.name, _moved(path, TAKEN), says)
    except FindingsError as error:
        return Handled(path.name, _moved(path, HELD, error.findings or [str(error)]), tuple(error.findings))
    return Handled(path.name, _moved(path, TAKEN), taken.passed, taken)


def findings_beside(path: Path) -> Path:
    """Where the findings of a held file stand."""
    return path.with_name(f"{path.name}.findings.txt")


def make_folder(path: Path) -> None:
    """Make a folder, unless it is there.

    Raises:
        CallError: it cannot be made.
    """
    try:
        path.mkdir(parents=True, exist_ok=True)
    except OSError as error:
        raise _trouble("the folder cannot be made", path, error) from error


def _trouble(problem: str, path: Path, error: OSError) -> CallError:
    return CallError(f"{problem}: {error.strerror}", where=str(path), advice="put it right and start again")


def _moved(path: Path, folder: str, findings: list[str] | None = None) -> Path:
    try:
        return _put(path, folder, findings)
    except OSError as error:
        raise _trouble(f"the file cannot be moved to {folder}", path, error) from error


def _put(path: Path, folder: str, findings: list[str] | None) -> Path:
    """Move a file, under a name that is free; nothing is overwritten."""
    place = path.parent / folder
    place.mkdir(exist_ok=True)
    names = itertools.chain([path.name], (f"{path.stem} ({n}){path.suffix}" for n in itertools.count(2)))
    target = next(t for name in names if not (t := place / name).exists() and not findings_beside(t).exists())
    if findings is not None:
        with findings_beside(target).open("x", encoding="utf-8") as stream:
            stream.writelines(f"{finding}\n" for finding in findings)
    path.rename(target)
    return target
