"""The command ``datasheets``: add substances, check the tables, build the handbook."""

from __future__ import annotations

import json
import sys
import time
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from datetime import datetime
from pathlib import Path

import click

from generator.buildcommands import build, serve
from generator.errors import DatasetError, Problem
from generator.numbercommands import explain, table
from generator.tablecommands import CONFIG, DATA, changes_, report, sheet


@click.group(context_settings={"help_option_names": ["-h", "--help"]})
def main() -> None:
    """Check the solvent tables, let them grow, and build the handbook from them."""


main.add_command(build)
main.add_command(serve)
main.add_command(sheet)
main.add_command(changes_)
main.add_command(explain)
main.add_command(table)


@main.command()
@DATA
@click.option("--json", "as_json", is_flag=True, help="Findings as JSON, for machines.")
def check(data: Path, as_json: bool) -> None:
    """Report everything wrong or doubtful in the tables, all at once.

    Exit status: 0 without errors, 1 with errors, 2 when the command was misused.
    """
    from generator.build import findings_of
    from generator.cache import Cache

    findings: tuple[Problem, ...]
    try:
        findings = findings_of(data, Cache(data.parent / ".cache"))
    except DatasetError as error:
        findings = error.problems
    errors, suspects, notes = (
        sum(finding.severity == severity for finding in findings)
        for severity in ("error", "suspect", "note")
    )
    if as_json:
        click.echo(json.dumps([f.as_dict() for f in findings], ensure_ascii=False, indent=1))
    else:
        report(findings)
        click.echo(f"Errors: {errors}. Suspect values: {suspects}. Notes: {notes}.")
    sys.exit(1 if errors else 0)


@main.command()
@click.argument("names", metavar="NAME-OR-CAS...", nargs=-1)
@DATA
@click.option("--dry-run", is_flag=True, help="Show the rows, write nothing.")
@click.option(
    "--all-liquids",
    is_flag=True,
    help="Every substance with a published permittivity and a usable structure.",
)
def add(names: tuple[str, ...], data: Path, dry_run: bool, all_liquids: bool) -> None:
    """Add substances from the open reference tables: identity, quantities, sources.

    A substance that is already there is left alone; rows typed by the laboratory are never
    touched. A name that fits several substances is refused with the candidates.
    """
    from generator import additions

    if bool(names) == all_liquids:
        raise click.UsageError("give names or CAS numbers, or --all-liquids")
    try:
        plan = additions.plan(data, names, all_liquids=all_liquids)
    except DatasetError as error:
        report(error.problems)
        sys.exit(1)
    click.echo(plan.summary(rows=dry_run))
    if plan.refusals:
        sys.exit(1)
    if not dry_run:
        additions.apply(plan)


@main.command("print")
@click.argument("solvents", metavar="SOLVENT...", nargs=-1)
@click.option("--location", default="", help="Those with a container at this place.")
@click.option("--all", "everything", is_flag=True, help="All substances of the handbook.")
@click.option(
    "--changed",
    metavar="OLD",
    help="Those whose sheet says something else than in OLD: a published handbook, a folder of "
    "tables, or a git revision.",
)
@click.option(
    "--as",
    "kind",
    type=click.Choice(["sheets", "booklet", "labels"]),
    default="sheets",
    show_default=True,
    help="One page each; the same with contents and index; shelf labels.",
)
@click.option("--paper", type=click.Choice(["A4", "Letter"]), help="Instead of the setting.")
@click.option("--label-sheet", metavar="SIZE", help="Instead of the setting.")
@click.option("--start", default=1, show_default=True, help="First free label of the first sheet.")
@click.option("--date", type=click.DateTime(["%Y-%m-%d"]), help="Print date, today unless given.")
@click.option(
    "--out",
    type=click.Path(path_type=Path, dir_okay=False),
    help="The PDF to write, named after its kind unless given.",
)
@CONFIG
def print_(
    solvents: tuple[str, ...],
    location: str,
    everything: bool,
    changed: str | None,
    kind: str,
    paper: str | None,
    label_sheet: str | None,
    start: int,
    date: datetime | None,
    out: Path | None,
    config: Path,
) -> None:
    """Print stockroom sheets, a booklet or shelf labels as PDF.

    SOLVENT is a short name, name, synonym or CAS number of the handbook.
    """
    from generator import changes, plugin, printing, ready, selection, versions

    if [bool(solvents), bool(location), everything, bool(changed)].count(True) != 1:
        raise click.UsageError("name substances, or give --location, --changed or --all")
    begun = time.monotonic()
    out = out or Path(f"{kind}.pdf")
    try:
        known = plugin.configured(config)
        if changed:
            cache, now = config.parent / ".cache", str(known.data)
            solvents = changes.between(changed, now, known.data, known.settings, cache).outdated
            if not solvents:
                click.echo(f"no sheet says anything else than in {changed}")
                return
        order = printing.Order(
            kind=kind,
            names=solvents,
            location=location,
            paper=paper or known.settings.paper,
            date=(date or datetime.now()).date(),
            site=known.site,
            label_sheet=label_sheet or known.label_sheet,
            start=start,
        )
        with _progress(printing.STAGES) as say:
            made = printing.produce(
                known.data, known.settings, config.parent / ".cache", order, say
            )  # fmt: skip
    except (selection.OrderError, versions.UnknownVersionError) as error:
        raise click.UsageError(str(error)) from error
    except DatasetError as error:
        report(error.problems)
        sys.exit(1)
    except (ready.Refused, click.Abort) as error:
        click.echo(str(error), err=True)
        sys.exit(1)
    out.parent.mkdir(parents=True, exist_ok=True)
    out.write_bytes(made.pdf)
    size, seconds = len(made.pdf) / 1e6, time.monotonic() - begun
    click.echo(f"{out}: {made.count} substances, {size:.1f} MB, {seconds:.1f} s")


@contextmanager
def _progress(stages: int) -> Iterator[Callable[[str], None]]:
    """A bar on a terminal, a line for each stage in a log."""
    if not sys.stderr.isatty():
        yield lambda stage: click.echo(stage, err=True)
        return
    with click.progressbar(length=stages, file=sys.stderr, show_eta=False) as bar:

        def say(stage: str) -> None:
            bar.label = f"{stage:<36}"
            bar.update(1)

        yield say
