"""The page shows everything, escapes everything and needs nothing beside itself."""

import re
from dataclasses import replace
from html.parser import HTMLParser

import numpy as np
import pytest

from panelkit.records import (
    RESEARCH_USE,
    Aftermath,
    Choice,
    Findings,
    Frontier,
    ShortlistTable,
)
from panelkit.report import render
from panelkit.report.contrasts import kept_rows
from panelkit.report.page import SECTIONS
from panelkit.report.wording import printable

VOID = {"meta", "link", "br", "hr", "img", "input"}


class Page(HTMLParser):
    """Tags, attributes, headings, text of the page; complains of bad nesting."""

    def __init__(self, content):
        super().__init__(convert_charrefs=True)
        self.tags, self.attributes, self.words = [], [], []
        self.headings, self.ids, self.open = [], [], []
        self.feed(content.decode())
        self.close()
        assert self.open == []
        self.text = " ".join("".join(self.words).split())

    def handle_starttag(self, tag, attrs):
        self.note(tag, attrs)
        if tag not in VOID:
            self.open.append(tag)

    def handle_startendtag(self, tag, attrs):
        self.note(tag, attrs)

    def note(self, tag, attrs):
        self.tags.append(tag)
        self.attributes += [(tag, *pair) for pair in attrs]
        if tag == "bdi":
            self.ids.append("")
        if tag == "h2":
            self.headings.append("")

    def handle_endtag(self, tag):
        assert self.open.pop() == tag

    def handle_data(self, data):
        if "style" in self.open:
            return
        self.words.append(data)
        if "bdi" in self.open:
            self.ids[-1] += data
        if self.open[-1:] == ["h2"]:
            self.headings[-1] += data


@pytest.fixture(scope="module")
def files(summary):
    return render(summary)


@pytest.fixture(scope="module")
def page(files):
    return Page(files["report.html"])


def test_two_calls_give_the_same_bytes(summary, files):
    assert render(summary) == files


def test_the_users_own_drawing_settings_change_nothing(summary, files):
    import matplotlib

    with matplotlib.rc_context({"font.size": 30.0, "axes.facecolor": "red"}):
        before = dict(matplotlib.rcParams)
        assert render(summary) == files
        assert dict(matplotlib.rcParams) == before


def test_the_files_are_a_page_and_pairs_of_picture_and_table(files):
    names = {
        "selection_frequency",
        "accuracy_by_size",
        "cost_and_accuracy",
        "lost_markers",
        "accuracy_by_people",
        "accuracy_by_group",
    }
    assert set(files) == {"report.html"} | {
        path for name in names for path in (f"figures/{name}.svg", f"tables/{name}.csv")
    }


def test_nothing_outside_the_page_is_asked_for(page, files):
    for tag, name, value in page.attributes:
        if name in {"src", "href", "xlink:href", "srcset", "action", "data"}:
            assert value.startswith("#"), (tag, name, value)
    text = files["report.html"].decode()
    assert "@import" not in text
    assert re.findall(r"url\((?!#)", text) == []
    assert not {"script", "link", "iframe", "object", "img"} & set(page.tags)


def test_every_reference_inside_the_page_has_one_target(page):
    targets = [value for _, name, value in page.attributes if name == "id"]
    assert len(targets) == len(set(targets))
    hrefs = {v[1:] for _, n, v in page.attributes if n in {"href", "xlink:href"}}
    assert hrefs <= set(targets)
    clips = {v[5:-1] for _, n, v in page.attributes if n == "clip-path"}
    assert clips <= set(targets)


def test_hostile_ids_come_out_as_text(page, files):
    assert not [pair for pair in page.attributes if pair[1].startswith("on")]
    text = files["report.html"].decode()
    assert "<script" not in text
    assert not re.search("[\u202a-\u202e\u2066-\u2069]", text)
    for path, content in files.items():
        if path.endswith(".svg"):
            assert b"<script" not in content
            assert "\u202e" not in content.decode()


def test_every_marker_is_named_and_those_of_the_panel_are_marked(page, summary):
    shown = set(page.ids)
    for row in summary.frontier.rows:
        assert {printable(marker, keep="") for marker in row.markers} <= shown
    first_screen = page.text[: page.text.index("What to worry about")]
    assert first_screen.count("error-controlled") == 4
    assert first_screen.count("candidate only") == 4


def test_all_sections_stand_on_the_page(page):
    headings = [" ".join(heading.split()) for heading in page.headings]
    for heading in (
        "Accuracy to expect",
        "Chosen panel",
        "What to worry about",
        *SECTIONS.values(),
    ):
        assert heading in headings


def test_the_first_screen_holds_the_answer(page, summary):
    start = page.text[: page.text.index("Participant flow")]
    assert RESEARCH_USE in start
    assert summary.choice.headline.metric_of in start
    assert summary.choice.headline.sentence in start
    assert "0.786 95 % interval 0.702 to 0.851" in start
    assert "29.80 EUR on plate-384" in start
    assert "0.450 predicted chances are too extreme to use" in start
    assert start.index("41 of 44") < start.index("Predicted chances are far")
    assert start.index("Predicted chances are far") < start.index("There are 44")


def test_sentences_of_the_summary_are_all_there(page, summary):
    for sentence in (
        summary.bound.sentence(),
        summary.scheme,
        *summary.preparation,
        *summary.statement.values(),
        *summary.provenance.values(),
        *(rule.sentence for rule in summary.choice.rules),
        *(other.sentence for other in kept_rows(summary)),
        "missing: the study file does not say",
        "Meinshausen & Bühlmann 2010",
        "55,200.75",
        "65,820.75",
    ):
        assert " ".join(sentence.split()) in page.text


def test_the_primary_rule_comes_first(page):
    choice = page.text[page.text.index("primary, written in the study file") - 60 :]
    assert choice.index("smallest-within-one-se") < choice.index("best-under-budget")


def test_missing_figures_are_said_in_words(page):
    words = re.findall(r"[a-z]+", page.text.lower())
    assert "nan" not in words
    assert not re.search(r"\bNone\b", page.text)
    assert "not estimated" in page.text
    assert "no interval" in page.text


def test_a_run_without_prices_shows_no_money(unpriced):
    files = render(unpriced)
    page = Page(files["report.html"])
    assert "figures/cost_and_accuracy.svg" not in files
    assert "Cost per result" not in page.text
    assert "Nothing was priced" in page.text


def test_a_run_that_found_nothing_still_renders(summary):
    """No pick, no panel, no rule, no finding: every section says so."""
    table = summary.shortlist
    none = {name: getattr(table, name)[:0] for name in ShortlistTable.__slots__}
    headline = replace(
        summary.choice.headline,
        metric=np.nan,
        metric_low=np.nan,
        metric_high=np.nan,
        declared=False,
    )
    bare = replace(
        summary,
        findings=Findings(),
        flow=(),
        preparation=(),
        shortlist=ShortlistTable(**none),
        frontier=Frontier(()),
        choice=Choice(headline, ()),
        comparators=(),
        costs=(),
        statement={},
        provenance={},
        aftermath=Aftermath((), (), (), (), (), ()),
        fold_costs=None,
    )
    files = render(bare)
    page = Page(files["report.html"])
    assert set(files) == {"report.html"}
    assert "not estimated no interval" in page.text
    assert "exploratory" in page.text
    assert "The shortlist is empty" in page.text
    assert "nan" not in re.findall(r"[a-z]+", page.text.lower())


def test_a_slope_that_is_not_known_is_no_alarm(summary):
    """univariate-11 has a slope of NaN: neither praised nor blamed."""
    rules = tuple(replace(rule, primary=False) for rule in summary.choice.rules[:1])
    other = replace(summary, choice=replace(summary.choice, rules=rules))
    page = Page(render(other)["report.html"])
    assert "Calibration slope not estimated" in page.text
    assert "too extreme to use" not in page.text
