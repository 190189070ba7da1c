"""Commands about numbers: how one came about, and tables of chosen ones."""

from __future__ import annotations

import json
import sys
from dataclasses import asdict
from pathlib import Path

import click

from generator.errors import DatasetError
from generator.tablecommands import DATA, report


@click.command()
@click.argument("solvent")
@click.argument("quantity")
@DATA
@click.option(
    "--temperature",
    type=float,
    help="In °C; without it, the reference temperature of the substance.",
)
@click.option("--json", "as_json", is_flag=True, help="The whole trail as JSON, for machines.")
def explain(
    solvent: str, quantity: str, data: Path, temperature: float | None, as_json: bool
) -> None:
    """Say how a number came about: formula, inputs and their shares, sources, weights, rejections.

    SOLVENT is a name, a CAS number or the name of a datasheet; QUANTITY a name, key or symbol.
    """
    from generator import explain as explaining
    from generator.dataset import load_dataset
    from generator.metrics import Settings
    from generator.selection import OrderError, choose
    from generator.units import ZERO_CELSIUS

    try:
        dataset = load_dataset(data)
        (slug,) = choose(dataset, [solvent])
        key = explaining.find_quantity(quantity)
    except DatasetError as error:
        report(error.problems)
        sys.exit(1)
    except OrderError as error:
        raise click.UsageError(str(error)) from error
    kelvin = None if temperature is None else temperature + ZERO_CELSIUS
    handbook, way = explaining.explain(dataset, Settings(), slug, key, kelvin)
    if as_json:
        click.echo(json.dumps(asdict(way), ensure_ascii=False, indent=1))
    else:
        click.echo(dataset.solvents[slug].name)
        for line in explaining.lines(handbook, way):
            click.echo(line)
    if way.value is None:
        sys.exit(1)


@click.command()
@click.argument("quantities", metavar="QUANTITY...", nargs=-1, required=True)
@DATA
@click.option("--temperature", type=float, default=25.0, show_default=True, help="In °C.")
@click.option("--family", default="", help="Only families with this word in their name.")
@click.option("--uncertainties", is_flag=True, help="The standard uncertainty beside each value.")
@click.option(
    "--out",
    type=click.Path(path_type=Path, dir_okay=False),
    help="A CSV file to write instead of the table on the terminal.",
)
def table(
    quantities: tuple[str, ...],
    data: Path,
    temperature: float,
    family: str,
    uncertainties: bool,
    out: Path | None,
) -> None:
    """A table of chosen quantities at one temperature, the first one sorted downwards.

    QUANTITY is a name, key or symbol.
    """
    from generator import frames
    from generator.dataset import load_dataset
    from generator.explain import find_quantity
    from generator.metrics import Settings, compute
    from generator.selection import OrderError

    try:
        keys = [find_quantity(quantity) for quantity in quantities]
        handbook = compute(load_dataset(data), Settings(temperatures_c=(temperature,)))
    except DatasetError as error:
        report(error.problems)
        sys.exit(1)
    except OrderError as error:
        raise click.UsageError(str(error)) from error
    made = frames.table(
        frames.values(handbook), keys, temperature, family=family, uncertainties=uncertainties
    )
    if out is None:
        shown = made.to_string(float_format="{:.5g}".format, na_rep="–", index_names=False)
        click.echo(shown if len(made) else "No substance has any of them there.")
    else:
        made.to_csv(out)
        click.echo(f"{out}: {len(made)} substances")
