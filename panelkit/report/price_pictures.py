"""The pictures of `panelkit price`, each with its numbers and a caption."""

from collections.abc import Sequence
from decimal import Decimal

from matplotlib.axes import Axes
from matplotlib.ticker import FuncFormatter, MaxNLocator

from panelkit.records import LINE_WORDS, BreakEven, PriceAnswer, ScenarioAnswer
from panelkit.report.canvas import (
    FAINT,
    INK,
    PAPER,
    SERIES,
    drawable,
    new_figure,
    settings,
    svg_bytes,
)
from panelkit.report.pictures import Picture
from panelkit.report.tables import Table, csv_bytes
from panelkit.report.wording import three_figures

__all__ = ["draw_prices"]

LONGEST_NAME = 26
MOST_BARS = 25


def draw_prices(answer: PriceAnswer) -> tuple[Picture, ...]:
    """Return the pictures that an answer gives rise to.

    Parameters
    ----------
    answer : PriceAnswer
        Priced scenarios.

    Returns
    -------
    tuple of Picture
        Where the money goes, cost against size, what leaving a marker out saves and,
        where it was asked for, the break-even.
    """
    pictures = []
    with settings():
        pictures.append(_lines(answer))
        for scenario in answer.scenarios:
            if len(scenario.stairs) > 1:
                pictures.append(_stairs(answer, scenario))
            if len(scenario.drivers) > 1:
                pictures.append(_drivers(answer, scenario))
        if answer.break_even is not None and answer.break_even.samples:
            pictures.append(_break_even(answer, answer.break_even))
    return tuple(pictures)


def _money_axis(axes: Axes, which: str) -> None:
    axis = axes.xaxis if which == "x" else axes.yaxis
    axis.set_major_formatter(FuncFormatter(lambda value, _: f"{value:,.0f}"))
    axis.set_major_locator(MaxNLocator(nbins=5))


def _titled(scenario: ScenarioAnswer, answer: PriceAnswer) -> str:
    if len(answer.scenarios) == 1:
        return ""
    return f" ({scenario.name})"


def _lines(answer: PriceAnswer) -> Picture:
    names = list(
        dict.fromkeys(
            line.name
            for scenario in answer.scenarios
            for line in scenario.cost.lines
            if line.amount
        )
    )
    figure, axes = new_figure(0.9 + 0.34 * max(len(names), 2) * 1.15)
    axes.grid(axis="x")
    n = len(answer.scenarios)
    height = 0.8 / n
    for k, scenario in enumerate(answer.scenarios):
        values = [float(scenario.cost.line(name)) for name in names]
        places = [i + (k - (n - 1) / 2) * height for i in range(len(names))]
        axes.barh(
            places,
            values,
            height * 0.92,
            color=SERIES[k].colour,
            label=f"{scenario.name}: {len(scenario.markers)} markers on "
            f"{drawable(scenario.cost.platform, LONGEST_NAME)}",
        )
    axes.set_yticks(range(len(names)), [LINE_WORDS.get(each, each) for each in names])
    axes.invert_yaxis()
    axes.set_xlim(left=0)
    _money_axis(axes, "x")
    axes.set_xlabel(f"programme cost ({answer.currency})")
    if n > 1:
        figure.legend(loc="outside upper left", ncols=1)
    rows: Table = [
        ("scenario", "platform", "line", "amount", "amount_high", "currency")
    ]
    rows += [
        (
            s.name,
            s.cost.platform,
            each.name,
            each.amount,
            each.amount_high,
            answer.currency,
        )
        for s in answer.scenarios
        for each in s.cost.lines
    ]
    first = answer.scenarios[0].cost
    largest = max(first.lines, key=lambda each: each.amount)
    share = float(largest.amount / first.total) if first.total else 0.0
    return Picture(
        name="cost_lines",
        title="Where the money goes",
        caption=f"{LINE_WORDS.get(largest.name, largest.name).capitalize()} is the "
        f"largest line of scenario A: {100 * share:.0f} % of "
        f"{three_figures(float(first.total))} {answer.currency}.",
        svg=svg_bytes(figure),
        table=csv_bytes(rows),
    )


def _stairs(answer: PriceAnswer, scenario: ScenarioAnswer) -> Picture:
    stairs = [each for each in scenario.stairs if each.total is not None]
    figure, axes = new_figure(3.7)
    axes.grid(axis="y")
    axes.plot(
        [each.size for each in stairs],
        [float(each.total or 0) for each in stairs],
        drawstyle="steps-mid",
        color=SERIES[0].colour,
        marker=SERIES[0].marker,
        markersize=4,
    )
    own = len(scenario.markers)
    axes.plot(
        [own],
        [float(scenario.cost.total)],
        "o",
        markersize=13,
        markerfacecolor="none",
        markeredgecolor=INK,
        markeredgewidth=1.4,
    )
    _label_steps(axes, stairs)
    axes.xaxis.set_major_locator(MaxNLocator(integer=True))
    axes.set_ylim(bottom=0)
    axes.margins(y=0.12)
    _money_axis(axes, "y")
    axes.set_xlabel("panel size (markers, in the order given)")
    axes.set_ylabel(f"programme cost ({answer.currency})")
    rows: Table = [
        ("size", "marker", "total", "cost_per_result", "marginal", "step", "currency")
    ]
    rows += [
        (
            each.size, each.marker, each.total, each.cost_per_result, each.marginal,
            each.step, answer.currency,
        )
        for each in scenario.stairs
    ]  # fmt: skip
    down = scenario.step_down
    said = (
        "No smaller panel saves a step."
        if down is None
        else f"The next step down: remove {down.remove} of {own} markers to save "
        f"{down.saves}, {three_figures(float(down.saving))} {answer.currency}."
    )
    return Picture(
        name=f"cost_by_size_{scenario.name.lower()}",
        title=f"Cost against size{_titled(scenario, answer)}",
        caption=f"{said} The ring is the panel of {own}.",
        svg=svg_bytes(figure),
        table=csv_bytes(rows),
    )


def _label_steps(axes: Axes, stairs: Sequence[object]) -> None:
    """Write the largest jumps beside their step."""
    jumps = [each for each in stairs if getattr(each, "marginal", None)]
    jumps.sort(key=lambda each: -getattr(each, "marginal", Decimal(0)))
    usual = jumps[len(jumps) // 2] if jumps else None
    for each in jumps[:3]:
        marginal = getattr(each, "marginal", Decimal(0))
        if usual is None or marginal <= Decimal("1.5") * getattr(usual, "marginal", 0):
            continue
        axes.annotate(
            f"+{marginal:,.0f}",
            (getattr(each, "size", 0), float(getattr(each, "total", 0) or 0)),
            xytext=(-7, 4),
            textcoords="offset points",
            ha="right",
            fontsize=8.5,
            color=INK,
        )


def _drivers(answer: PriceAnswer, scenario: ScenarioAnswer) -> Picture:
    shown = list(scenario.drivers[:MOST_BARS])
    figure, axes = new_figure(0.9 + 0.24 * max(len(shown), 3))
    axes.grid(axis="x")
    places = range(len(shown))
    own = [float((d.own_one_off or 0) + (d.own_reagent or 0)) for d in shown]
    saving = [float(d.saving or 0) for d in shown]
    axes.barh(
        places, saving, 0.78, color=SERIES[0].colour, label="saved by leaving it out"
    )
    axes.plot(
        own,
        list(places),
        SERIES[1].marker,
        color=SERIES[1].colour,
        markeredgecolor=PAPER,
        markersize=7,
        linestyle="none",
        label="its own development and reagent",
    )
    axes.set_yticks(list(places), [drawable(d.marker, LONGEST_NAME) for d in shown])
    axes.invert_yaxis()
    axes.set_xlim(left=0)
    _money_axis(axes, "x")
    axes.set_xlabel(f"{answer.currency} over the programme")
    figure.legend(loc="outside upper left", ncols=2)
    rows: Table = [
        ("marker", "saving", "own_one_off", "own_reagent", "by_kit", "currency")
    ]
    rows += [
        (d.marker, d.saving, d.own_one_off, d.own_reagent, d.by_kit, answer.currency)
        for d in scenario.drivers
    ]
    top = scenario.drivers[0]
    free = [d.marker for d in scenario.drivers if d.saving is not None and not d.saving]
    caption = (
        f"Leaving out {drawable(top.marker, LONGEST_NAME)} saves most: "
        f"{three_figures(float(top.saving or 0))} {answer.currency}. Savings are not "
        "shares: they do not add up to the total."
    )
    if free:
        caption += f" {len(free)} markers save nothing alone: a kit holds them anyway."
    return Picture(
        name=f"cost_drivers_{scenario.name.lower()}",
        title=f"What leaving one marker out saves{_titled(scenario, answer)}",
        caption=caption,
        svg=svg_bytes(figure),
        table=csv_bytes(rows),
    )


def _break_even(answer: PriceAnswer, found: BreakEven) -> Picture:
    figure, axes = new_figure(3.7)
    axes.grid(axis="y")
    for k, totals in enumerate((found.total_a, found.total_b)):
        scenario = answer.scenarios[k]
        axes.plot(
            found.samples,
            [float(total) for total in totals],
            color=SERIES[k].colour,
            linestyle=SERIES[k].line,
            drawstyle="steps-post",
            label=f"{scenario.name}: {len(scenario.markers)} markers on "
            f"{drawable(scenario.cost.platform, LONGEST_NAME)}",
        )
    at = dict(zip(found.samples, found.total_a, strict=True))
    for crossing in found.crossings:
        axes.axvline(
            crossing.samples, color=FAINT, linewidth=0.8, linestyle=(0, (2, 2))
        )
    if found.crossings:
        last = found.crossings[-1]
        axes.annotate(
            f"{last.samples:,}",
            (last.samples, float(at.get(last.samples, Decimal(0)))),
            xytext=(8, -14),
            textcoords="offset points",
            color=INK,
        )
    axes.set_xlim(left=0)
    axes.set_ylim(bottom=0)
    axes.xaxis.set_major_locator(MaxNLocator(integer=True))
    _money_axis(axes, "y")
    axes.set_xlabel("results wanted")
    axes.set_ylabel(f"programme cost ({answer.currency})")
    figure.legend(loc="outside upper left", ncols=1)
    rows: Table = [("samples", "total_a", "total_b", "currency")]
    rows += [
        (n, a, b, answer.currency)
        for n, a, b in zip(found.samples, found.total_a, found.total_b, strict=True)
    ]
    return Picture(
        name="break_even",
        title="From which number of samples B pays",
        caption=_break_even_caption(found),
        svg=svg_bytes(figure),
        table=csv_bytes(rows),
    )


def _break_even_caption(found: BreakEven) -> str:
    if found.first is None:
        return f"B is not cheaper than A at any number up to {found.largest:,}."
    if found.stays_from == 1:
        return f"B is cheaper at every number of samples up to {found.largest:,}."
    parts = [f"B is cheaper for the first time at {found.first:,} samples"]
    if found.crossings:
        crossed = ", ".join(f"{each.samples:,}" for each in found.crossings[:8])
        parts.append(f"the cheaper one changes at {crossed}")
    if found.stays_from is not None:
        parts.append(
            f"from {found.stays_from:,} on B stays cheaper up to {found.largest:,}"
        )
    return "; ".join(parts) + "."
