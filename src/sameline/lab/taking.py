"""What files hold, laid beside what the store has already, and what becomes of it."""

from __future__ import annotations

from collections import Counter
from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from pathlib import Path
from typing import TYPE_CHECKING

from sameline.errors import CallError, KnownAlreadyError
from sameline.intake.files import Intake, read_files
from sameline.intake.forms import with_forms
from sameline.intake.recognise import KnownRun, Recognition, keys_of, recognise
from sameline.intake.rest import rest_files
from sameline.records.known_runs import read_known_runs
from sameline.records.lookups import read_register

if TYPE_CHECKING:
    from sameline.intake.headings import HeadingMap
    from sameline.intake.rawfiles import RawFile
    from sameline.records.drafts import CharacteristicFacts
    from sameline.records.store import Reading


@dataclass(frozen=True, slots=True)
class Examined:
    """Files as they were read.

    Attributes:
        intake: the runs that the store has not, and the findings; changed and look-alike runs are among these.
        facts: the characteristics of the runs, by code.
        passed: what is said of runs that the store has already, a line for each file and entry.
        maps: the heading maps with which the files were read.
    """

    intake: Intake
    facts: dict[str, CharacteristicFacts]
    passed: tuple[str, ...]
    maps: Sequence[HeadingMap] = ()


def chosen_maps(maps: Sequence[HeadingMap], name: str | None) -> Sequence[HeadingMap]:
    """All kept maps, or the one of this name.

    Raises:
        CallError: none is kept under it.
    """
    chosen = [form for form in maps if name in (None, form.name)]
    if name is not None and not chosen:
        raise CallError(f"no heading map is kept as {name!r}", advice="`sameline map list` shows what is")
    return chosen


def examine(
    reading: Reading,
    now: str,
    raws: Sequence[RawFile],
    maps: Sequence[HeadingMap] = (),
    progress: Callable[[str, int], None] | None = None,
) -> Examined:
    """Read files and recognise in them what is recorded.

    Raises:
        CallError: two files have the same name.
    """
    twice = [name for name, count in Counter(raw.name for raw in raws).items() if count > 1]
    if twice:
        raise CallError(f"two of the files are named {twice[0]}", advice="take them in one after the other")
    register = replace(read_register(reading, now), runs=frozenset())  # recognised below, run for run
    maps = with_forms(maps, raws)
    found = read_files(raws, register, maps=maps, progress=progress)
    known = read_known_runs(reading, keys_of(found))
    facts = {code: register.characteristics[code] for code in {run.characteristic for run in found.runs}}
    if not known:
        return Examined(found, facts, (), maps)
    drafts = {key: [KnownRun(entry, run) for entry, run in held] for key, held in known.items()}
    recognised = recognise(found, drafts)
    return Examined(_without_known(found, recognised), facts, _passed(recognised), maps)


def _without_known(found: Intake, recognised: Recognition) -> Intake:
    new = {id(run) for run in recognised.new}
    parts = tuple(replace(part, runs=tuple(run for run in part.runs if id(run) in new)) for part in found.parts)
    passed = set(recognised.passed)
    said = tuple(finding for finding in recognised.findings if finding not in passed)
    return replace(found, runs=recognised.new, findings=(*found.findings, *said), parts=parts)


def _passed(recognised: Recognition) -> tuple[str, ...]:
    counts = Counter(
        (finding.file, known.entry) for finding, known in zip(recognised.passed, recognised.same, strict=True)
    )
    return tuple(
        f"{file}: passed over {count} run{'s' if count > 1 else ''} recorded already, in entry {entry}"
        for (file, entry), count in counts.items()
    )


def refuse_nothing_new(examined: Examined) -> None:
    """Refuse files of which every run is recorded.

    Raises:
        KnownAlreadyError: there is nothing to record.
    """
    if examined.passed and not examined.intake.runs:
        raise KnownAlreadyError("there is nothing new to record", list(examined.passed))


def write_rest(raws: Sequence[RawFile], examined: Examined, folder: Path) -> tuple[Path, ...]:
    """Write what could not be taken into a folder, to be mended; nothing there is overwritten.

    Raises:
        CallError: a file of that name is there already, or the folder cannot be written to.
    """
    rests = [rest for raw in raws if _was_read(raw, examined.intake) for rest in _held(raw, examined)]
    written: list[Path] = []
    try:
        folder.mkdir(parents=True, exist_ok=True)
        for rest in rests:
            with (folder / rest.name).open("xb") as stream:
                written.append(folder / rest.name)
                stream.write(rest.data)
    except OSError as error:
        remove(written)
        raise CallError(
            f"the rest cannot be written: {error.strerror}",
            where=str(error.filename or folder),
            advice="name another folder; nothing was recorded",
        ) from error
    return tuple(written)


def remove(written: Sequence[Path]) -> None:
    """Take back files that were written for an act that failed."""
    for path in written:
        path.unlink(missing_ok=True)


def _was_read(raw: RawFile, found: Intake) -> bool:
    return any(part.file == raw.name and part.heading_row is not None for part in found.parts)


def _held(raw: RawFile, examined: Examined) -> tuple[RawFile, ...]:
    return rest_files(raw, examined.intake, examined.maps)
