"""The command line. Results go to stdout, everything else to stderr.

Exit codes: 0 done, 1 some candidates failed, 2 the request was wrong, 3 the run broke or was stopped.
Heavy imports happen inside the commands, so that help is quick.
"""

from __future__ import annotations

import os
import sys
import traceback
from pathlib import Path
from typing import Annotated

import typer

DONE, SOME_FAILED, WRONG_REQUEST, BROKE = 0, 1, 2, 3

app = typer.Typer(
    name="orchil",
    help="Overnight screening of dye candidates: where they absorb, how strongly, along which axis.",
    no_args_is_help=True,
    add_completion=False,
    pretty_exceptions_enable=False,
    rich_markup_mode=None,
)

StoreName = Annotated[str, typer.Argument(metavar="STORE", help="store file, or a database URL")]
BriefFile = Annotated[Path, typer.Option("--brief", "-b", help="what is wanted: a TOML file")]
Top = Annotated[int, typer.Option("--top", min=0, help="rows of the ranking to print")]


@app.command()
def screen(  # noqa: PLR0917 (one parameter per option)
    library: Annotated[Path, typer.Argument(help="candidates: CSV (or ; or tab), .smi or .sdf")],
    brief: BriefFile,
    store: Annotated[str, typer.Option("--store", "-s", help="store file to create or continue, or a database URL")],
    workers: Annotated[int | None, typer.Option(min=1, help="processes; default is one per core")] = None,
    retry_failed: Annotated[bool, typer.Option("--retry-failed", help="try failed candidates again")] = False,
    memory: Annotated[float, typer.Option(min=0.1, help="GiB that one worker may take for a stage")] = 4.0,
    limit: Annotated[int | None, typer.Option(min=1, help="only the first rows of the library")] = None,
    until: Annotated[str | None, typer.Option(help='stop at this time of day, like "07:00"; best first')] = None,
    hours: Annotated[float | None, typer.Option(help="stop after so many hours; best first")] = None,
    top: Top = 10,
) -> None:
    """Compute and rank a library. Run it again and it continues where it was."""
    from .screen import Effort, Request, run_screen

    count = workers or len(os.sched_getaffinity(0))
    effort = Effort(count, memory, retry_failed, until, hours)
    raise typer.Exit(run_screen(Request(library, brief, limit, store), effort, top))


@app.command()
def rank(
    store: StoreName,
    brief: BriefFile,
    library: Annotated[Path | None, typer.Option("--library", help="take its measured columns anew")] = None,
    top: Top = 10,
) -> None:
    """Rank what is in a store against another brief or with new measurements; computes nothing else."""
    from .screen import run_rank

    raise typer.Exit(run_rank(store, brief, library, top))


@app.command()
def recompute(
    store: StoreName,
    stage: Annotated[str, typer.Argument(help="a stage that runs on request, such as dft")],
    best: Annotated[int, typer.Option("--best", min=1, help="so many candidates, the best of the ranking")] = 5,
    workers: Annotated[int, typer.Option(min=1, help="processes")] = 1,
    memory: Annotated[float, typer.Option(min=0.1, help="GiB that one worker may take")] = 4.0,
) -> None:
    """Run a dear stage for the best candidates of a finished screen; the ranking stays as it is."""
    from .recompute import run_recompute

    raise typer.Exit(run_recompute(store, stage, best, workers, memory))


@app.command()
def query(  # noqa: PLR0917 (one parameter per option)
    store: StoreName,
    sql: Annotated[str | None, typer.Argument(help="one SELECT; without it and --ask: list the questions")] = None,
    ask: Annotated[str | None, typer.Option(help="a ready-made question by name, or an SQL file")] = None,
    settings: Annotated[list[str] | None, typer.Option("--set", help="NAME=VALUE for a question, repeatable")] = None,
    form: Annotated[str, typer.Option("--format", "-f", help="table, csv, json, parquet or sdf")] = "table",
    output: Annotated[Path | None, typer.Option("--output", "-o", help="write to this file")] = None,
) -> None:
    """Ask the store a question in SQL, also while a screen is running; nothing can be changed."""
    from .query import Asked, run_query

    run_query(store, Asked(sql, ask, tuple(settings or ())), form, output)


@app.command()
def show(
    store: StoreName,
    candidate: Annotated[str | None, typer.Argument(help="name of a candidate; none: how the night stands")] = None,
) -> None:
    """Show one candidate on a page, or how the whole screen stands."""
    from .show import run_show

    run_show(store, candidate)


@app.command()
def report(
    store: StoreName,
    output: Annotated[Path, typer.Option("--output", "-o", help="the HTML file to write")],
    rows: Annotated[int, typer.Option(min=1, help="candidates in the table, the best first")] = 500,
    also: Annotated[list[str] | None, typer.Option(help="a candidate that gets a page too, repeatable")] = None,
) -> None:
    """Write one HTML file with the whole answer, which opens anywhere without a network."""
    from orchil.report import ReportRequest

    from .report import run_report

    run_report(store, output, ReportRequest(rows, tuple(also or ())))


@app.command()
def serve(
    store: StoreName,
    port: Annotated[int, typer.Option(min=0, max=65535, help="0 takes any free one")] = 0,
) -> None:
    """Show the same pages live in a browser on this machine, also while a screen is running."""
    from .serve import run_serve

    run_serve(store, port)


@app.command()
def stages(
    quantities: Annotated[bool, typer.Option("--quantities", help="list what a brief can want")] = False,
    schema: Annotated[Path | None, typer.Option("--schema", help="write JSON Schema files to this folder")] = None,
    explain: Annotated[bool, typer.Option("--explain", help="draw the chain, and say who is left out and why")] = False,
    brief: Annotated[Path | None, typer.Option("--brief", "-b", help="explain the chain of this brief")] = None,
    svg: Annotated[Path | None, typer.Option("--svg", help="draw the explained chain into this SVG file too")] = None,
) -> None:
    """List the stages that are installed, what can be wanted from them, or how they follow each other."""
    from .stages import run_explain, run_stages

    if explain or brief is not None or svg is not None:
        run_explain(brief, svg)
    else:
        run_stages(quantities, schema)


@app.command(name="new-stage")
def new_stage(
    name: Annotated[str, typer.Argument(help='name of the stage, like "ring-count"')],
    into: Annotated[Path, typer.Option("--into", help="folder in which the package is made")] = Path(),
) -> None:
    """Make a small installable package with one stage of your own."""
    from .new_stage import run_new_stage

    run_new_stage(name, into)


@app.command()
def check() -> None:
    """Is this machine ready, and do published values come out?"""
    from .stages import run_check

    raise typer.Exit(run_check())


def main() -> None:
    """Entry point of the command `orchil`."""
    sys.exit(run(sys.argv[1:]))


def run(arguments: list[str]) -> int:
    """Run one command line; returns its exit code. Errors are sentences on stderr."""
    from orchil.errors import OrchilError, RunError

    try:
        app(arguments, prog_name="orchil")
    except SystemExit as done:
        return done.code if isinstance(done.code, int) else WRONG_REQUEST
    except RunError as error:
        return _say(error, BROKE)
    except OrchilError as error:
        return _say(error, WRONG_REQUEST)
    except BrokenPipeError:  # the reader of our output has gone, as `head` does
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        return DONE
    except Exception:
        traceback.print_exc()
        return _say("this is a fault in Orchil or in a plugin; what was finished is kept", BROKE)
    return DONE


def _say(error: object, code: int) -> int:
    for line in str(error).splitlines():
        print(f"orchil: {line}", file=sys.stderr)
    return code
