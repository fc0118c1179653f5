"""Files written whole or not at all, and never over an existing file unless that is asked for."""

from __future__ import annotations

import errno
import os
import secrets
from collections.abc import Callable, Collection, Iterable, Mapping
from functools import partial
from pathlib import Path

from tcplan.errors import InternalError, OutputError, Problem


def check_folder(folder: Path, names: Collection[str], *, force: bool = False) -> None:
    """Refuse a folder in which files of these names cannot or must not be written.

    Parameters
    ----------
    folder : Path
        It need not exist yet.
    names : collection of str
        Names of files in it.
    force : bool
        Whether files that exist may be replaced.

    Raises
    ------
    OutputError
        With every file that is in the way.
    """
    try:
        problems = _in_the_way(folder, names, force=force)
    except (OSError, ValueError) as fault:  # a name too long, or with a zero byte
        raise OutputError(_cannot_write(folder, fault)) from fault
    if problems:
        raise OutputError(problems)


def write_files(folder: Path, contents: Mapping[str, bytes], *, force: bool = False) -> tuple[Path, ...]:
    """Write all files, or none of them: each to a temporary file, then all renamed.

    Parameters
    ----------
    folder : Path
        Made when it does not exist.
    contents : mapping of name to bytes
        Plain names, no paths.
    force : bool
        Whether files that exist may be replaced.

    Returns
    -------
    tuple of Path
        What was written, in the order of ``contents``.

    Raises
    ------
    OutputError
        When a file is in the way or cannot be written; the folder is then as it was.
    """
    for name in contents:
        if Path(name).name != name:
            raise InternalError(f"{name!r} is not a plain file name")
    check_folder(folder, contents, force=force)
    work = _Work(folder)
    try:
        work.write(contents)
        work.put_in_place(contents, force=force)
    except BaseException as fault:
        work.undo()
        if isinstance(fault, (OSError, ValueError)):  # ValueError: a zero byte in the name
            raise OutputError(_cannot_write(folder, fault)) from fault
        raise
    work.finish()
    return tuple(folder / name for name in contents)


class _Work:
    """One set of files on its way into a folder, and how to take all of it back."""

    def __init__(self, folder: Path) -> None:
        self.folder = folder
        self.mark = f".tcplan-{secrets.token_hex(6)}-"
        self.made: list[Path] = []
        self.temporary: list[Path] = []
        self.placed: list[Path] = []
        self.kept: dict[Path, Path] = {}

    def write(self, contents: Mapping[str, bytes]) -> None:
        """Write every file under a temporary name."""
        for folder in reversed([self.folder, *self.folder.parents]):
            if not folder.exists():
                folder.mkdir()
                self.made.append(folder)
        for name, content in contents.items():
            path = self.folder / f"{self.mark}{name}"
            with path.open("xb") as stream:
                self.temporary.append(path)
                stream.write(content)
                stream.flush()
                os.fsync(stream.fileno())

    def put_in_place(self, names: Iterable[str], *, force: bool) -> None:
        """Give every file its name; what was there before is kept until all are in place."""
        for name in names:
            target = self.folder / name
            if target.is_symlink() or target.exists():
                if not force:
                    raise FileExistsError(errno.EEXIST, "a file of this name has appeared", str(target))
                kept = self.folder / f"{self.mark}kept-{name}"
                self.kept[target] = kept  # noted first: an interrupt can come between any two steps
                target.rename(kept)
            self.placed.append(target)
            (self.folder / f"{self.mark}{name}").rename(target)

    def undo(self) -> None:
        """Take everything back, as far as the file system lets us."""
        for path in (*self.placed, *self.temporary):
            _quietly(path.unlink)
        for target, kept in self.kept.items():
            _quietly(partial(kept.rename, target))
        for folder in reversed(self.made):
            _quietly(folder.rmdir)

    def finish(self) -> None:
        """Remove what was replaced."""
        for kept in self.kept.values():
            _quietly(kept.unlink)


def _quietly(action: Callable[[], object]) -> None:
    try:
        action()
    except OSError:
        return


def _in_the_way(folder: Path, names: Collection[str], *, force: bool) -> list[Problem]:
    if folder.exists() and not folder.is_dir():
        return [_not_a_folder(folder, "a file")]
    if folder.is_symlink() and not folder.exists():
        return [_not_a_folder(folder, "a link to nothing")]
    return [*_folders_in_the_way(folder, names), *_files_in_the_way(folder, () if force else names)]


def _folders_in_the_way(folder: Path, names: Collection[str]) -> list[Problem]:
    found = [name for name in names if (folder / name).is_dir()]
    if not found:
        return []
    return [
        Problem(
            where=str(folder),
            found=f"a folder by the name of {', '.join(found)}",
            expected="no folder of that name",
            todo="Write elsewhere.",
        )
    ]


def _files_in_the_way(folder: Path, names: Collection[str]) -> list[Problem]:
    paths = {name: folder / name for name in names}
    found = [
        name for name, path in paths.items() if (path.is_symlink() or path.exists()) and not path.is_dir()
    ]
    if not found:
        return []
    return [
        Problem(
            where=str(folder),
            found=f"{', '.join(found)} already there",
            expected="no file of these names",
            todo="Replace them with --force, or write elsewhere.",
        )
    ]


def _not_a_folder(folder: Path, found: str) -> Problem:
    return Problem(
        where=str(folder), found=found, expected="a folder, or nothing yet", todo="Write elsewhere."
    )


def _cannot_write(folder: Path, fault: OSError | ValueError) -> Problem:
    return Problem(
        where=str(folder),
        found=f"a folder that cannot be written ({getattr(fault, 'strerror', None) or fault})",
        expected="a folder in which files can be made",
        todo="Check its permissions and the space left, or write elsewhere.",
    )
