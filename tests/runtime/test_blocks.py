"""Blocks of work: remembered by what went into them, in order, whole or not at all."""

import gc
import threading
import time
import warnings
from pathlib import Path

import numpy as np
import pytest

from panelkit.errors import RunFolderError
from panelkit.runtime import FolderStore, MemoryStore, StageKey, map_blocks

KEY = StageKey("square", "inputs of the first kind")
BLOCKS = {f"block {i}": i for i in range(6)}


class Counted:
    """Squares a number and remembers what it was asked."""

    def __init__(self, fail_at=()):
        self.calls = []
        self.fail_at = fail_at

    def __call__(self, number):
        self.calls.append(number)
        if number in self.fail_at:
            raise ValueError(f"no square of {number}")
        return {
            "square": np.array([number**2]),
            "name": np.array(["nought", "one", "two"])[number % 3 : number % 3 + 1],
        }


@pytest.fixture(params=["memory", "folder"])
def store(request, tmp_path):
    return MemoryStore() if request.param == "memory" else FolderStore(tmp_path / "run")


def squares(results):
    return {name: int(result["square"][0]) for name, result in results.items()}


def test_a_finished_block_is_never_computed_again(store):
    task = Counted()
    first = map_blocks(task, BLOCKS, KEY, store)
    second = map_blocks(task, BLOCKS, KEY, store)
    assert task.calls == [0, 1, 2, 3, 4, 5]
    for name in BLOCKS:
        for array in ("square", "name"):
            assert first[name][array].tobytes() == second[name][array].tobytes()
            assert first[name][array].dtype == second[name][array].dtype


@pytest.mark.parametrize(
    "key",
    [
        StageKey("square", "inputs of the second kind"),
        StageKey("cube", "inputs of the first kind"),
    ],
)
def test_other_inputs_or_another_stage_are_computed(key, store):
    task = Counted()
    map_blocks(task, BLOCKS, KEY, store)
    map_blocks(task, BLOCKS, key, store)
    assert task.calls == 2 * [0, 1, 2, 3, 4, 5]


def test_only_what_is_missing_is_computed(store):
    task = Counted()
    map_blocks(task, {"block 3": 3, "block 1": 1}, KEY, store)
    task.calls.clear()
    results = map_blocks(task, BLOCKS, KEY, store)
    assert task.calls == [0, 2, 4, 5]
    assert squares(results) == {name: i * i for name, i in BLOCKS.items()}


def test_keys_of_blocks_differ_and_stay(store):
    keys = [KEY.block(name) for name in BLOCKS]
    assert len(set(keys)) == 6
    # pinned: a silent change would orphan every finished block of a run folder
    assert KEY.block("block 0") == "square-a9c1f53bc43d7c45cf80e73b"
    # names that run together must not
    assert StageKey("a", "b c").block("d") != StageKey("a", "c").block("d b")


@pytest.mark.parametrize("threads", [1, 2, 4])
def test_results_come_in_the_order_of_the_blocks(threads, store):
    backwards = dict(reversed(BLOCKS.items()))
    map_blocks(Counted(), {"block 2": 2}, KEY, store)
    results = map_blocks(Counted(), backwards, KEY, store, threads=threads)
    assert list(results) == list(backwards)


def test_threads_do_not_change_results(tmp_path):
    def task(seed):
        values = np.random.default_rng(seed).normal(size=(40, 40))
        return {"product": values @ values.T}

    blocks = {str(seed): seed for seed in range(8)}
    one = map_blocks(task, blocks, KEY, MemoryStore())
    two = map_blocks(task, blocks, KEY, MemoryStore(), threads=3)
    kept = FolderStore(tmp_path)
    map_blocks(task, blocks, KEY, kept, threads=2)
    again = map_blocks(task, blocks, KEY, kept)
    for name in blocks:
        bits = one[name]["product"].tobytes()
        assert two[name]["product"].tobytes() == bits
        assert again[name]["product"].tobytes() == bits


def test_blocks_run_at_the_same_time():
    # two tasks that wait for each other end only if both run at once
    meeting = threading.Barrier(2, timeout=30)

    def task(number):
        meeting.wait()
        return {"number": np.array(number)}

    assert len(map_blocks(task, {"a": 1, "b": 2}, KEY, MemoryStore(), threads=2)) == 2


@pytest.mark.parametrize("threads", [1, 2])
def test_first_failure_is_passed_on_and_finished_work_is_kept(threads, store):
    task = Counted(fail_at={3})
    with pytest.raises(ValueError, match="no square of 3"):
        map_blocks(task, BLOCKS, KEY, store, threads=threads)
    done = set(task.calls) - {3}
    assert done >= {0, 1, 2}
    task.fail_at = ()
    task.calls.clear()
    results = map_blocks(task, BLOCKS, KEY, store, threads=threads)
    assert sorted(task.calls) == sorted(set(range(6)) - done)
    assert squares(results) == {name: i * i for name, i in BLOCKS.items()}


def test_nothing_more_is_started_after_a_failure():
    begun = threading.Event()
    calls = []

    def task(number):
        calls.append(number)
        if number == 0:
            begun.wait(30)
            raise ValueError("stop")
        if number == 1:
            begun.set()
        time.sleep(0.002)  # lets the failing thread run
        return {}

    blocks = {str(i): i for i in range(2000)}
    with pytest.raises(ValueError, match="stop"):
        map_blocks(task, blocks, KEY, MemoryStore(), threads=2)
    assert len(calls) < 2000


def test_every_block_is_told_with_where_it_came_from():
    told = []
    store = MemoryStore()
    map_blocks(Counted(), {"block 4": 4}, KEY, store)
    map_blocks(Counted(), BLOCKS, KEY, store, listener=told.append)
    assert [event.done for event in told] == [1, 2, 3, 4, 5, 6]
    assert {event.total for event in told} == {6}
    assert [event.remembered for event in told] == [True] + 5 * [False]
    assert {event.stage for event in told} == {"square"}


def test_no_blocks_are_no_results(store):
    assert map_blocks(Counted(), {}, KEY, store) == {}


# files


def test_folder_holds_one_file_a_block_and_nothing_else(tmp_path):
    map_blocks(Counted(), BLOCKS, KEY, FolderStore(tmp_path / "deep" / "run"))
    names = {path.name for path in (tmp_path / "deep" / "run").iterdir()}
    assert names == {f"{KEY.block(name)}.npz" for name in BLOCKS}


def block_file(folder):
    return folder / f"{KEY.block('block 2')}.npz"


@pytest.mark.filterwarnings("ignore::pytest.PytestUnraisableExceptionWarning")
@pytest.mark.parametrize(
    "damage",
    [
        lambda whole: b"",
        lambda whole: whole[: len(whole) // 2],
        lambda whole: whole[:-1],
        lambda whole: b"not an archive at all",
        lambda whole: bytes(len(whole)),
        lambda whole: whole.replace(b"\x93NUMPY", b"\x93NUMPX"),
        lambda whole: b"PK\x03\x04" + whole[::-1],
    ],
    ids=["empty", "half", "short", "text", "zeros", "magic", "backwards"],
)
def test_damaged_file_is_computed_again(damage, tmp_path):
    store = FolderStore(tmp_path)
    map_blocks(Counted(), BLOCKS, KEY, store)
    whole = block_file(tmp_path).read_bytes()
    block_file(tmp_path).write_bytes(damage(whole))
    task = Counted()
    results = map_blocks(task, BLOCKS, KEY, store)
    assert task.calls == [2]
    assert squares(results)["block 2"] == 4
    assert block_file(tmp_path).read_bytes() == whole


def test_damaged_file_is_closed(tmp_path):
    store = FolderStore(tmp_path)
    map_blocks(Counted(), BLOCKS, KEY, store)
    path = block_file(tmp_path)
    path.write_bytes(path.read_bytes()[:-1])
    with warnings.catch_warnings(record=True) as caught:
        warnings.simplefilter("always")
        assert store.load(KEY.block("block 2")) is None
        gc.collect()
    assert [str(one.message) for one in caught] == []


FLIPS = (0x01, 0x08, 0x80)


@pytest.mark.filterwarnings("ignore")
def test_no_flipped_bit_raises_or_passes_for_the_result(tmp_path):
    store = FolderStore(tmp_path)
    map_blocks(Counted(), {"block 2": 2}, KEY, store)
    whole = block_file(tmp_path).read_bytes()
    expected = {"square": b"4", "name": b"two"}
    raised, passed = [], []
    for at in range(len(whole)):
        for flip in FLIPS:
            spoilt = bytearray(whole)
            spoilt[at] ^= flip
            block_file(tmp_path).write_bytes(bytes(spoilt))
            try:
                found = store.load(KEY.block("block 2"))
            except Exception as error:  # noqa: BLE001 - what escapes is the question
                raised.append((at, flip, type(error).__name__))
                continue
            if found is not None and not (
                set(found) == set(expected)
                and found["square"].tolist() == [4]
                and found["name"].tolist() == ["two"]
            ):
                passed.append((at, flip, {k: v.tolist() for k, v in found.items()}))
    assert passed == []
    assert raised == []


def test_file_with_pickled_objects_is_not_read(tmp_path):
    path = block_file(tmp_path)
    np.savez(path, square=np.array([{"a": 1}], dtype=object))
    assert FolderStore(tmp_path).load(KEY.block("block 2")) is None


def test_objects_are_not_written(tmp_path):
    with pytest.raises(ValueError, match="allow_pickle"):
        FolderStore(tmp_path).save("key", {"a": np.array([{}], dtype=object)})
    assert list(tmp_path.iterdir()) == []


def test_any_name_serves_for_an_array(tmp_path):
    store = FolderStore(tmp_path)
    store.save("key", {"file": np.arange(3), "allow_pickle": np.arange(2)})
    assert set(store.load("key")) == {"file", "allow_pickle"}


def test_folder_that_cannot_be_written_is_named(tmp_path):
    blocker = tmp_path / "file"
    blocker.write_text("in the way")
    with pytest.raises(RunFolderError) as caught:
        map_blocks(Counted(), BLOCKS, KEY, FolderStore(blocker / "run"))
    assert caught.value.code == "cannot-write"
    assert caught.value.exit_code == 7
    assert Path(caught.value.where).is_relative_to(blocker)
