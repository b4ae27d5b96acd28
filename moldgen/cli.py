"""The command line. It imports nothing heavy: the kernel lives in the worker process, all else comes when needed."""

from __future__ import annotations

import math
import os
import sys
from collections.abc import Callable
from dataclasses import dataclass
from functools import partial
from pathlib import Path
from typing import Any

import click

from moldgen import __version__
from moldgen.canon import to_json
from moldgen.errors import ExitCode, MoldgenError, SpecError, StageError
from moldgen.flow.job import Job, JobKind, Limits, Options
from moldgen.flow.report import error_json, error_lines, result_json, result_lines, stopped_json

GIB = 2**30

EPILOG = "\b\nExit codes:\n" + "\n".join(f"  {code.value:3}  {code.meaning}" for code in ExitCode)


@dataclass(frozen=True)
class _How:
    """The options that every command with a worker shares."""

    quiet: bool
    as_json: bool
    time_limit: float
    memory_limit: float

    def limits(self) -> Limits:
        """Return the limits of the worker; click's ranges let "nan" and "inf" pass."""
        if not (math.isfinite(self.time_limit) and math.isfinite(self.memory_limit)):
            raise SpecError("a limit must be a finite number", remedy="leave --time-limit and --memory-limit out")
        return Limits(self.time_limit, int(self.memory_limit * GIB))


_ONE_DOCUMENT = "Print one JSON document on stdout, and nothing else there."


def _shared(command: Callable[..., None], json_help: str = _ONE_DOCUMENT) -> Callable[..., None]:
    """Give `command` the options of `_How`."""
    for option in (
        click.option("--memory-limit", type=click.FloatRange(min=1.0), default=8.0, show_default=True, metavar="GIB"),
        click.option(
            "--time-limit", type=click.FloatRange(min=1.0), default=300.0, show_default=True, metavar="SECONDS"
        ),
        click.option("--json", "as_json", is_flag=True, help=json_help),
        click.option("--quiet", is_flag=True, help="Show no progress."),
    ):
        command = option(command)
    return command


_allow_code = click.option("--allow-code", is_flag=True, help="Let the spec run its part function (Python code).")


@click.group(epilog=EPILOG, context_settings={"help_option_names": ["-h", "--help"]})
@click.version_option(__version__, message="moldgen %(version)s")
def cli() -> None:
    """From a text spec and a plastic part to a proved first-pass injection-mold layout, as STEP.

    What it makes is for review by qualified people, never for manufacture as it stands.
    """


@cli.command()
@click.argument("part", type=Path)
@click.option("--output", type=Path, help="The spec file to write.  [default: the part's name with .yaml, here]")
@click.option("--resin", default="", help="A resin of the catalog.  [default: a common one, named in the spec]")
@_shared
def new(part: Path, output: Path | None, resin: str, **how: Any) -> None:
    """Write a commented starter spec for PART (a STEP file)."""
    _existing(part, "part")
    _finish(Job(JobKind.NEW, part, output or Path(f"{part.stem}.yaml"), Options(resin=resin)), _How(**how))


@cli.command()
@click.argument("spec", type=Path)
@click.option("--output", type=Path, help="The output folder.  [default: as the spec says, else out/NAME]")
@_allow_code
@_shared
def check(spec: Path, output: Path | None, allow_code: bool, **how: Any) -> None:
    """Review the part of SPEC against its pull, without building steel."""
    _existing(spec, "spec")
    _finish(Job(JobKind.CHECK, spec, output, Options(allow_code=allow_code)), _How(**how))


@cli.command()
@click.argument("spec", type=Path)
@click.option("--output", type=Path, help="The output folder.  [default: as the spec says, else out/NAME]")
@_allow_code
@click.option("--no-pictures", is_flag=True, help="Leave out the pictures.")
@click.option("--explain", is_flag=True, help="Say of each stage why it ran, or why it need not.")
@click.option("--fresh", is_flag=True, help="Ignore the accepted layout beside the spec.")
@click.option("--accept", is_flag=True, help="Accept the layout once the tool is proved, as 'accept' does.")
@_shared
def build(spec: Path, output: Path | None, no_pictures: bool, **how: Any) -> None:
    """Build and prove the tool of SPEC, and write it as STEP with its tables and pictures.

    What has not changed since an earlier run is kept, and where nothing has, nothing is done. What an accepted layout
    beside the spec holds (see 'accept') stays wherever the part and the spec allow it.
    """
    _existing(spec, "spec")
    own = {name: how.pop(name) for name in ("allow_code", "explain", "fresh", "accept")}
    options = Options(pictures=not no_pictures, **own)
    _finish(Job(JobKind.BUILD, spec, output, options), _How(**how))


@cli.command()
@click.argument("spec", type=Path)
@click.option("--output", type=Path, help="The output folder.  [default: as the spec says, else out/NAME]")
@_allow_code
@click.option("--no-pictures", is_flag=True, help="Leave out the pictures.")
@partial(_shared, json_help="Print one JSON object a line on stdout for each rebuild, and nothing else there.")
def watch(spec: Path, output: Path | None, allow_code: bool, no_pictures: bool, **how: Any) -> None:
    """Build SPEC now and again whenever it, its part or its accepted layout is saved; Ctrl-C ends.

    Each rebuild gives one line that says what changed. While the spec is broken the earlier output stays.
    """
    from moldgen.flow.progress import progress  # noqa: PLC0415  --help needs none of it
    from moldgen.flow.watch import watch_spec  # noqa: PLC0415

    _existing(spec, "spec")
    shared = _How(**how)
    job = Job(JobKind.BUILD, spec, output, Options(allow_code=allow_code, pictures=not no_pictures))
    try:
        watch_spec(
            job,
            shared.limits(),
            lambda made: click.echo(
                to_json(made.as_json(), indent=None) if shared.as_json else made.line() + "\n", nl=False
            ),
            partial(progress, quiet=shared.quiet),
        )
    except KeyboardInterrupt:
        if shared.as_json:
            click.echo(to_json(stopped_json(), indent=None), nl=False)
        click.echo(f"moldgen: {ExitCode.STOPPED.meaning}", err=True)
        raise click.exceptions.Exit(int(ExitCode.STOPPED)) from None


@cli.command()
@click.argument("spec", type=Path)
@click.option("--output", type=Path, help="The folder of the tool.  [default: as the spec says, else out/NAME]")
@_allow_code
@_shared
def accept(spec: Path, output: Path | None, allow_code: bool, **how: Any) -> None:
    """Accept the layout of the proved tool of SPEC: write it beside SPEC, as SPEC.accepted.yaml.

    The next builds keep pull, parting, blocks, pins and gate as they are there wherever the part and the spec allow it.
    """
    _existing(spec, "spec")
    _finish(Job(JobKind.ACCEPT, spec, output, Options(allow_code=allow_code)), _How(**how))


@cli.command()
@click.argument("folder", type=Path)
@_shared
def prove(folder: Path, **how: Any) -> None:
    """Read FOLDER, the output of a build, and prove the tool in it again, without its spec."""
    _built(folder)
    _finish(Job(JobKind.PROVE, folder), _How(**how))


@cli.command()
@click.argument("old", type=Path)
@click.argument("new", type=Path)
@click.option("--output", type=Path, help="The folder to write.  [default: out/NAME-compare, NAME as the folder NEW]")
@click.option("--no-pictures", is_flag=True, help="Leave out the pictures.")
@_shared
def compare(old: Path, new: Path, output: Path | None, no_pictures: bool, **how: Any) -> None:
    """Say what of the tool in the folder OLD must change to become that in NEW; both are outputs of 'build'.

    The pieces of steel to cut and to weld are written as STEP, with a page that shows them. That steel is missing is an
    answer, not a failure: the exit code is 0.
    """
    _built(old)
    _built(new)
    _finish(Job(JobKind.COMPARE, old, output, Options(pictures=not no_pictures), new), _How(**how))


@cli.command()
@click.argument("inputs", nargs=-1, required=True, type=Path, metavar="SPEC_OR_STEP...")
@click.option("--output", type=Path, default=Path("out/batch"), show_default=True, help="The folder of the batch.")
@click.option("--jobs", type=click.IntRange(min=1), help="Parts at once.  [default: the number of processors]")
@click.option("--resin", default="", help="A resin of the catalog, for bare STEP files.  [default: ABS]")
@click.option("--again", is_flag=True, help="Do every part, also those that are done with the same inputs.")
@click.option("--check", "only_check", is_flag=True, help="Review the parts as 'check' does, without building steel.")
@_allow_code
@click.option("--no-pictures", is_flag=True, help="Leave out the pictures.")
@partial(_shared, json_help="Print one JSON object a line on stdout for each finished part, and nothing else there.")
def batch(inputs: tuple[Path, ...], output: Path, jobs: int | None, only_check: bool, again: bool, **how: Any) -> None:
    """Build many parts at once: specs, STEP files without a spec, and folders that hold some.

    A part that fails never stops the others. What is done already with the same inputs is not done again. The exit
    code is that of the part that came off worst.
    """
    from moldgen.flow.batch import Batch, run_batch, steps_without_resin  # noqa: PLC0415  --help needs none of it
    from moldgen.flow.batch_inputs import batch_inputs  # noqa: PLC0415
    from moldgen.flow.batch_progress import batch_progress, show_summary  # noqa: PLC0415

    options = Options(how.pop("allow_code"), not how.pop("no_pictures"), how.pop("resin"))
    shared = _How(**how)
    kind = JobKind.CHECK if only_check else JobKind.BUILD
    parts = Batch(batch_inputs(inputs, output), output, kind, options, again)
    note = steps_without_resin(parts)
    if note and not shared.quiet:
        click.echo(note, err=True)
    with batch_progress(len(parts.inputs), quiet=shared.quiet, as_json=shared.as_json) as hear:
        result = run_batch(parts, shared.limits(), jobs or len(os.sched_getaffinity(0)), hear)
    if not shared.as_json and result.exit_code is not ExitCode.STOPPED:
        show_summary(result)
    raise click.exceptions.Exit(int(result.exit_code))


@cli.command()
@click.option("--clear", is_flag=True, help="Forget everything that is kept.")
@click.option("--json", "as_json", is_flag=True, help=_ONE_DOCUMENT)
def cache(clear: bool, as_json: bool) -> None:
    """Show what is kept for later runs: where, how much, and at most how much.

    Nothing of it is needed: what is cleared is made again when it is asked for.
    """
    from moldgen.flow.cache import cache_json, cache_lines, look_at_cache  # noqa: PLC0415  --help needs none of it

    look = look_at_cache(clear=clear)
    if as_json:
        _echo_json(cache_json(look))
    else:
        click.echo("\n".join(cache_lines(look)))


@cli.command()
def schema() -> None:
    """Print the JSON Schema of a spec, for editors."""
    from moldgen.spec.describe import json_schema  # noqa: PLC0415  pydantic takes its time to import

    _echo_json(json_schema())


def _built(folder: Path) -> None:
    """Refuse a folder without a manifest here and now, without waiting for a worker."""
    if not (folder / "manifest.json").is_file():
        what = "there is no manifest.json" if folder.is_dir() else "there is no such folder"
        raise SpecError(what, where=str(folder), remedy="name the output folder of 'moldgen build'")


def _existing(path: Path, what: str) -> None:
    """Refuse a missing file here and now, without waiting for a worker."""
    try:
        with path.open("rb"):
            return
    except OSError as error:
        reason = error.strerror or str(error)
        raise SpecError(f"the {what} cannot be read: {reason}", where=str(path), remedy="check the path") from error


def _finish(job: Job, how: _How) -> None:
    """Do `job`, show its result, and end the process with its exit code."""
    from moldgen.flow.run import run  # noqa: PLC0415  --help needs no worker

    result = run(job, how.limits(), quiet=how.quiet)
    if how.as_json:
        _echo_json(result_json(result))
    else:
        click.echo("\n".join(result_lines(result)))
    raise click.exceptions.Exit(int(result.exit_code))


def _echo_json(document: dict[str, Any]) -> None:
    """Print `document`, and nothing else, on stdout."""
    click.echo(to_json(document), nl=False)


def _failed(error: MoldgenError) -> int:
    if _wants_json():
        _echo_json(error_json(error))
    click.echo("\n".join(error_lines(error)), err=True)
    return int(error.exit_code)


def _wants_json() -> bool:
    """True if the command line says so, also when it is too wrong to be parsed."""
    return "--json" in sys.argv[1:]


def _misused(error: click.ClickException) -> SpecError:
    command = error.ctx.command_path if isinstance(error, click.UsageError) and error.ctx else "moldgen"
    return SpecError(error.format_message().rstrip("."), remedy=f"{command} --help")


def _bug(error: Exception) -> StageError:
    import tempfile  # noqa: PLC0415  hardly ever needed
    import traceback  # noqa: PLC0415

    with tempfile.NamedTemporaryFile("w", prefix="moldgen-", suffix=".traceback.txt", delete=False) as kept:
        traceback.print_exception(error, file=kept)
    what = f"unexpected {type(error).__name__}: {error}"
    return StageError(what, remedy="this is a bug in moldgen: please report it with the file kept", evidence=kept.name)


def main() -> None:
    """Run the command line and exit; every way out has its documented exit code, and none shows a traceback."""
    try:
        code = cli.main(standalone_mode=False, prog_name="moldgen")
    except MoldgenError as error:
        code = _failed(error)
    except click.exceptions.NoArgsIsHelpError as error:
        click.echo(error.format_message(), err=True)
        code = int(ExitCode.SPEC)
    except click.ClickException as error:
        code = _failed(_misused(error))
    except (KeyboardInterrupt, click.Abort):
        if _wants_json():
            _echo_json(stopped_json())
        click.echo(f"moldgen: {ExitCode.STOPPED.meaning}", err=True)
        code = int(ExitCode.STOPPED)
    except BrokenPipeError:  # the reader of our output went away
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        code = int(ExitCode.OK)
    except Exception as error:  # noqa: BLE001  the outermost handler: Python's own exit code would read "a check failed"
        code = _failed(_bug(error))
    sys.exit(code)
