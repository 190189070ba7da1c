"""Commands about the tables themselves: to a workbook and back, and what changed in them."""

from __future__ import annotations

import json
import sys
from collections.abc import Iterable
from datetime import datetime
from pathlib import Path

import click

from generator.errors import DatasetError, Problem

DATA = click.option(
    "--data",
    type=click.Path(path_type=Path, file_okay=False),
    default=Path("data"),
    show_default=True,
    help="Folder of the tables.",
)
CONFIG = click.option(
    "--config",
    type=click.Path(path_type=Path, exists=True, dir_okay=False),
    default=Path("mkdocs.yml"),
    show_default=True,
    help="Settings of the handbook.",
)


def report(findings: Iterable[Problem]) -> None:
    """Print findings, each with its place and what would settle it."""
    for finding in findings:
        click.echo(f"{finding}\n")


@click.group()
def sheet() -> None:
    """Take the tables to a spreadsheet program and back."""


@sheet.command("out")
@click.argument("file", type=click.Path(path_type=Path, dir_okay=False))
@DATA
def sheet_out(file: Path, data: Path) -> None:
    """Write all tables as one workbook, FILE.xlsx or FILE.ods."""
    from generator import workbook

    try:
        workbook.write(data, file)
    except DatasetError as error:
        report(error.problems)
        sys.exit(1)
    except ValueError as error:
        raise click.UsageError(str(error)) from error
    click.echo(f"{file}: all tables of {data}")


@sheet.command("in")
@click.argument("file", type=click.Path(path_type=Path, exists=True, dir_okay=False))
@DATA
@click.option("--dry-run", is_flag=True, help="Show the difference, write nothing.")
def sheet_in(file: Path, data: Path, dry_run: bool) -> None:
    """Take the edits in a workbook over into the tables, and show them.

    Only what was edited is written. Where the tables changed since the workbook was written,
    both are kept, and nothing is written when both changed the same place. Then the errors the
    check finds in the tables are shown.

    Exit status: 0 without errors, 1 with errors, 2 when the command was misused.
    """
    from generator import workbook
    from generator.checks import check_folder

    try:
        plan = workbook.read(data, file)
        click.echo(plan.summary())
        with plan.tried() as folder:
            errors = [p for p in check_folder(folder) if p.severity == "error"]
    except DatasetError as error:
        report(error.problems)
        click.echo("Nothing was written.")
        sys.exit(1)
    if plan.files and not dry_run:
        workbook.apply(plan)
        click.echo(f"written to {data}")
    if errors:
        click.echo("\nThe tables then have errors, and are not published until they are mended:\n")
        report(errors)
        sys.exit(1)


@click.command("changes")
@click.argument("old", default="site")
@click.argument("new", required=False)
@CONFIG
@click.option("--json", "as_json", is_flag=True, help="The changes as JSON, for machines.")
@click.option("--record", is_flag=True, help="Write them into the table of revisions.")
@click.option("--note", default="", help="Why, for the record; a summary unless given.")
@click.option(
    "--date", type=click.DateTime(["%Y-%m-%d"]), help="For the record; today unless given."
)
def changes_(
    old: str,
    new: str | None,
    config: Path,
    as_json: bool,
    record: bool,
    note: str,
    date: datetime | None,
) -> None:
    """Say what differs between two versions of the tables, and what follows from it.

    OLD and NEW are folders of tables, folders of a published handbook, or git revisions: the
    published handbook and the tables as they are, unless given. Cells, numbers (also in units of
    their standard uncertainty), signs and classes, findings, and printed sheets out of date.
    """
    from generator import changes, changetext, history, plugin, ready, versions

    if record and new:
        raise click.UsageError("only what led to the tables as they are is recorded: leave NEW out")
    if not record and (note or date):
        raise click.UsageError("--note and --date belong to --record")
    try:
        known = plugin.configured(config)
        found = changes.between(
            old, new or str(known.data), known.data, known.settings, config.parent / ".cache"
        )
        if record:
            day = (date or datetime.now()).date().isoformat()
            history.record(known.data, changetext.events(found, day, note))
    except (versions.UnknownVersionError, ready.Refused) as error:
        raise click.UsageError(str(error)) from error
    except DatasetError as error:
        report(error.problems)
        sys.exit(1)
    if as_json:
        click.echo(json.dumps(changetext.as_dict(found), ensure_ascii=False, indent=1))
    else:
        click.echo(changetext.text(found))
        if record:
            click.echo(f"\nrecorded as {found.new}")
