"""Files are written whole or not at all, and never over what is there."""

from __future__ import annotations

from pathlib import Path

import pytest

from tcplan.errors import InternalError, OutputError
from tcplan.output import check_folder, write_files

TWO = {"a.txt": b"first", "b.txt": b"second"}


def content(folder: Path) -> dict[str, bytes]:
    return {path.name: path.read_bytes() for path in sorted(folder.iterdir()) if path.is_file()}


def test_all_files_are_written_and_nothing_else(tmp_path: Path) -> None:
    folder = tmp_path / "new" / "deep"
    assert write_files(folder, TWO) == (folder / "a.txt", folder / "b.txt")
    assert content(folder) == TWO


def test_an_existing_file_is_kept_and_the_other_is_not_written(tmp_path: Path) -> None:
    (tmp_path / "b.txt").write_bytes(b"mine")
    with pytest.raises(OutputError, match=r"b\.txt already there"):
        write_files(tmp_path, TWO)
    assert content(tmp_path) == {"b.txt": b"mine"}


def test_force_replaces(tmp_path: Path) -> None:
    (tmp_path / "b.txt").write_bytes(b"mine")
    write_files(tmp_path, TWO, force=True)
    assert content(tmp_path) == TWO


@pytest.mark.parametrize("force", [False, True])
def test_a_folder_of_the_same_name_is_in_the_way(tmp_path: Path, force: bool) -> None:
    (tmp_path / "b.txt").mkdir()
    with pytest.raises(OutputError, match="a folder by the name of"):
        write_files(tmp_path, TWO, force=force)
    assert content(tmp_path) == {}


def test_a_file_in_place_of_the_folder(tmp_path: Path) -> None:
    (tmp_path / "out").write_bytes(b"mine")
    with pytest.raises(OutputError, match="found a file"):
        check_folder(tmp_path / "out", TWO)
    assert content(tmp_path) == {"out": b"mine"}


def test_a_link_to_nothing_is_not_followed(tmp_path: Path) -> None:
    (tmp_path / "out").symlink_to(tmp_path / "absent")
    with pytest.raises(OutputError, match="a link to nothing"):
        write_files(tmp_path / "out", TWO)


@pytest.mark.parametrize("place", ["/proc/tcplan-out", "/dev/null/out", "x" * 300, "a\0b"])
def test_a_place_that_cannot_be_written(tmp_path: Path, monkeypatch: pytest.MonkeyPatch, place: str) -> None:
    monkeypatch.chdir(tmp_path)  # /proc takes no new entries, whoever asks
    with pytest.raises(OutputError, match="cannot be written"):
        write_files(Path(place), TWO)
    assert list(tmp_path.iterdir()) == []


@pytest.mark.parametrize("fault", [OSError(28, "No space left on device"), KeyboardInterrupt()])
@pytest.mark.parametrize("failing", [1, 2, 3, 4])
def test_a_fault_at_any_rename_leaves_the_folder_as_it_was(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, failing: int, fault: BaseException
) -> None:
    before = {"a.txt": b"old a", "b.txt": b"old b", "other.txt": b"other"}
    for name, text in before.items():
        (tmp_path / name).write_bytes(text)
    rename, calls = Path.rename, []

    def failing_rename(self: Path, target: Path) -> Path:
        calls.append(target)
        if len(calls) == failing:
            raise fault
        return rename(self, target)

    monkeypatch.setattr(Path, "rename", failing_rename)
    with pytest.raises(OutputError if isinstance(fault, OSError) else KeyboardInterrupt):
        write_files(tmp_path, TWO, force=True)
    assert content(tmp_path) == before


def test_a_fault_while_writing_leaves_no_folder(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def full(handle: int) -> None:
        raise OSError(28, "No space left on device")

    monkeypatch.setattr("os.fsync", full)
    with pytest.raises(OutputError, match="No space left"):
        write_files(tmp_path / "new", TWO)
    assert list(tmp_path.iterdir()) == []


@pytest.mark.parametrize("name", ["../a.txt", "sub/a.txt", "/a.txt"])
def test_only_plain_names(tmp_path: Path, name: str) -> None:
    with pytest.raises(InternalError):
        write_files(tmp_path, {name: b""})
    assert list(tmp_path.iterdir()) == []
