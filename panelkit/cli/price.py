"""``panelkit price``: what given marker lists cost, without expression data."""

from pathlib import Path

import click

from panelkit.cli.price_screen import show_answer
from panelkit.cli.screen import show_json
from panelkit.config import FAMILY_PRESETS, PRICING
from panelkit.errors import UsageError
from panelkit.workflow import (
    PriceRequest,
    PriceSource,
    price_content,
    price_panels,
    write_prices,
)

__all__ = ["command"]

FILE = click.Path(path_type=Path)


def _pairs(_ctx: object, option: click.Parameter, values: tuple[str, ...]) -> object:
    """Read KEY=VALUE; the value may hold further signs of equality."""
    pairs = []
    for text in values:
        key, sign, value = text.partition("=")
        if not sign or not key.strip() or not value.strip():
            raise UsageError(
                code="setting-unreadable",
                where=f"{option.opts[0]} {text}",
                what=f"this sets no key to a value (got {text!r})",
                accepted="KEY=VALUE, such as samples=2000 or run_cost=35.00",
                next_step="Write the key, the sign = and the value without blanks",
            )
        pairs.append((key.strip(), value.strip()))
    return tuple(pairs)


def _lists(_ctx: object, option: click.Parameter, values: tuple[str, ...]) -> object:
    pairs = _pairs(_ctx, option, values)
    assert isinstance(pairs, tuple)
    return tuple((key, tuple(value.split(","))) for key, value in pairs)


@click.command("price")
@click.argument("markers", nargs=-1, required=True)
@click.option(
    "--from",
    "file",
    type=FILE,
    metavar="FILE",
    help="Programme, platforms and kits (TOML), or a study file.",
)
@click.option("--prices", type=FILE, metavar="FILE", help="Price list (CSV).")
@click.option(
    "--conflicts",
    type=FILE,
    metavar="FILE",
    help="Pairs of markers that must be kept apart (CSV).",
)
@click.option(
    "--family",
    type=click.Choice(list(FAMILY_PRESETS)),
    help="Without files: family of assays, for its usual geometry.",
)
@click.option("--samples", type=click.IntRange(1, 10**9), help="Results wanted.")
@click.option("--currency", metavar="CODE", help="Without files: such as EUR.")
@click.option("--reaction", metavar="PRICE", help="Without files: of one reaction.")
@click.option(
    "--development",
    metavar="PRICE",
    help="Without files: one-off cost of one marker.  [none]",
)
@click.option(
    "--set",
    "settings",
    multiple=True,
    callback=_pairs,
    metavar="KEY=VALUE",
    help="Set a key of the programme or of platforms (NAME.KEY for one).",
)
@click.option(
    "--platform",
    "platforms",
    multiple=True,
    metavar="NAME",
    help="Only this platform; may be repeated.  [all]",
)
@click.option(
    "--against",
    multiple=True,
    metavar="MARKERS",
    help="Compare with these markers as scenario B; a number takes the "
    "first so many of A.",
)
@click.option(
    "--against-platform",
    multiple=True,
    metavar="NAME",
    help="Compare with this platform as scenario B.",
)
@click.option(
    "--against-set",
    multiple=True,
    callback=_pairs,
    metavar="KEY=VALUE",
    help="Compare with this key set anew as scenario B.",
)
@click.option(
    "--break-even",
    type=click.IntRange(0, 10**6),
    metavar="SAMPLES",
    help="Find every number of samples up to this at which the cheaper "
    "scenario changes; 0 for twice the programme's.",
)
@click.option(
    "--change-cost",
    metavar="PRICE",
    help="One-off cost of going from A to B: months until it is paid.",
)
@click.option(
    "--vary",
    multiple=True,
    callback=_lists,
    metavar="KEY=V1,V2,...",
    help="Price each value of a key: samples, deliveries, replicates.",
)
@click.option(
    "--split",
    is_flag=True,
    help="Look for the cheapest use of several platforms for one panel.",
)
@click.option(
    "--land",
    type=click.IntRange(0, 10**4),
    metavar="K",
    help="How many designs must work: which spares to order; 0 for all.",
)
@click.option(
    "--chance",
    type=click.FloatRange(0, 1, min_open=True),
    default=PRICING.probability,
    show_default=True,
    help="With which probability they must.",
)
@click.option(
    "--spares",
    multiple=True,
    metavar="MARKERS",
    help="Stand-ins.  [those the price list declares, else its others]",
)
@click.option(
    "--out",
    type=FILE,
    metavar="FOLDER",
    help="Write pictures, their numbers and a spreadsheet here.",
)
@click.option("--no-workbook", is_flag=True, help="With --out: no spreadsheet.")
@click.option("--assumptions", is_flag=True, help="Show every value, defaults too.")
@click.option("--json", "as_json", is_flag=True, help="Print the answer as JSON.")
def command(  # noqa: PLR0913 - one parameter an option is how click hands them over
    markers: tuple[str, ...],
    file: Path | None,
    prices: Path | None,
    conflicts: Path | None,
    family: str | None,
    samples: int | None,
    currency: str | None,
    reaction: str | None,
    development: str | None,
    settings: tuple[tuple[str, str], ...],
    platforms: tuple[str, ...],
    against: tuple[str, ...],
    against_platform: tuple[str, ...],
    against_set: tuple[tuple[str, str], ...],
    break_even: int | None,
    change_cost: str | None,
    vary: tuple[tuple[str, tuple[str, ...]], ...],
    split: bool,
    land: int | None,
    chance: float,
    spares: tuple[str, ...],
    out: Path | None,
    no_workbook: bool,
    assumptions: bool,
    as_json: bool,
) -> None:
    """Price MARKERS: names, a file of names, or how many.

    \b
    Four inputs are enough:
      panelkit price 8 --family rt-qpcr --samples 500 --currency EUR --reaction 0.60
    Files know more:
      panelkit price 12 --from programme.toml --prices prices.csv --against 8
    """  # noqa: D301 - click reads this sign as: keep the lines
    source = PriceSource(
        file=file,
        prices=prices,
        conflicts=conflicts,
        family=family,
        samples=samples,
        currency=currency,
        reaction=reaction,
        development=development,
        settings=settings,
        platforms=platforms,
    )
    request = PriceRequest(
        markers=markers,
        source=source,
        against=against,
        against_platforms=against_platform,
        against_settings=against_set,
        compare=bool(against or against_platform or against_set),
        vary=vary,
        break_even=break_even,
        change_cost=change_cost,
        split=split,
        land=land,
        chance=chance,
        spares=spares,
    )
    answer = price_panels(request)
    written = [] if out is None else write_prices(answer, out, workbook=not no_workbook)
    if as_json:
        show_json(price_content(answer))
        return
    show_answer(answer, every_assumption=assumptions)
    if written:
        click.echo(f"Written to {out}: {', '.join(written)}.")
