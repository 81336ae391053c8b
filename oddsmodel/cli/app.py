"""The commands and their help; the work of each is in the file of its name, imported when it is called."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from oddsmodel.cli.ending import ended

app = typer.Typer(
    add_completion=False,
    rich_markup_mode=None,
    pretty_exceptions_enable=False,
    no_args_is_help=True,
    context_settings={"help_option_names": ["-h", "--help"]},
    help="""From records and a study plan to adjusted odds ratios, checks of fit and a report that can be sent.

    New here? `oddsmodel demo` runs an invented study, so that you can see a plan and its report. For your own
    records, `oddsmodel draft` writes a starter plan, `oddsmodel check` reads it against the records, and
    `oddsmodel run` writes the report. With later records, `oddsmodel changes` sets the results side by side; where
    reports gather, `oddsmodel shelf` writes their index.

    Exit status: 0 done; 1 the program or the machine failed; 2 the plan, the records or the formula is at fault;
    3 a model could not be estimated, the others are reported; 130 interrupted.""",
)

PlanArgument = Annotated[Path, typer.Argument(metavar="PLAN", help="The study plan, a TOML file.", show_default=False)]
RecordsOption = Annotated[
    Path | None,
    typer.Option(
        "--records", metavar="FILE", help="Read these records in place of the plan's source.", show_default=False
    ),
]


def _version(asked: bool) -> None:
    if asked:
        from importlib.metadata import version

        typer.echo(f"oddsmodel {version('oddsmodel')}")
        raise typer.Exit


@app.callback()
def oddsmodel(
    version: Annotated[
        bool, typer.Option("--version", help="Show the version and leave.", callback=_version, is_eager=True)
    ] = False,
) -> None:
    return


@app.command(short_help="Fit the models of a plan and write the report.")
def run(
    plan: PlanArgument,
    into: Annotated[
        Path | None,
        typer.Option(
            "--into",
            metavar="DIR",
            help="The folder to write to; without it, PLAN's name with -report, beside the plan.",
            show_default=False,
        ),
    ] = None,
    records: RecordsOption = None,
    workers: Annotated[
        str | None,
        typer.Option(
            "--workers",
            metavar="ADDRESS|local",
            help="Share the work among the workers of the Dask scheduler at this address (tcp://host:port, or "
            "tls://host:port), or among processes started here for it (local).",
            show_default=False,
        ),
    ] = None,
) -> None:
    """Fit the models of a plan and write the report.

    The folder will hold report.html, which opens in any browser, results.json for other programs, and the tables
    as CSV files. A folder with other files in it is left alone.

    Records that do not fit into memory stay on disk, or with --workers on the workers, which read them themselves. The
    numbers are the same wherever the records are. Name only a scheduler that you trust: whoever runs it can run
    programs on this machine in your name.
    """
    from oddsmodel.cli.run import run_command

    raise typer.Exit(ended(lambda: run_command(plan, into, records, workers)))


@app.command(short_help="Read a plan against its records, without fitting.")
def check(plan: PlanArgument, records: RecordsOption = None) -> None:
    """Read a plan against its records and tell what is found, without fitting anything.

    Every fault is told at once: what is wrong, where, and what to do. Nothing is written.
    """
    from oddsmodel.cli.check import check_command

    raise typer.Exit(ended(lambda: check_command(plan, records)))


@app.command(short_help="Write a starter plan for a file of records.")
def draft(
    records: Annotated[
        Path,
        typer.Argument(metavar="RECORDS", help="The records: CSV, TSV, Parquet or a spreadsheet.", show_default=False),
    ],
    outcome: Annotated[
        str, typer.Option("--outcome", metavar="COLUMN", help="The column of the outcome.", show_default=False)
    ],
    into: Annotated[
        Path | None,
        typer.Option(
            "--into", metavar="FILE", help="The plan to write; without it, the plan is printed.", show_default=False
        ),
    ] = None,
) -> None:
    """Write a starter plan for a file of records, with comments on what you have to settle.

    It names the columns' kinds and levels and the columns that could enter a model; which of them belong there is
    your decision. A file that is there already is never overwritten.
    """
    from oddsmodel.cli.draft import draft_command

    raise typer.Exit(ended(lambda: draft_command(records, outcome, into)))


@app.command(short_help="The crude odds ratio of a 2×2 table.")
def table(
    exposed: Annotated[
        str | None,
        typer.Option("--exposed", metavar="EVENTS/ALL", help="Events among all exposed.", show_default=False),
    ] = None,
    unexposed: Annotated[
        str | None,
        typer.Option("--unexposed", metavar="EVENTS/ALL", help="Events among all unexposed.", show_default=False),
    ] = None,
    cases: Annotated[
        str | None, typer.Option("--cases", metavar="EXPOSED/ALL", help="Exposed among all cases.", show_default=False)
    ] = None,
    controls: Annotated[
        str | None,
        typer.Option("--controls", metavar="EXPOSED/ALL", help="Exposed among all controls.", show_default=False),
    ] = None,
    level: Annotated[float, typer.Option("--level", help="The level of the intervals.")] = 0.95,
) -> None:
    """The crude odds ratio of a 2×2 table, with its intervals, from four counts.

    People followed or surveyed:  oddsmodel table --exposed 20/100 --unexposed 10/120

    Cases and controls:  oddsmodel table --cases 96/200 --controls 109/775

    Risks and their ratio are given for the first form only, since cases and controls do not show them.
    """
    from oddsmodel.cli.table import Counts, table_command

    raise typer.Exit(ended(lambda: table_command(Counts(exposed, unexposed, cases, controls), level)))


@app.command(short_help="Copy an invented study into a folder and run it.")
def demo(
    folder: Annotated[
        Path, typer.Argument(metavar="[FOLDER]", help="A new or empty folder to copy the study into.")
    ] = Path("oddsmodel-demo"),
) -> None:
    """Copy an invented study, its plan and its records, into a folder and run it.

    Read the plan beside the report to see what each line does; change the plan and run it again with
    `oddsmodel run`.
    """
    from oddsmodel.cli.demo import demo_command

    raise typer.Exit(ended(lambda: demo_command(folder)))


@app.command(short_help="What changed between results of the same study.")
def changes(
    results: Annotated[
        list[Path],
        typer.Argument(
            metavar="RESULTS RESULTS [...]", help="Two or more results.json, the earliest first.", show_default=False
        ),
    ],
    into: Annotated[
        Path | None,
        typer.Option(
            "--into", metavar="FILE.html", help="Write a page with the series drawn, too.", show_default=False
        ),
    ] = None,
) -> None:
    """What changed between results of the same study, in the order given.

    Run a plan again on later records with `oddsmodel run PLAN --records FILE --into DIR`, then name both results.json
    here. Changes of the plan are told apart from changes of the records, the odds ratios of the exposure stand as a
    series, and a word is said on records that may be in several extracts. Counts that differ too little to be shown
    are withheld, unless one of the results is internal.
    """
    from oddsmodel.cli.changes import changes_command

    raise typer.Exit(ended(lambda: changes_command(results, into)))


@app.command(short_help="Write an index page of the reports in a folder.")
def shelf(
    folder: Annotated[
        Path, typer.Argument(metavar="DIR", help="The folder that holds the reports.", show_default=False)
    ],
    into: Annotated[
        Path | None,
        typer.Option(
            "--into", metavar="FILE", help="The page to write; without it, index.html in DIR.", show_default=False
        ),
    ] = None,
) -> None:
    """Write an index page of the reports in a folder and in those within it, by title.

    Each stands with its question, its answer, its records and its findings, and a link that holds as long as page and
    reports keep their places. Internal reports are marked. A file that is not an earlier index is never overwritten.
    """
    from oddsmodel.cli.shelf import shelf_command

    raise typer.Exit(ended(lambda: shelf_command(folder, into)))
