"""Commands that make the handbook: build and preview."""

from __future__ import annotations

import sys
import time
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from pathlib import Path

import click

from generator.errors import DatasetError
from generator.tablecommands import CONFIG, report

_SITE = click.option(
    "--site",
    type=click.Path(path_type=Path, file_okay=False),
    default=Path("site"),
    show_default=True,
    help="Folder the finished handbook is put in.",
)


@click.command()
@CONFIG
@_SITE
def build(config: Path, site: Path) -> None:
    """Check the tables and build the handbook; the last good one stays if anything fails.

    What did not change since the last build is taken over. Exit status: 0 when the handbook is
    up to date, 1 when it could not be built, 2 when the command was misused.
    """
    from generator.publish import PublishError
    from generator.update import update

    start = time.monotonic()
    try:
        with _stages(start) as say:
            done = update(config, site, say)
    except DatasetError as error:
        report(error.problems)
        _give_up(f"{len(error.problems)} problems in the tables", site)
    except (PublishError, click.ClickException) as error:
        _give_up(str(error), site)
    except OSError as error:
        _give_up(f"{error.strerror or error}: {error.filename or config.parent}", site)
    seconds = f"{time.monotonic() - start:.1f} s"
    whole = f"{done.substances} substances, {done.pages} pages"
    suspects = f"suspect values: {done.findings.get('suspect', 0)}"
    if done.changed:
        click.echo(f"{site}: {whole}, {done.anew} of them new or changed; {suspects}; {seconds}")
    else:
        click.echo(f"{site}: nothing has changed; {whole}; {suspects}; {seconds}")


@click.command()
@CONFIG
@click.option("--port", default=8000, show_default=True, help="Port on this machine.")
def serve(config: Path, port: int) -> None:
    """Preview the handbook while the tables are edited; nothing is published.

    Saving a table, a page or a template updates the page that is open in a browser. While the
    tables are broken, it shows what is wrong with them.
    """
    from generator import preview

    try:
        preview.serve(config, port, lambda text: click.echo(text, err=True))
    except OSError as error:
        raise click.ClickException(f"port {port}: {error.strerror}; try another --port") from error


def _give_up(reason: str, site: Path) -> None:
    click.echo(f"{reason}\nNothing was published; {site} is as it was.", err=True)
    sys.exit(1)


@contextmanager
def _stages(start: float) -> Iterator[Callable[[str], None]]:
    """What is being done: on a terminal one line that changes, in a log a line for each stage."""
    shown = sys.stderr.isatty()

    def say(stage: str) -> None:
        passed = f"{time.monotonic() - start:6.1f} s  {stage}"
        click.echo(f"\r\x1b[2K{passed}" if shown else passed, err=True, nl=not shown)

    try:
        yield say
    finally:
        if shown:
            click.echo("\r\x1b[2K", err=True, nl=False)
