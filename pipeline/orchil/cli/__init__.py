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
    top: Top = 10,
) -> None:
    """Compute and rank a library. Run it again and it continues where it was."""
    from .screen import Effort, Request, run_screen

    count = workers or len(os.sched_getaffinity(0))
    raise typer.Exit(run_screen(Request(library, brief, limit, store), Effort(count, memory, retry_failed), top))


@app.command()
def rank(store: StoreName, brief: BriefFile, top: Top = 10) -> None:
    """Rank what is in a store against another brief; computes nothing else."""
    from .screen import run_rank

    raise typer.Exit(run_rank(store, brief, top))


@app.command()
def query(
    store: StoreName,
    sql: Annotated[str, typer.Argument(help='one SELECT, for example "SELECT * FROM ranking LIMIT 10"')],
    form: Annotated[str, typer.Option("--format", "-f", help="table, csv, json or parquet")] = "table",
    output: Annotated[Path | None, typer.Option("--output", "-o", help="write to this file")] = None,
) -> None:
    """Ask the store a question in SQL, also while a screen is running; nothing can be changed."""
    from .query import run_query

    run_query(store, sql, form, output)


@app.command()
def show(
    store: StoreName,
    candidate: Annotated[str | None, typer.Argument(help="name of a candidate; none: how the night stands")] = None,
) -> None:
    """Show one candidate on a page, or how the whole screen stands."""
    from .show import run_show

    run_show(store, candidate)


@app.command()
def stages(
    quantities: Annotated[bool, typer.Option("--quantities", help="list what a brief can want")] = False,
    schema: Annotated[Path | None, typer.Option("--schema", help="write JSON Schema files to this folder")] = None,
) -> None:
    """List the stages that are installed, or what can be wanted from them."""
    from .stages import run_stages

    run_stages(quantities, schema)


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
