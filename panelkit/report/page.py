"""The page: one HTML file that needs nothing beside itself."""

from functools import partial
from typing import Any

from jinja2 import Environment, PackageLoader, StrictUndefined
from markupsafe import Markup

from panelkit.records import RESEARCH_USE, RunSummary
from panelkit.report import wording
from panelkit.report.aftermath_view import view_of
from panelkit.report.aftermath_words import (
    event_words,
    how_words,
    signed,
    signed_interval,
    statistic_words,
)
from panelkit.report.canvas import inline
from panelkit.report.contrasts import kept_rows, named
from panelkit.report.methods import (
    CAUTIONS,
    COST_LINES,
    STATEMENTS,
    methods_of,
    sources_of,
)
from panelkit.report.outcome_words import words_of
from panelkit.report.picks import (
    MARKS,
    SLOPE_FLOOR,
    chosen_cost,
    chosen_row,
    currency,
    is_priced,
    mark_of,
    ordered_rules,
    primary_rule,
    row_named,
    shared_lines,
)
from panelkit.report.pictures import Picture, draw_all
from panelkit.report.ruler import ruler
from panelkit.report.worries import worries_of

__all__ = ["SECTIONS", "render"]

N_SHORTLIST_ROWS = 40
N_WORRIES = 5
FIGURE_WORDS = {
    "metric": "accuracy on the curve",
    "best_metric": "the best of the curve",
    "difference_to_best": "difference to the best",
    "difference_se_corrected": "its standard error, corrected",
    "difference_se_naive": "its standard error, plain",
    "size": "markers",
}
SECTIONS = {
    "flow": "Participant flow",
    "findings": "Findings",
    "preparation": "Preparation",
    "shortlist": "Shortlist",
    "panels": "Panels",
    "choice": "Choice",
    "comparators": "Comparators",
    "stand-ins": "Stand-ins",
    "fragility": "Fragility",
    "people": "More people",
    "subgroups": "Subgroups",
    "added-value": "Added value",
    "handling": "Handling check",
    "cost": "Cost of the chosen panel",
    "statement": "Statement of the study",
    "methods": "How it was done",
    "provenance": "Provenance",
    "cautions": "Cautions",
}


def render(summary: RunSummary) -> dict[str, bytes]:
    """Return every file of the report.

    Parameters
    ----------
    summary : RunSummary
        A finished run.

    Returns
    -------
    dict of str to bytes
        Path within the run folder to content: ``report.html``, ``figures/*.svg`` and
        the numbers behind each figure as ``tables/*.csv``. The same summary always
        gives the same bytes.
    """
    pictures = draw_all(summary)
    files = {"report.html": _page(summary, pictures)}
    for picture in pictures:
        files[f"figures/{picture.name}.svg"] = picture.svg
        files[f"tables/{picture.name}.csv"] = picture.table
    return files


def _page(summary: RunSummary, pictures: tuple[Picture, ...]) -> bytes:
    html = (
        _environment()
        .get_template("page.html")
        .render(
            summary=summary,
            sections=SECTIONS,
            research_use=RESEARCH_USE,
            pictures={picture.name: picture for picture in pictures},
            drawn={
                picture.name: inline(picture.svg, picture.name, picture.title)
                for picture in pictures
            },
            headline_ruler=_ruler_of(summary),
            headline_interval=_interval_of(summary),
            n_stops=len(summary.findings.of("stop")),
            worries=worries_of(summary),
            n_worries=N_WORRIES,
            row=chosen_row(summary),
            rule=primary_rule(summary),
            rules=[
                (rule, row_named(summary, rule.panel))
                for rule in ordered_rules(summary)
            ],
            cost=chosen_cost(summary),
            cost_lines=shared_lines(summary.costs),
            line_names=COST_LINES,
            currency=currency(summary),
            priced=is_priced(summary),
            slope_floor=SLOPE_FLOOR,
            picked=mark_of(summary),
            marks=MARKS,
            n_shortlist=min(N_SHORTLIST_ROWS, len(summary.shortlist.feature)),
            statement={
                key.replace("_", " "): text for key, text in summary.statement.items()
            },
            expected_statements=STATEMENTS,
            methods=methods_of(summary),
            sources=sources_of(summary),
            after=view_of(summary),
            kept_comparators=kept_rows(summary),
            named=partial(named, summary),
            outcome_words=words_of(summary.metric),
            metric_title=sentence_case(summary.metric_words),
            figure_words=FIGURE_WORDS,
            cautions=CAUTIONS,
        )
    )
    tidy = "\n".join(line.rstrip() for line in html.splitlines() if line.strip())
    return f"{tidy}\n".encode("utf-8", errors="xmlcharrefreplace")


def sentence_case(words: str) -> str:
    """Return words with a capital at the start; capitals inside them stay."""
    return words[:1].upper() + words[1:]


def _ruler_of(summary: RunSummary) -> Markup:
    headline = summary.choice.headline
    ends = headline.metric_low, headline.metric_high
    return ruler(headline.metric, *ends, summary.no_skill)


def _interval_of(summary: RunSummary) -> str:
    headline = summary.choice.headline
    said = wording.interval(headline.metric_low, headline.metric_high)
    return (
        said
        if said == wording.NO_INTERVAL
        else f"{100 * summary.confidence:g} % interval {said}"
    )


def _environment() -> Environment:
    """Return templates that escape everything and show no invisible sign."""
    environment = Environment(
        loader=PackageLoader("panelkit.report", "templates"),
        autoescape=True,
        undefined=StrictUndefined,
        finalize=_shown,
        trim_blocks=True,
        lstrip_blocks=True,
    )
    environment.filters.update(
        by_group=wording.by_group,
        decimals=wording.decimals,
        id=wording.identifier,
        how=how_words,
        event=event_words,
        statistic=statistic_words,
        signed=signed,
        signed_interval=signed_interval,
        sentence_case=sentence_case,
        interval=wording.interval,
        money=wording.money,
        three_figures=wording.three_figures,
    )
    return environment


def _shown(value: Any) -> Any:
    """Return a value for the page; Markup is made by us and stays as it is."""
    if isinstance(value, str) and not isinstance(value, Markup):
        return wording.printable(value)
    return value
