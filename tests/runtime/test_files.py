"""Files that appear whole or not at all."""

import hashlib

import pytest

from panelkit.errors import RunFolderError
from panelkit.runtime import hash_of_file, write_whole


def test_file_takes_its_name_at_the_end(tmp_path):
    path = tmp_path / "new" / "folder" / "table.csv"
    with write_whole(path) as file:
        file.write(b"a,b\n")
        assert not path.exists()
    assert path.read_bytes() == b"a,b\n"
    assert [p.name for p in path.parent.iterdir()] == ["table.csv"]


def write_and_fail(path, error):
    with write_whole(path) as file:
        file.write(b"half of it")
        raise error


@pytest.mark.parametrize("error", [ValueError, KeyboardInterrupt, MemoryError])
def test_nothing_is_left_behind_on_an_error(error, tmp_path):
    path = tmp_path / "table.csv"
    with pytest.raises(error):
        write_and_fail(path, error)
    assert list(tmp_path.iterdir()) == []


def test_old_file_survives_a_failed_write(tmp_path):
    path = tmp_path / "table.csv"
    path.write_bytes(b"old")
    with pytest.raises(ZeroDivisionError):
        write_and_fail(path, ZeroDivisionError)
    assert path.read_bytes() == b"old"
    with write_whole(path) as file:
        file.write(b"new")
    assert path.read_bytes() == b"new"
    assert len(list(tmp_path.iterdir())) == 1


def test_full_disk_is_an_error_of_the_run_folder(tmp_path):
    full = OSError(28, "No space left on device")
    with pytest.raises(RunFolderError) as caught:
        write_and_fail(tmp_path / "table.csv", full)
    assert caught.value.code == "cannot-write"
    assert "No space left" in caught.value.what
    assert list(tmp_path.iterdir()) == []


def test_name_that_is_a_folder_is_refused(tmp_path):
    (tmp_path / "taken").mkdir()
    with (
        pytest.raises(RunFolderError),
        write_whole(tmp_path / "taken") as file,
    ):
        file.write(b"x")
    assert [path.name for path in tmp_path.iterdir()] == ["taken"]


def test_hash_is_that_of_the_bytes(tmp_path):
    path = tmp_path / "data"
    path.write_bytes(b"abc")
    # FIPS 180-4, first example
    assert hash_of_file(path) == (
        "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad"
    )
    path.write_bytes(b"x" * 3_000_000)
    assert hash_of_file(path) == hashlib.sha256(b"x" * 3_000_000).hexdigest()
