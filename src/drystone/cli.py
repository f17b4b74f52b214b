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
@click.option("--sheet", type=FOLDER, help="The team's own sheet: copied, its layout guessed.")
def start(folder: Path, sheet: Path | None) -> None:
    """Write a review into FOLDER: config, workbook, and what plain snakemake needs.

    With --sheet, the config is a proposal: every guess a line with its reason, easy to correct.
    """
    from drystone.driving import folders

    config = folder / "config" / "config.yaml"
    if sheet is None:
        folders.start(folder)
        steps = [f"name your outcomes in {config}"]
        steps.append(f"type your comparisons into {folder / 'data' / 'extraction.xlsx'}")
    else:
        from drystone.driving.own_layout import start_with_sheet

        steps = [f"decide: {ask}" for ask in start_with_sheet(folder, sheet).asks]
        steps.append(f"read the guesses in {config} and correct them")
    click.echo(f"A review folder stands in {folder}. Now:")
    for number, step in enumerate([*steps, f"drystone check {folder}", f"drystone run {folder}"]):
        click.echo(f"  {number + 1}. {step}")


@cli.command()
@click.argument("folder", type=FOLDER, default=Path())
def check(folder: Path) -> None:
    """List what is wrong with the sheet of the review in FOLDER, and mark it in a copy.

    FOLDER may also be a sheet in the team's own layout (a workbook, a CSV file, or a folder of
    CSV files): then columns, outcomes and units are guessed and shown, and no config is needed.
    """
    from drystone.driving.folders import is_bare_sheet

    if is_bare_sheet(folder):
        from drystone.driving.own_layout import check_sheet

        stops = check_sheet(folder, click.echo)
    else:
        from drystone.driving.checking import check_review

        stops = check_review(folder, click.echo)
    sys.exit(STOPS if stops else 0)


@cli.command("compare-extractions")
@click.argument("a", type=FOLDER)
@click.argument("b", type=FOLDER)
@click.option("--config", type=FOLDER, help="Config (or review folder) that both sheets follow.")
@click.option(
    "--tolerance",
    type=click.FloatRange(0, 1),
    default=1e-6,
    show_default=True,
    help="Relative difference of two numbers that counts as none.",
)
@click.option(
    "--to",
    type=FOLDER,
    default=Path("extraction-comparison"),
    show_default=True,
    help="Folder for disagreements.csv and agreement.csv.",
)
def compare_extractions(a: Path, b: Path, config: Path | None, tolerance: float, to: Path) -> None:
    """Compare two extractions A and B of the same papers, cell by cell.

    A and B are sheets or review folders. Resolutions typed into disagreements.csv are kept.
    """
    from drystone.driving.comparing import Options, compare

    differ = compare(a, b, Options(config, tolerance, to), click.echo)
    sys.exit(STOPS if differ else 0)


@cli.command()
@click.argument("folder", type=FOLDER)
@click.argument("row")
@click.argument("rule")
@click.argument("decision")
@click.option("--reason", required=True, help="Why; it stands in the accepted list or the ledger.")
@click.option("--who", default="", help="Who decided.")
def answer(folder: Path, row: str, rule: str, decision: str, reason: str, who: str) -> None:
    """Answer the finding RULE of ROW (its row_id; * for every such row) in answers.csv.

    DECISION is 'accept' (an ask or warn was looked at, its stated default holds) or 'leave out'
    (the row leaves). When the numbers of the row change, the finding is asked again.
    """
    from drystone.driving.answering import Decision
    from drystone.driving.answering import answer as write

    rows = write(folder, Decision(row, rule, decision, reason, who))
    click.echo(f"{len(rows)} answer{'s' if len(rows) > 1 else ''} in {folder / 'answers.csv'}.")


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
