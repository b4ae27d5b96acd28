"""README.md says what the program says: exit codes, system packages, commands, and a spec that loads."""

from __future__ import annotations

import re
from pathlib import Path

from helpers.source import CHECKOUT

from moldgen.cli import cli
from moldgen.errors import ExitCode
from moldgen.flow.syslibs import PACKAGES, TEST_PACKAGES
from moldgen.spec.load import load_spec

README = (CHECKOUT / "README.md").read_text(encoding="utf-8")


def test_exit_codes() -> None:
    rows = re.findall(r"^\| (\d+) \| (.+?) \|$", README, re.MULTILINE)
    assert rows == [(str(code.value), code.meaning) for code in ExitCode]


def test_system_packages() -> None:
    lines = re.findall(r"^apt-get install -y (.+)$", README, re.MULTILINE)
    assert [line.split() for line in lines] == [["python3-venv", *PACKAGES], [*TEST_PACKAGES]]


def test_commands() -> None:
    rows = re.findall(r"^\| `moldgen (\w+)", README, re.MULTILINE)
    assert sorted(rows) == sorted(cli.commands)


def test_the_demo_of_the_first_command_exists() -> None:
    (spec,) = re.findall(r"bin/moldgen build (specs/\S+)$", README, re.MULTILINE)
    assert (CHECKOUT / spec).is_file()


def test_the_example_is_a_spec(tmp_path: Path) -> None:
    example, sides = re.findall(r"```yaml\n(.+?)```", README, re.DOTALL)
    (tmp_path / "lid.yaml").write_text(example + sides, encoding="utf-8")
    spec = load_spec(tmp_path / "lid.yaml").spec
    assert (spec.name, spec.resin) == ("lid", "ABS")
    assert spec.marks[0].face == (0.0, 0.0, 12.7)
    assert [(s.kind, s.direction) for s in spec.side_actions.given] == [
        ("slide", (1.0, 0.0, 0.0)),
        ("lifter", (0.0, -1.0, 0.0)),
    ]
