"""The result folder: replaced whole or left alone.

Authority: the contract in the function's docstring, and `sha256sum -c` for the format of the list.
"""

from __future__ import annotations

import contextlib
import errno
import os
import shutil
import subprocess
import threading
from pathlib import Path

import pytest

from planar.errors import HandoffError
from planar.handoff.pack import MANIFEST, packed, read_manifest


def fill(destination: Path, files: dict[str, str]) -> None:
    with packed(destination) as folder:
        for name, text in files.items():
            (folder / name).parent.mkdir(parents=True, exist_ok=True)
            (folder / name).write_text(text, encoding="utf-8")


def content(folder: Path) -> dict[str, str]:
    return {
        path.relative_to(folder).as_posix(): path.read_text(encoding="utf-8")
        for path in folder.rglob("*")
        if path.is_file() and path.name != MANIFEST
    }


def test_written_with_its_list(tmp_path: Path) -> None:
    fill(tmp_path / "pack", {"b.txt": "b", "layout/a.txt": "a"})
    assert content(tmp_path / "pack") == {"b.txt": "b", "layout/a.txt": "a"}
    assert list(read_manifest(tmp_path / "pack")) == ["b.txt", "layout/a.txt"]
    assert os.listdir(tmp_path) == ["pack"]


@pytest.mark.skipif(shutil.which("sha256sum") is None, reason="needs sha256sum")
def test_list_is_what_sha256sum_reads(tmp_path: Path) -> None:
    fill(tmp_path / "pack", {"b.txt": "b", "layout/Ä file.txt": "a"})
    check = subprocess.run(["sha256sum", "-c", MANIFEST], cwd=tmp_path / "pack", capture_output=True, check=False)
    assert check.returncode == 0
    (tmp_path / "pack" / "b.txt").write_text("c", encoding="utf-8")
    check = subprocess.run(["sha256sum", "-c", MANIFEST], cwd=tmp_path / "pack", capture_output=True, check=False)
    assert check.returncode == 1


def test_replaced_whole_without_stale_files(tmp_path: Path) -> None:
    fill(tmp_path / "pack", {"old.txt": "1", "both.txt": "1", "gone/x.txt": "1"})
    fill(tmp_path / "pack", {"both.txt": "2", "new.txt": "2"})
    assert content(tmp_path / "pack") == {"both.txt": "2", "new.txt": "2"}
    assert not (tmp_path / "pack" / "gone").exists()
    assert os.listdir(tmp_path) == ["pack"]


def test_old_result_stands_until_the_new_one_is_complete(tmp_path: Path) -> None:
    fill(tmp_path / "pack", {"a.txt": "1"})
    with packed(tmp_path / "pack") as folder:
        (folder / "a.txt").write_text("2", encoding="utf-8")
        assert content(tmp_path / "pack") == {"a.txt": "1"}
        assert folder.parent.parent == tmp_path  # beside the destination, on the same file system
    assert content(tmp_path / "pack") == {"a.txt": "2"}


@pytest.mark.parametrize("error", [ValueError("no"), KeyboardInterrupt()])
@pytest.mark.parametrize("earlier", [{}, {"a.txt": "1"}])
def test_nothing_left_after_an_exception(tmp_path: Path, error: BaseException, earlier: dict[str, str]) -> None:
    if earlier:
        fill(tmp_path / "deep" / "pack", earlier)

    def stopped() -> None:
        with packed(tmp_path / "deep" / "pack") as folder:
            (folder / "a.txt").write_text("2", encoding="utf-8")
            raise error

    with pytest.raises(type(error)):
        stopped()
    if earlier:
        assert content(tmp_path / "deep" / "pack") == earlier
        assert os.listdir(tmp_path / "deep") == ["pack"]
    else:
        assert os.listdir(tmp_path) == []


def test_empty_folder_is_taken(tmp_path: Path) -> None:
    (tmp_path / "pack").mkdir()
    fill(tmp_path / "pack", {"a.txt": "1"})
    assert content(tmp_path / "pack") == {"a.txt": "1"}


def refused(destination: Path, match: str) -> None:
    before = sorted(destination.parent.rglob("*"))
    with pytest.raises(HandoffError, match=match), packed(destination):
        pytest.fail("the block must not start")
    assert sorted(destination.parent.rglob("*")) == before


def test_folder_of_the_user_is_refused(tmp_path: Path) -> None:
    (tmp_path / "pack").mkdir()
    (tmp_path / "pack" / "thesis.txt").write_text("mine", encoding="utf-8")
    refused(tmp_path / "pack", "no SHA256SUMS")


def test_foreign_file_is_refused(tmp_path: Path) -> None:
    fill(tmp_path / "pack", {"a.txt": "1"})
    (tmp_path / "pack" / "layout").mkdir()
    (tmp_path / "pack" / "layout" / "measured.s1p").write_text("mine", encoding="utf-8")
    refused(tmp_path / "pack", r"layout/measured\.s1p")


def test_file_changed_by_the_user_is_refused(tmp_path: Path) -> None:
    fill(tmp_path / "pack", {"a.txt": "1", "b.txt": "1"})
    (tmp_path / "pack" / "a.txt").write_text("edited", encoding="utf-8")
    refused(tmp_path / "pack", r"changed since it was written: a\.txt;")


def test_list_that_is_none_is_refused(tmp_path: Path) -> None:
    (tmp_path / "pack").mkdir()
    (tmp_path / "pack" / MANIFEST).write_text("not a list\n", encoding="utf-8")
    refused(tmp_path / "pack", "SHA256SUMS")


def test_symlink_and_file_in_the_way_are_refused(tmp_path: Path) -> None:
    fill(tmp_path / "real", {"a.txt": "1"})
    (tmp_path / "link").symlink_to(tmp_path / "real")
    (tmp_path / "dangling").symlink_to(tmp_path / "nowhere")
    (tmp_path / "file").write_text("mine", encoding="utf-8")
    for name in ("link", "dangling", "file"):
        refused(tmp_path / name, "is no folder")


def test_symlink_inside_is_not_ours(tmp_path: Path) -> None:
    fill(tmp_path / "pack", {"a.txt": "1"})
    (tmp_path / "elsewhere.txt").write_text("1", encoding="utf-8")
    (tmp_path / "pack" / "a.txt").unlink()
    (tmp_path / "pack" / "a.txt").symlink_to(tmp_path / "elsewhere.txt")
    refused(tmp_path / "pack", r"a\.txt")


def test_file_added_while_writing_is_kept(tmp_path: Path) -> None:
    fill(tmp_path / "pack", {"a.txt": "1"})

    def interfered() -> None:
        with packed(tmp_path / "pack") as folder:
            (folder / "a.txt").write_text("2", encoding="utf-8")
            (tmp_path / "pack" / "mine.txt").write_text("mine", encoding="utf-8")

    with pytest.raises(HandoffError, match=r"mine\.txt"):
        interfered()
    assert content(tmp_path / "pack") == {"a.txt": "1", "mine.txt": "mine"}
    assert os.listdir(tmp_path) == ["pack"]


def test_old_result_comes_back_when_the_rename_fails(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    fill(tmp_path / "pack", {"a.txt": "1"})
    rename = Path.rename

    def failing(self: Path, target: Path) -> Path:
        if self.name == "new":
            raise OSError(errno.EACCES, "Permission denied")
        return rename(self, target)

    monkeypatch.setattr(Path, "rename", failing)
    with pytest.raises(HandoffError, match="Permission denied"):
        fill(tmp_path / "pack", {"a.txt": "2"})
    assert content(tmp_path / "pack") == {"a.txt": "1"}
    assert os.listdir(tmp_path) == ["pack"]


def test_old_result_is_kept_aside_when_it_cannot_come_back(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    fill(tmp_path / "pack", {"a.txt": "1"})
    rename = Path.rename

    def failing(self: Path, target: Path) -> Path:
        if self.name in ("new", "old"):
            raise OSError(errno.EIO, "Input/output error")
        return rename(self, target)

    monkeypatch.setattr(Path, "rename", failing)
    with pytest.raises(HandoffError, match="Input/output error"):
        fill(tmp_path / "pack", {"a.txt": "2"})
    (aside,) = tmp_path.iterdir()
    assert content(aside / "old") == {"a.txt": "1"}


def test_full_disk_is_said(tmp_path: Path) -> None:
    def full() -> None:
        with packed(tmp_path / "pack") as folder:
            raise OSError(errno.ENOSPC, os.strerror(errno.ENOSPC), str(folder / "board.dxf"))

    with pytest.raises(HandoffError, match="No space left on device"):
        full()
    assert os.listdir(tmp_path) == []


def test_parent_that_is_a_file(tmp_path: Path) -> None:
    (tmp_path / "file").write_text("mine", encoding="utf-8")
    with pytest.raises(HandoffError, match="cannot write into"), packed(tmp_path / "file" / "pack"):
        pytest.fail("the block must not start")


@pytest.mark.skipif(os.geteuid() == 0, reason="root may write everywhere")
def test_parent_that_may_not_be_written(tmp_path: Path) -> None:
    (tmp_path / "shut").mkdir(mode=0o555)
    with pytest.raises(HandoffError, match="Permission denied"), packed(tmp_path / "shut" / "pack"):
        pytest.fail("the block must not start")


def test_permissions_follow_the_umask(tmp_path: Path) -> None:
    (tmp_path / "plain").mkdir()
    fill(tmp_path / "pack", {"a.txt": "1"})
    assert (tmp_path / "pack").stat().st_mode == (tmp_path / "plain").stat().st_mode


def test_two_at_once_leave_one_whole_result(tmp_path: Path) -> None:
    ready = threading.Barrier(2)

    def write(text: str) -> None:
        # the later one may be turned away, or replace the earlier; a mixture is what must not be
        with contextlib.suppress(HandoffError), packed(tmp_path / "pack") as folder:
            for i in range(20):
                (folder / f"{i}.txt").write_text(text, encoding="utf-8")
            ready.wait(timeout=10.0)

    threads = [threading.Thread(target=write, args=(text,)) for text in ("one", "two")]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()
    texts = set(content(tmp_path / "pack").values())
    assert len(texts) == 1
    assert len(content(tmp_path / "pack")) == 20
