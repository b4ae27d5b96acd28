"""README.md says what the code says: the sections of a spec, the proofs, the demos and their pictures."""

from __future__ import annotations

import re

import numpy as np
import pytest
from helpers.png import pixels
from helpers.source import CHECKOUT

from moldgen.proof.opening import CAVITY_OPENS, EJECTORS_MOVE, PART_LEAVES, SIDES_MOVE
from moldgen.proof.rest import APART, FILLED, SOUND
from moldgen.spec.describe import json_schema

README = (CHECKOUT / "README.md").read_text(encoding="utf-8")
DEMOS = sorted(path.parent.name for path in CHECKOUT.glob("specs/*/spec.yaml"))


def chapter(title: str) -> str:
    """Return the text below a heading, up to the next one of its rank."""
    (text,) = re.findall(rf"^## {re.escape(title)}\n(.+?)(?=^## |\Z)", README, re.MULTILINE | re.DOTALL)
    return text


def rows(title: str) -> list[list[str]]:
    """Return the cells of the table in a chapter, without its head."""
    lines = [line.strip("| ") for line in chapter(title).splitlines() if line.startswith("| ")]
    return [re.split(r"\s+\|\s+", line) for line in lines][2:]


def test_the_sections_of_a_spec() -> None:
    keys = json_schema()["properties"]
    assert rows("The spec") == [[f"`{key}`", says["description"]] for key, says in keys.items()]


def test_the_proofs() -> None:
    assert [row[0] for row in rows("What is proved")] == [
        SOUND,
        FILLED,
        APART,
        CAVITY_OPENS,
        PART_LEAVES,
        EJECTORS_MOVE,
        SIDES_MOVE,
    ]


def test_every_demo_is_shown() -> None:
    assert sorted(re.match(r"\[([\w-]+)\]", row[0])[1] for row in rows("Demos")) == DEMOS  # type: ignore[index]


def test_every_linked_file_exists() -> None:
    links = re.findall(r"\]\(([^)#]+)\)", README)
    assert links
    assert [link for link in links if "://" not in link and not (CHECKOUT / link).is_file()] == []


@pytest.mark.parametrize("name", DEMOS)
@pytest.mark.parametrize("file", ["part.png", "tool.png"])
def test_kept_pictures_are_small_and_show_something(name: str, file: str) -> None:
    path = CHECKOUT / "specs" / name / file
    assert path.stat().st_size < 60_000
    picture = pixels(path)
    assert picture.shape == (500, 700, 3)
    inked = np.abs(picture[44:470, 131:].astype(int) - picture[0, 0].astype(int)).max(axis=2) > 40
    assert inked.mean() > 0.05
