"""Write files whole or not at all: everything is checked and written aside before anything is moved.

An existing file is replaced only when that is asked for, and a link is followed: what it points to is written.
Only ordinary files are ever replaced, and never what the run itself reads.
"""

from __future__ import annotations

import os
import stat
from collections.abc import Mapping, Sequence
from typing import TYPE_CHECKING

from rfstage.errors import FileError
from rfstage.fields import plain

if TYPE_CHECKING:
    from pathlib import Path

Inputs = Mapping[str, "str | Path | None"]  # what the run reads: "job file" -> its name, or None


def check_targets(names: Sequence[str | Path], *, overwrite: bool, inputs: Inputs | None = None) -> None:
    """Refuse targets that can't be written, all in one go.

    Parameters
    ----------
    names : sequence of str or Path
        The files to be written.
    overwrite : bool
        Whether those that exist may be replaced.
    inputs : mapping or None
        What the run reads, by its kind, such as ``"job file"``; no target may be one of them.

    Raises
    ------
    FileError
        With one line for each: no such folder, a folder by that name, an existing file, what is no ordinary file,
        one of the inputs, one name twice.
    """
    problems = []
    for name in [os.fspath(name) for name in names]:
        problem = _problem(name, overwrite, inputs or {})
        if problem:
            problems.append(f"{plain(name) or 'an empty name'}: {problem}")
    if len({os.path.realpath(name) for name in names}) < len(names):
        problems.append("two outputs have the same file name; give each its own")
    if problems:
        raise FileError("\n".join(problems))


def _problem(name: str, overwrite: bool, inputs: Inputs) -> str:
    """Return why a target can't be written, or nothing if it can."""
    if not name.strip():
        return "is no file name; give one"
    folder = os.path.dirname(os.path.realpath(name))
    named = plain(folder if os.path.islink(name) else os.path.dirname(name) or ".")
    try:
        around, found = _status(folder), _status(name)
        if found is not None and stat.S_ISDIR(found.st_mode):
            return "is a folder; give a file name"
        if around is None or not stat.S_ISDIR(around.st_mode):
            return f"the folder {named} is not there (make it first)"
    except OSError as error:
        return f"can't be reached ({error.strerror})"
    if name.endswith(("/", os.sep)):
        return "is the name of a folder; give a file name"
    if found is not None:
        if not stat.S_ISREG(found.st_mode):
            return "is not an ordinary file; give a file name"
        for kind, source in inputs.items():
            if source is not None and _same(name, source):
                return f"is the {kind} itself; give another name"
        if not overwrite:
            return "exists (give another name, or --overwrite to replace it)"
    return "" if os.access(folder, os.W_OK) else f"the folder {named} can't be written to"


def _status(name: str) -> os.stat_result | None:
    """Return the status of what a name leads to, or None if nothing is there yet; a link may point to nothing."""
    try:
        return os.stat(name)
    except (FileNotFoundError, NotADirectoryError):
        return None


def _same(name: str, source: str | Path) -> bool:
    try:
        return os.path.samefile(name, source)
    except OSError:
        return False


def write_files(contents: Sequence[tuple[str | Path, str]], *, overwrite: bool, inputs: Inputs | None = None) -> None:
    """Write all the texts as UTF-8, or none of them.

    Raises
    ------
    FileError
        If a target can't be written, as `check_targets`; then nothing was.
    """
    check_targets([name for name, _ in contents], overwrite=overwrite, inputs=inputs)
    if not contents:
        return  # most runs write nothing

    import contextlib
    import tempfile

    aside: list[tuple[str, str]] = []
    name: str | Path = ""
    try:
        for name, text in contents:
            target = os.path.realpath(name)
            handle, temporary = tempfile.mkstemp(dir=os.path.dirname(target), prefix=".rfstage-")
            aside.append((temporary, target))
            with os.fdopen(handle, "w", encoding="utf-8", newline="\n") as file:
                file.write(text)
            os.chmod(temporary, 0o666 & ~_umask())
        while aside:
            name = aside[0][1]
            os.replace(*aside[0])
            aside.pop(0)
    except UnicodeEncodeError:
        raise FileError(f"{plain(name)}: could not be written (it names a file whose name is not in UTF-8)") from None
    except OSError as error:
        raise FileError(f"{plain(name)}: could not be written ({error.strerror})") from None
    finally:
        for temporary, _ in aside:
            with contextlib.suppress(OSError):
                os.unlink(temporary)


def _umask() -> int:
    mask = os.umask(0)
    os.umask(mask)
    return mask
