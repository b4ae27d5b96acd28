"""Issue 2, "Behaviour", and design, section 2: exit codes, plain progress, --quiet, --json, a light --help."""

from __future__ import annotations

import json
import os
import re
import subprocess
import sys
from pathlib import Path

import pytest
from helpers.command import TESTS, environment, moldgen, moldgen_command, on_terminal

from moldgen.errors import ExitCode


def test_help_lists_every_exit_code_with_its_meaning(tmp_path: Path) -> None:
    done = moldgen("--help", folder=tmp_path)
    assert done.returncode == 0
    for code in ExitCode:
        assert re.search(rf"^ +{code.value}  {re.escape(code.meaning)}$", done.stdout, re.MULTILINE)


@pytest.mark.parametrize(
    "words", ["import moldgen.cli", "import moldgen.cli; moldgen.cli.cli(['build', '--help'], standalone_mode=False)"]
)
def test_the_command_line_loads_nothing_heavy(words: str) -> None:
    heavy = [
        "cadquery",
        "OCP",
        "manifold3d",
        "trimesh",
        "embreex",
        "vtkmodules",
        "numpy",
        "scipy",
        "pydantic",
        "pint",
        "ruamel",
        "rich",
        "psutil",
    ]
    code = f"{words}; import sys; sys.exit(str(sorted(set({heavy}) & set(sys.modules)) or 0))"
    done = subprocess.run([sys.executable, "-c", code], env=environment(), capture_output=True, text=True, check=False)
    assert done.stderr == "0\n"


def test_version(tmp_path: Path) -> None:
    assert re.fullmatch(r"moldgen \d+\.\d+\.\d+\n", moldgen("--version", folder=tmp_path).stdout)


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        (["build", "no.yaml"], "no.yaml: the spec cannot be read: No such file"),
        (["build", "."], "the spec cannot be read: Is a directory"),
        (["new", "no.step"], "no.step: the part cannot be read"),
        (["prove", "nowhere"], "nowhere: there is no such folder"),
        (["prove", "."], "there is no manifest.json"),
        (["build"], "Missing argument 'SPEC'"),
        (["build", "--fast", "x"], "No such option '--fast'"),
        (["bild"], "No such command 'bild'"),
        (["check", "lid.yaml", "--time-limit", "0"], "--time-limit"),
        (["check", "lid.yaml", "--time-limit", "nan"], "finite"),
    ],
)
def test_a_wrong_command_line_is_2_and_says_what_to_try(arguments: list[str], words: str, tmp_path: Path) -> None:
    (tmp_path / "lid.yaml").touch()
    done = moldgen(*arguments, folder=tmp_path)
    assert done.returncode == 2
    assert words in done.stderr
    assert "try: " in done.stderr
    assert done.stdout == ""
    assert [p.name for p in tmp_path.iterdir()] == ["lid.yaml"]


def test_no_command_shows_the_help(tmp_path: Path) -> None:
    done = moldgen(folder=tmp_path)
    assert done.returncode == 2
    assert "Commands:" in done.stderr


@pytest.mark.parametrize(
    ("job", "code"),
    [("good", 1), ("part_error", 3), ("kernel_error", 4), ("crashes", 4), ("no_library", 4), ("bug", 5)],
)
def test_each_end_of_a_job_has_its_exit_code_and_no_traceback(job: str, code: int, tmp_path: Path) -> None:
    (tmp_path / "lid.yaml").touch()
    done = moldgen("build", "lid.yaml", folder=tmp_path, job=job)
    assert done.returncode == code
    assert "Traceback" not in done.stdout + done.stderr
    as_json = moldgen("build", "lid.yaml", "--json", folder=tmp_path, job=job)
    assert as_json.returncode == code
    assert json.loads(as_json.stdout)["exit_code"] == code


def test_the_report_of_a_build(tmp_path: Path) -> None:
    (tmp_path / "lid.yaml").touch()
    done = moldgen("build", "lid.yaml", folder=tmp_path, job="good")
    report = done.stdout
    assert "1.23457e+06" not in report  # volumes are for people
    assert re.search(r"^  core +12\.5$", report, re.MULTILINE)
    assert re.search(r"^  not run +opening +0\.03  mm +no motion given$", report, re.MULTILINE)
    assert report.index("draft.too_small") < report.index("part.healed")
    assert "at 1.00, 2.00, 3.00; 0.2, limit 1" in report
    assert re.search(r"^  pull +\+z \(least trapped area\)$", report, re.MULTILINE)
    assert "written: out/lid" in report
    assert "not for manufacture before qualified people" in " ".join(report.split())


def test_progress_is_plain_lines_off_a_terminal_and_none_when_quiet(tmp_path: Path) -> None:
    (tmp_path / "lid.yaml").touch()
    plain = moldgen("build", "lid.yaml", folder=tmp_path, job="good")
    assert re.search(r"^ +\d+\.\d s  split the faces: 12 faces \(\d+\.\d s\)$", plain.stderr, re.MULTILINE)
    assert not re.search(r"[\x00-\x09\x0b-\x1f]", plain.stdout + plain.stderr)
    quiet = moldgen("build", "lid.yaml", "--quiet", folder=tmp_path, job="good")
    assert quiet.stderr == ""
    assert quiet.stdout == plain.stdout


def test_progress_on_a_terminal_is_live(tmp_path: Path) -> None:
    (tmp_path / "lid.yaml").touch()
    command = moldgen_command("build", "lid.yaml", job="good")
    code, seen = on_terminal(command, tmp_path, stdout=False)
    assert code == 1
    assert b"split the faces: 12 faces (" in seen
    assert b"\x1b[" in seen


def test_json_is_one_document_whatever_the_job_prints(tmp_path: Path) -> None:
    (tmp_path / "lid.yaml").touch()
    done = moldgen("check", "lid.yaml", "--json", folder=tmp_path, job="says_hello")
    document = json.loads(done.stdout)
    assert document["output"] == "out/lid"
    assert [f["severity"] for f in document["findings"]] == ["failure", "note"]
    assert [p["passed"] for p in document["proofs"]] == [True, False]
    assert [t["stage"] for t in document["timings_s"]] == ["load the stages", "split the faces"]
    assert "chatter" not in done.stderr


def test_json_of_a_wrong_command_line(tmp_path: Path) -> None:
    document = json.loads(moldgen("build", "no.yaml", "--json", folder=tmp_path).stdout)
    assert document["errors"][0]["where"] == "no.yaml"
    assert json.loads(moldgen("build", "--json", folder=tmp_path).stdout)["exit_code"] == 2


def test_a_reader_that_goes_away_is_no_bug(tmp_path: Path) -> None:
    (tmp_path / "lid.yaml").touch()
    command = moldgen_command("build", "lid.yaml", "--quiet", job="good")
    ours, its = os.pipe()
    os.close(ours)
    done = subprocess.run(
        command, cwd=tmp_path, env=environment(), stdout=its, stderr=subprocess.PIPE, text=True, check=False
    )
    os.close(its)
    assert "Traceback" not in done.stderr
    assert "bug" not in done.stderr


def test_an_output_that_cannot_be_written_is_2(tmp_path: Path) -> None:
    (tmp_path / "lid.yaml").touch()
    done = moldgen("build", "lid.yaml", "--output", "/dev/null/lid", folder=tmp_path, job="good")
    assert done.returncode == 2
    assert "a file stands where a folder is needed" in done.stderr


def test_schema_is_a_valid_json_schema_that_knows_the_demos(tmp_path: Path) -> None:
    import jsonschema  # noqa: PLC0415
    from ruamel.yaml import YAML  # noqa: PLC0415

    schema = json.loads(moldgen("schema", folder=tmp_path).stdout)
    jsonschema.Draft202012Validator.check_schema(schema)
    validator = jsonschema.Draft202012Validator(schema)
    for spec in sorted(TESTS.parent.glob("specs/*/spec.yaml")):
        assert [e.message for e in validator.iter_errors(YAML(typ="safe").load(spec))] == []
    assert list(validator.iter_errors({"resn": "ABS"}))
