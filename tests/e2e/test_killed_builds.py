"""A build that is killed at any moment costs neither the previous output nor what the cache holds: issue 4."""

from __future__ import annotations

import os
import random
import re
import signal
import subprocess
import time
from pathlib import Path

import psutil
import pytest
from helpers.command import environment, moldgen_command
from helpers.outputs import manifest, snapshot
from helpers.small_specs import CUP, spec

from moldgen.canon import sha256_bytes
from moldgen.flow.store import Store, open_store
from tests.helpers.rebuilds import built, differing

pytestmark = pytest.mark.slow

SEED = 20261201

EVERY = 10
"""After so many killed builds one runs to its end and is held against a build without a cache."""

GONE_AFTER_S = 30
"""Processes of a killed run are gone after this, on a busy machine too."""


def variant(folder: Path, number: int) -> Path:
    """Write the spec of a cup whose post stands elsewhere: always of the same name, always a new part."""
    return spec(folder, CUP.replace("at: [8, 4]", f"at: [{8 - 0.01 * number:g}, 4]"), "pull: +z\n", name="cup")


def start(source: Path, cache: Path) -> subprocess.Popen[bytes]:
    """Start a build in a process group of its own."""
    return subprocess.Popen(
        moldgen_command("build", source.name, "--no-pictures", "--quiet"),
        cwd=source.parent,
        env=environment() | {"MOLDGEN_CACHE": str(cache)},
        stdout=subprocess.DEVNULL,
        stderr=subprocess.DEVNULL,
        start_new_session=True,
    )


def kill(process: subprocess.Popen[bytes], how: str) -> None:
    """Kill a run: the whole group at once, the parent alone, or as a user and a system stop it."""
    running = psutil.Process(process.pid) if process.poll() is None else None
    family = [] if running is None else [running, *running.children(recursive=True)]
    try:
        if how == "group":
            os.killpg(process.pid, signal.SIGKILL)
        elif how == "group, politely":
            os.killpg(process.pid, signal.SIGTERM)
        else:
            process.send_signal(signal.Signals[how])
    except ProcessLookupError:  # it had ended
        pass
    process.wait(timeout=GONE_AFTER_S)
    _, left = psutil.wait_procs(family, timeout=GONE_AFTER_S)
    assert left == [], f"{how}: processes outlive a killed run"


WAYS = ("group", "group", "group", "SIGKILL", "SIGTERM", "SIGINT", "group, politely")


def is_whole(folder: Path) -> bool:
    """True if a folder holds all that its manifest lists, byte by byte, and nothing half written beside it."""
    files = manifest(folder)["files"]
    found = {p: sha256_bytes(data) for p, data in snapshot(folder).items() if data is not None and p != "manifest.json"}
    return len(files) > 5 and found == files


def output_after(place: Path) -> Path:
    """Return the folder that holds the output now: where it belongs, or set aside in the instant of a swap."""
    aside = [p for p in place.iterdir() if re.fullmatch(r"\.cup\.old-\d+", p.name)]
    return place / "cup" if (place / "cup").exists() else aside[0]


def broken_entries(store: Store) -> list[str]:
    """Return the keys of entries that are not whole."""
    assert store.folder is not None
    keys = sorted(p.name for p in (store.folder / "entries").glob("*/*"))
    return [key for key in keys if store.recall(key) is None]


def survive(folder: Path, kills: int, until: float = 1.05) -> list[str]:
    """Kill builds at random moments over an earlier output; return how often each output was there afterwards.

    until : the latest moment, as a share of the time that the first build took
    """
    chance, cache, place = random.Random(SEED), folder / "cache", folder / "out"
    begin = time.monotonic()
    built(variant(folder, 0), place / "cup", cache, "--no-pictures", "--quiet")
    lasts_s = time.monotonic() - begin
    previous, said = snapshot(place / "cup"), []
    for number in range(1, kills + 1):
        source, how = variant(folder, number), chance.choice(WAYS)
        process = start(source, cache)
        time.sleep(chance.uniform(0.0, until) * lasts_s)
        kill(process, how)
        out = output_after(place)
        now = snapshot(out)
        assert now == previous or (out.name == "cup" and is_whole(out)), f"run {number}, {how}: the output is damaged"
        said.append("earlier" if now == previous else "new")
        assert broken_entries(open_store({"MOLDGEN_CACHE": str(cache)})) == []
        previous = now
        if number % EVERY == 0 or number == kills:
            built(source, place / "cup", cache, "--no-pictures", "--quiet")
            built(source, folder / "alone", "off", "--no-pictures", "--quiet")
            assert differing(place / "cup", folder / "alone") == []
            assert [p.name for p in place.iterdir()] == ["cup"], "leftovers of a killed run"
            previous = snapshot(place / "cup")
    return said


def test_builds_killed_at_some_moments_cost_nothing(tmp_path: Path) -> None:
    assert "earlier" in survive(tmp_path, 2, until=0.3)  # a build with a filled cache is over much sooner


@pytest.mark.sweep
def test_builds_killed_at_fifty_moments_cost_nothing(tmp_path: Path) -> None:
    said = survive(tmp_path, 50)
    assert said.count("earlier") > 25


def test_damage_would_be_seen(tmp_path: Path) -> None:
    """Planted faults: a file that was cut off in an output, and one in the cache."""
    cache = tmp_path / "cache"
    built(variant(tmp_path, 0), tmp_path / "out" / "cup", cache, "--no-pictures", "--quiet")
    assert is_whole(tmp_path / "out" / "cup")
    step = tmp_path / "out" / "cup" / "tool.step"
    step.write_bytes(step.read_bytes()[:-1])
    assert not is_whole(tmp_path / "out" / "cup")
    store = open_store({"MOLDGEN_CACHE": str(cache)})
    assert broken_entries(store) == []
    entry = min((cache / "entries").glob("*/*"))
    entry.write_bytes(entry.read_bytes()[:-1])
    assert broken_entries(store) == [entry.name]
