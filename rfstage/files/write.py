"""Write files whole or not at all: everything is checked and written aside before anything is moved.

An existing file is replaced only when that is asked for.
"""

from __future__ import annotations

import os
from collections.abc import Sequence
from typing import TYPE_CHECKING

from rfstage.errors import FileError

if TYPE_CHECKING:
    from pathlib import Path


def check_targets(names: Sequence[str | Path], *, overwrite: bool) -> None:
    """Refuse targets that can't be written, all in one go.

    Raises
    ------
    FileError
        With one line for each: no such folder, a folder by that name, an existing file, one name twice.
    """
    if not names:
        return  # most runs write nothing, and need no paths loaded

    from pathlib import Path

    paths = [Path(name) for name in names]
    problems = []
    for path in paths:
        if not path.parent.is_dir():
            problems.append(f"{path}: the folder {path.parent} is not there (make it first)")
        elif path.is_dir():
            problems.append(f"{path}: is a folder; give a file name")
        elif path.exists() and not overwrite:
            problems.append(f"{path}: exists (give another name, or --overwrite to replace it)")
        elif not os.access(path.parent, os.W_OK):
            problems.append(f"{path}: the folder {path.parent} can't be written to")
    if len({path.absolute() for path in paths}) < len(paths):
        problems.append("two outputs have the same file name; give each its own")
    if problems:
        raise FileError("\n".join(problems))


def write_files(contents: Sequence[tuple[str | Path, str]], *, overwrite: bool) -> None:
    """Write all the texts as UTF-8, or none of them.

    Raises
    ------
    FileError
        If a target can't be written; then nothing was.
    """
    check_targets([name for name, _ in contents], overwrite=overwrite)
    if not contents:
        return

    import tempfile
    from pathlib import Path

    aside: list[tuple[str, Path]] = []
    try:
        for target, text in contents:
            path = Path(target)
            handle, name = tempfile.mkstemp(dir=path.parent, prefix=f".{path.name}.")
            aside.append((name, path))
            with os.fdopen(handle, "w", encoding="utf-8", newline="\n") as file:
                file.write(text)
            Path(name).chmod(0o666 & ~_umask())
        while aside:
            name, path = aside[0]
            Path(name).replace(path)
            aside.pop(0)
    except OSError as error:
        raise FileError(f"{error.filename or 'output'}: could not be written ({error.strerror})") from None
    finally:
        for name, _ in aside:
            Path(name).unlink(missing_ok=True)


def _umask() -> int:
    mask = os.umask(0)
    os.umask(mask)
    return mask
