"""Command line: parses, calls, prints. Exit codes stand in `drystone.driving.exits`."""

from __future__ import annotations

import io
import sys
from pathlib import Path

import click

from drystone import __version__
from drystone.driving.exits import BUSY, CONFIG, FAILED, INTERRUPTED, STOPS

FOLDER = click.Path(path_type=Path)


@click.group(context_settings={"help_option_names": ["-h", "--help"], "max_content_width": 100})
@click.version_option(__version__, prog_name="drystone")
def cli() -> None:
    """Keep a quantitative review alive: extraction sheet in, defended report out.

    Edit the workbook, run one command, and only what the edit touches is recomputed.
    """


@cli.command()
@click.argument("folder", type=FOLDER, default=Path("drystone-demo"))
@click.option("--cores", type=click.IntRange(1), default=2, show_default=True)
def demo(folder: Path, cores: int) -> None:
    """Write the invented demo review into FOLDER, run it, print where the report is."""
    from drystone.driving import folders

    if not folders.is_review(folder):
        folders.write_demo(folder)
        click.echo(f"The invented demo stands in {folder}.")
    _run(folder, cores)


@cli.command()
@click.argument("folder", type=FOLDER)
def start(folder: Path) -> None:
    """Write an empty review into FOLDER: config, workbook, and what plain snakemake needs."""
    from drystone.driving import folders

    folders.start(folder)
    click.echo(f"A review folder stands in {folder}. Now:")
    click.echo(f"  1. name your outcomes in {folder / 'config' / 'config.yaml'}")
    click.echo(f"  2. type your comparisons into {folder / 'data' / 'extraction.xlsx'}")
    click.echo(f"  3. drystone check {folder}")
    click.echo(f"  4. drystone run {folder}")


@cli.command()
@click.argument("folder", type=FOLDER, default=Path())
def check(folder: Path) -> None:
    """Read the sheet of the review in FOLDER, list what is wrong, mark it in a copy."""
    from drystone.driving.checking import check_review

    stops = check_review(folder, click.echo)
    sys.exit(STOPS if stops else 0)


@cli.command()
@click.argument("folder", type=FOLDER, default=Path())
@click.option("--cores", type=click.IntRange(1), default=2, show_default=True)
@click.option("--strict", is_flag=True, help="Do not run while a row has a finding of level stop.")
@click.option("--tidy", is_flag=True, help="Remove folders of analyses that the config lost.")
def run(folder: Path, cores: int, strict: bool, tidy: bool) -> None:
    """Bring the results of the review in FOLDER up to date."""
    _run(folder, cores, strict, tidy)


@cli.command()
@click.argument("folder", type=FOLDER, default=Path())
def why(folder: Path) -> None:
    """Say which steps the next run will do, and why, down to the cell. Runs nothing."""
    from drystone.driving.plan import make_plan
    from drystone.driving.why import reasons

    found = reasons(make_plan(folder.resolve()))
    if not found:
        click.echo("Nothing will run: the results are up to date.")
        return
    click.echo(f"{len(found)} step{'s' if len(found) > 1 else ''} will run:")
    for reason in found:
        click.echo(f"  {reason.phrase}, since {'; '.join(reason.since)}")


def _run(folder: Path, cores: int, strict: bool = False, tidy: bool = False) -> None:
    from drystone.driving.session import run_review

    sys.exit(run_review(folder, cores, strict=strict, tidy=tidy))


def main() -> None:
    """Run the command line; every problem that a user can cause ends in a sentence."""
    for stream in (sys.stdout, sys.stderr):
        if isinstance(stream, io.TextIOWrapper):
            stream.reconfigure(errors="backslashreplace")  # a name never breaks the last line
    try:
        cli(standalone_mode=False)
    except click.exceptions.Exit as ended:
        sys.exit(ended.exit_code)
    except click.exceptions.Abort:
        sys.exit(INTERRUPTED)
    except click.ClickException as problem:
        problem.show()
        sys.exit(CONFIG)
    except KeyboardInterrupt:
        click.echo("interrupted", err=True)
        sys.exit(INTERRUPTED)
    except Exception as error:
        code = _code(error)
        if code is None:
            raise
        click.echo(f"drystone: {_sentence(error)}", err=True)
        sys.exit(code)


def _code(error: Exception) -> int | None:
    """Exit code of a problem that a user can cause; None for an error of the program."""
    from drystone.driving.folders import FolderTaken
    from drystone.driving.lock import FolderBusy
    from drystone.settings.problems import ConfigProblem
    from drystone.sheet.problems import SheetProblem

    if isinstance(error, FolderBusy):
        return BUSY
    if isinstance(error, ConfigProblem | FolderTaken | SheetProblem):
        return CONFIG
    return FAILED if isinstance(error, OSError) else None


def _sentence(error: Exception) -> str:
    if isinstance(error, OSError):
        from drystone.driving.perform import say

        return say(error)
    return str(error)
