"""Issue 4, item 1: the store is bounded, and whole whatever runs at once, is killed, or fills the disk."""

from __future__ import annotations

import errno
import multiprocessing
import os
import random
import signal
import subprocess
import sys
import threading
from hashlib import sha256
from pathlib import Path

import pytest
from helpers.command import environment

from moldgen.errors import SpecError
from moldgen.flow import store as module
from moldgen.flow.store import BETWEEN_LOOKS, MOST_NOTES, Store, open_store

SMALL = 2**20


def key(name: object) -> str:
    return sha256(str(name).encode()).hexdigest()


def content(name: object, size: int = 1000) -> bytes:
    """Bytes that belong to a name and to no other, so that a wrong answer is seen."""
    block = sha256(f"content of {name}".encode()).digest()
    return (block * (size // len(block) + 1))[:size]


@pytest.fixture
def store(tmp_path: Path) -> Store:
    return open_store({"MOLDGEN_CACHE": str(tmp_path / "cache")})


def files(store: Store) -> list[Path]:
    assert store.folder is not None
    return sorted(p for p in store.folder.rglob("*") if p.is_file())


def test_what_was_kept_is_recalled_by_a_later_run_and_nothing_else(store: Store) -> None:
    assert store.recall(key("pins")) is None
    store.keep(key("pins"), content("pins"))
    store.keep(key("empty"), b"")
    later = Store(store.folder, SMALL)
    assert later.recall(key("pins")) == content("pins")
    assert later.recall(key("empty")) == b""
    assert later.recall(key("gate")) is None
    later.keep(key("pins"), content("longer pins", 3000))
    assert store.recall(key("pins")) == content("longer pins", 3000)
    assert (store.summary().entries, store.summary().size_bytes) == (2, 2 * 4096)


def test_a_key_that_is_no_hash_is_our_mistake(store: Store) -> None:
    for wrong in ("pins", "../" + "a" * 61, key("pins").upper()):
        with pytest.raises(ValueError, match="SHA-256"):
            store.keep(wrong, b"")


def test_it_is_for_its_owner_alone(store: Store) -> None:
    store.keep(key("pins"), content("pins"))
    assert store.folder is not None
    assert {p.stat().st_mode & 0o077 for p in (store.folder, *store.folder.rglob("*"))} == {0}


def _cut(path: Path) -> None:
    path.write_bytes(path.read_bytes()[:-1])


def _head_only(path: Path) -> None:
    path.write_bytes(path.read_bytes()[:20])


def _empty(path: Path) -> None:
    path.write_bytes(b"")


def _one_bit(path: Path) -> None:
    data = bytearray(path.read_bytes())
    data[-500] ^= 1
    path.write_bytes(data)


def _longer(path: Path) -> None:
    path.write_bytes(path.read_bytes() + b"\0")


def _foreign(path: Path) -> None:
    path.write_bytes(b"\x80\x05cposix\nsystem\n" + b"x" * 2000)


def _of_another_key(path: Path) -> None:
    other = Store(path.parents[2], SMALL)
    other.keep(key("gate"), content("gate"))
    (path.parents[1] / key("gate")[:2] / key("gate")).replace(path)


def _writable_by_others(path: Path) -> None:
    path.chmod(0o622)


@pytest.mark.parametrize(
    "harm", [_cut, _head_only, _empty, _one_bit, _longer, _foreign, _of_another_key, _writable_by_others]
)
def test_a_file_that_is_not_what_was_kept_is_dropped(harm: object, store: Store) -> None:
    store.keep(key("pins"), content("pins"))
    (path,) = files(store)
    harm(path)  # type: ignore[operator]
    assert store.recall(key("pins")) is None
    assert not path.exists()
    store.keep(key("pins"), content("pins"))
    assert store.recall(key("pins")) == content("pins")


@pytest.mark.skipif(os.geteuid() != 0, reason="only root can give files away")
def test_a_file_of_another_user_is_dropped(store: Store) -> None:
    store.keep(key("pins"), content("pins"))
    (path,) = files(store)
    os.chown(path, 12345, -1)
    assert store.recall(key("pins")) is None
    assert not path.exists()


def test_a_link_is_not_followed(store: Store, tmp_path: Path) -> None:
    store.keep(key("pins"), content("pins"))
    (path,) = files(store)
    path.rename(tmp_path / "elsewhere")
    path.symlink_to(tmp_path / "elsewhere")
    assert store.recall(key("pins")) is None


def test_the_longest_unused_goes_first(store: Store) -> None:
    store = Store(store.folder, SMALL)
    for number in range(18):
        store.keep(key(number), content(number, 50_000))
        path = next(p for p in files(store) if p.name == key(number))
        os.utime(path, (1000 + number, 1000 + number))
    assert store.recall(key(0)) == content(0, 50_000)  # used: it is the newest now
    store.keep(key("last"), content("last", 100_000))
    held = [n for n in range(18) if Store(store.folder, SMALL).recall(key(n)) is not None]
    gone = 18 - len(held)
    assert held == [0, *range(1 + gone, 18)]
    assert 0 < gone < 5
    assert store.recall(key("last")) is not None
    assert store.summary().size_bytes <= SMALL


def test_what_is_larger_than_the_whole_store_is_not_kept(store: Store) -> None:
    store = Store(store.folder, SMALL)
    store.keep(key("pins"), content("pins"))
    store.keep(key("huge"), bytes(SMALL))
    assert store.recall(key("huge")) is None
    assert store.recall(key("pins")) is not None


def test_what_other_runs_add_is_seen(store: Store) -> None:
    runs = [Store(store.folder, SMALL) for _ in range(3)]
    for number in range(120):
        runs[number % 3].keep(key(number), content(number, 20_000))
        assert store.summary().size_bytes <= SMALL * (1 + 3 * BETWEEN_LOOKS)


def test_notes_are_kept_by_name_and_the_oldest_of_many_go(store: Store, monkeypatch: pytest.MonkeyPatch) -> None:
    store.note("out/lid", "naïve")
    assert (store.noted("out/lid"), store.noted("out/cup")) == ("naïve", None)
    store.note("out/lid", "again")
    assert Store(store.folder, SMALL).noted("out/lid") == "again"
    assert MOST_NOTES > 3
    monkeypatch.setattr(module, "MOST_NOTES", 3)
    for number in range(5):
        store.note(str(number), "")
        os.utime(store.folder / "notes" / key(number), (1e9 + number, 1e9 + number))  # type: ignore[operator]
    assert store.summary().notes == 3
    assert store.noted("4") == ""
    assert store.noted("1") is None


def test_clearing_leaves_nothing(store: Store) -> None:
    store.keep(key("pins"), content("pins"))
    store.note("out/lid", "text")
    store.clear()
    assert files(store) == []
    assert store.recall(key("pins")) is None
    store.keep(key("pins"), content("pins"))
    assert store.recall(key("pins")) == content("pins")


def test_a_full_disk_fails_nothing_leaves_nothing_and_is_told_once(
    store: Store, monkeypatch: pytest.MonkeyPatch
) -> None:
    store.keep(key("pins"), content("pins"))
    before = files(store)
    assert store.findings() == ()
    fdopen = os.fdopen

    def full(handle: int, mode: str) -> object:
        stream = fdopen(handle, mode)
        if mode == "wb":
            stream.write(b"half")
            stream.close()
            raise OSError(errno.ENOSPC, os.strerror(errno.ENOSPC))
        return stream

    monkeypatch.setattr(module.os, "fdopen", full)
    store.keep(key("gate"), content("gate"))
    store.keep(key("lines"), content("lines"))
    store.note("out/lid", "text")
    monkeypatch.undo()
    assert files(store) == before
    (finding,) = store.findings()
    assert finding.code == "cache.not_kept"
    assert "No space left" in finding.message
    assert store.recall(key("pins")) == content("pins")


def test_a_really_full_disk(tmp_path: Path) -> None:
    """A limit on the size of files stands in for a small disk: the kernel cuts the write short, as a full one does."""
    code = (
        "import resource, signal, sys; from moldgen.flow.store import open_store\n"
        "signal.signal(signal.SIGXFSZ, signal.SIG_IGN); resource.setrlimit(resource.RLIMIT_FSIZE, (5000, 5000))\n"
        "store = open_store(); store.keep('a' * 64, bytes(1000)); store.keep('b' * 64, bytes(100_000))\n"
        "print(len(store.recall('a' * 64)), store.recall('b' * 64), store.findings()[0].code)\n"
    )
    settings = environment() | {"MOLDGEN_CACHE": str(tmp_path)}
    done = subprocess.run([sys.executable, "-c", code], env=settings, capture_output=True, text=True, check=True)
    assert done.stdout == "1000 None cache.not_kept\n"
    assert [p.name for p in tmp_path.rglob("*") if p.is_file()] == ["a" * 64]


@pytest.mark.parametrize("place", ["/dev/null/cache", "/proc/cache", "x" * 300, "nul\0l", "~nobody-at-all/cache"])
def test_a_place_that_cannot_be_used_is_told_and_forgets(place: str) -> None:
    store = open_store({"MOLDGEN_CACHE": place})
    store.keep(key("pins"), content("pins"))
    store.note("out/lid", "text")
    assert (store.recall(key("pins")), store.noted("out/lid"), store.summary().entries) == (None, None, 0)
    (finding,) = store.findings()
    assert finding.code == "cache.unusable"
    assert "cannot be used" in finding.message


def test_a_folder_that_others_can_write_is_not_trusted(tmp_path: Path) -> None:
    tmp_path.chmod(0o777)
    store = open_store({"MOLDGEN_CACHE": str(tmp_path)})
    assert store.folder is None
    assert "written by others" in store.findings()[0].message


def test_off_is_what_the_user_wants(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(tmp_path)
    store = open_store({"MOLDGEN_CACHE": "off"})
    store.keep(key("pins"), content("pins"))
    assert (store.recall(key("pins")), store.findings(), store.why_not) == (None, (), "MOLDGEN_CACHE=off")
    assert list(tmp_path.iterdir()) == []


def test_its_default_place(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("HOME", str(tmp_path))
    assert open_store({}).folder == tmp_path / ".cache" / "moldgen"
    assert open_store({"XDG_CACHE_HOME": str(tmp_path / "xdg")}).folder == tmp_path / "xdg" / "moldgen"
    assert open_store({"XDG_CACHE_HOME": "relative"}).folder == tmp_path / ".cache" / "moldgen"


def test_its_limit(tmp_path: Path) -> None:
    place = {"MOLDGEN_CACHE": str(tmp_path / "cache")}
    assert open_store(place).limit_bytes == 2 * 2**30
    assert open_store(place | {"MOLDGEN_CACHE_SIZE": "0.5"}).limit_bytes == 2**29
    for wrong in ("big", "nan", "inf", "0", "-1", "1e9"):
        with pytest.raises(SpecError, match="no size of a cache"):
            open_store(place | {"MOLDGEN_CACHE_SIZE": wrong})


def test_what_a_dead_run_left_goes_and_what_a_living_one_writes_stays(store: Store) -> None:
    dead = subprocess.Popen([sys.executable, "-c", ""])
    dead.wait()
    assert store.folder is not None
    (store.folder / "aside").mkdir()
    for name in (f"{dead.pid}-x", f"{os.getppid()}-x", f"{os.getpid()}-x", "other"):
        (store.folder / "aside" / name).touch()
    store.keep(key("pins"), content("pins"))
    assert {p.name for p in (store.folder / "aside").iterdir()} == {f"{os.getppid()}-x", f"{os.getpid()}-x"}


def _hammer(folder: Path, seed: int, wrong: multiprocessing.Queue[str]) -> None:
    """Keep and recall at random in a small store, and tell every answer that is not what was kept."""
    chance, store = random.Random(seed), Store(folder, SMALL)
    for _ in range(800):
        name = chance.randrange(80)
        found = store.recall(key(name))
        if found not in (None, content(name, 10_000 + 500 * name)):
            wrong.put(f"{name}")
        if found is None or chance.random() < 0.3:
            store.keep(key(name), content(name, 10_000 + 500 * name))
    for finding in store.findings():
        wrong.put(finding.message)
    wrong.put("done")


def test_many_runs_at_once_never_get_wrong_bytes(store: Store) -> None:
    spawn = multiprocessing.get_context("fork")
    wrong: multiprocessing.Queue[str] = spawn.Queue()
    runs = [spawn.Process(target=_hammer, args=(store.folder, seed, wrong)) for seed in (1, 2)]
    for run in runs:
        run.start()
    assert [wrong.get(timeout=60), wrong.get(timeout=60)] == ["done", "done"]
    for run in runs:
        run.join()
    summary = store.summary()
    assert 10 < summary.entries < 80  # more than the limit holds was kept
    assert summary.size_bytes <= SMALL * (1 + 2 * BETWEEN_LOOKS)
    assert not list((store.folder / "aside").iterdir())  # type: ignore[operator]


def test_threads_of_one_run_do_not_meet(store: Store) -> None:
    def work(start: int) -> None:
        for number in range(start, start + 50):
            store.keep(key(number), content(number))

    threads = [threading.Thread(target=work, args=(25 * n,)) for n in range(4)]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()
    assert [n for n in range(125) if store.recall(key(n)) != content(n)] == []
    assert store.findings() == ()


FORKS = """
import os, signal, sys, time; from pathlib import Path; from test_store import Store, SMALL, content, key
for line in sys.stdin:
    child = os.fork()
    if child == 0:
        store, number = Store(Path(sys.argv[1]), SMALL), 0
        while True:
            store.keep(key(number % 60), content(number % 60, 30_000))
            number += 1
    time.sleep(float(line))
    os.kill(child, signal.SIGKILL)
    print(os.waitstatus_to_exitcode(os.waitpid(child, 0)[1]), flush=True)
"""


def test_a_run_that_is_killed_leaves_whole_entries_only(store: Store) -> None:
    chance = random.Random(4)
    settings = environment()
    settings["PYTHONPATH"] += os.pathsep + str(Path(__file__).parent)
    zygote = [sys.executable, "-c", FORKS, str(store.folder)]
    with subprocess.Popen(zygote, env=settings, stdin=subprocess.PIPE, stdout=subprocess.PIPE, text=True) as server:
        assert server.stdin is not None
        assert server.stdout is not None
        asides = []
        for _ in range(30):
            server.stdin.write(f"{chance.uniform(0.0, 0.03)}\n")
            server.stdin.flush()
            assert server.stdout.readline() == f"{-signal.SIGKILL}\n"
            asides += (store.folder / "aside").glob("*")  # type: ignore[operator]
            fresh = Store(store.folder, SMALL)
            found = {n: fresh.recall(key(n)) for n in range(60)}
            assert [n for n, data in found.items() if data not in (None, content(n, 30_000))] == []
        server.stdin.close()
    assert asides, "no writer was killed in the middle of a file: the test shows nothing"
    Store(store.folder, SMALL).keep(key(0), content(0, 30_000))
    assert not list((store.folder / "aside").iterdir())  # type: ignore[operator]
    assert store.summary().entries > 10
    assert store.summary().size_bytes <= SMALL * (1 + BETWEEN_LOOKS)
