"""Sections and worries about what a panel loses, gains and depends on."""

import csv
import io
import re
from dataclasses import replace

import numpy as np
import pytest

from panelkit.records import Aftermath, Comparator, Handling, LearningPoint, Subgroup
from panelkit.report import render
from panelkit.report.aftermath_words import (
    added_value_words,
    fatal_losses,
    fragility_caption,
    is_rising,
    learning_words,
    signed,
    subgroup_caption,
)
from panelkit.report.contrasts import kept_rows, label_of, lines_across
from panelkit.report.draw_fragility import fragility_rows
from panelkit.report.methods import methods_of, sources_of
from panelkit.report.worries import worries_of


def with_tables(summary, **tables):
    return replace(summary, aftermath=replace(summary.aftermath, **tables))


def with_comparator(summary, kind, **values):
    rows = tuple(
        replace(row, **values) if row.kind == kind else row
        for row in summary.comparators
    )
    assert any(row.kind == kind for row in rows)
    return replace(summary, comparators=rows)


def worries(summary):
    return {worry.where: worry.text for worry in worries_of(summary)}


def rows_of(files, name):
    return list(csv.DictReader(io.StringIO(files[f"tables/{name}.csv"].decode())))


def section(html, anchor):
    return html[html.index(f'<section id="{anchor}"') :].split("</section>", 1)[0]


@pytest.fixture(scope="module")
def files(summary):
    return render(summary)


@pytest.fixture(scope="module")
def html(files):
    return files["report.html"].decode()


def test_pictures_have_their_numbers_beside_them(files, summary):
    found = summary.aftermath
    assert len(rows_of(files, "lost_markers")) == len(found.fragility)
    people = rows_of(files, "accuracy_by_people")
    assert [float(row["n_subjects"]) for row in people] == [38.6, 77.4, 96.8]
    groups = rows_of(files, "accuracy_by_group")
    assert [row["group"] for row in groups] == [row.group for row in found.subgroups]
    for name in ("lost_markers", "accuracy_by_people", "accuracy_by_group"):
        svg = files[f"figures/{name}.svg"].decode()
        assert summary.metric_words in svg
        assert "<dc:date>" not in svg


def test_the_gravest_marker_is_drawn_first_and_at_most_thirty(summary):
    rows = fragility_rows(summary)
    assert next(iter(rows)) == summary.aftermath.fragility[0].marker
    assert set(next(iter(rows.values()))) == {"lost-refitted", "lost-imputed"}
    row = summary.aftermath.fragility[0]
    many = tuple(replace(row, marker=f"M{n}", loss=n / 1e3) for n in range(50))
    drawn = fragility_rows(with_tables(summary, fragility=many))
    assert list(drawn) == [f"M{n}" for n in range(49, 19, -1)]


def test_stand_ins_say_how_often_they_came_back(html):
    text = section(html, "stand-ins")
    assert "24%" in text
    assert "next choice of the maker" in text
    assert "-310.20" in text
    assert text.count("closest companion") == 8


def test_the_difference_of_areas_stands_below_the_losses(html):
    text = section(html, "added-value")
    assert text.index("log loss") < text.index("Brier") < text.rindex("area under")
    assert "never alone" in text
    assert "acting from a chance of 0.2" in text


def test_random_panels_of_the_chosen_and_the_largest_size_only(summary, html):
    kept = [row for row in kept_rows(summary) if row.kind.startswith("random")]
    assert [(row.kind, row.size) for row in kept] == [
        ("random-all", 11),
        ("random-headline", 8),
    ]
    without = replace(
        summary,
        comparators=tuple(
            row for row in summary.comparators if row.kind != "random-headline"
        ),
    )
    kept = [row.size for row in kept_rows(without) if row.kind == "random-all"]
    assert kept == [8, 11]
    assert "comparators.csv" in section(html, "comparators")


def test_random_panels_are_a_band_and_no_line(summary, files):
    assert not [row for row in lines_across(summary) if row.kind == "random-all"]
    picture = files["figures/accuracy_by_size.svg"].decode()
    assert "drawn by lot, all features" in picture


def test_names_in_the_picture_are_whole_words(files):
    picture = files["figures/accuracy_by_size.svg"].decode()
    for label in ("ridge on everything", "lasso, smallest loss", "control features"):
        assert label in picture
    stranger = Comparator(
        "the model of an earlier study in another town", 5, 0.7, 0.6, 0.8, "Other."
    )
    assert label_of(stranger) == "the model of an earlier\nstudy in another town"


def test_rules_that_nobody_meets_stand_in_the_table(html):
    text = section(html, "choice")
    assert text.index("cheapest-above-accuracy") < text.index("nobody meets it")
    assert "No panel reaches 0.900." in text
    assert "51,200.25 EUR at the median, 42,600.00 to 64,650.00" in text


def test_nothing_is_worried_about_that_was_not_found(summary):
    found = worries(summary)
    for where in ("random panels", "handling", "subgroups", "people", "comparators"):
        assert where not in found


def test_no_better_than_lots_is_said(summary):
    other = with_comparator(summary, "random-headline", p=0.31)
    assert (
        "not shown to be better than panels drawn by lot"
        in worries(other)["random panels"]
    )
    assert "p = 0.31" in worries(other)["random panels"]


@pytest.mark.parametrize(
    ("kind", "words"), [("controls", "Control features"), ("nuisance", "nuisance")]
)
def test_handling_that_tells_the_outcome_is_said(summary, kind, words):
    other = with_comparator(
        summary, kind, metric=0.7, metric_low=0.61, metric_high=0.78
    )
    assert words in worries(other)["handling"]
    assert "handling and outcome are entangled" in render(other)["report.html"].decode()


def test_what_undermines_the_answer_most_comes_first(summary):
    """No panel, then no accuracy, then lots and handling, then weak spots."""
    other = with_comparator(summary, "random-headline", p=0.31)
    other = with_comparator(other, "nuisance", metric_low=0.6)
    headline = replace(summary.choice.headline, metric_low=0.4)
    rules = tuple(
        replace(rule, panel="") if rule.primary else rule
        for rule in summary.choice.rules
    )
    low = Subgroup("ward", "Fenmoor", 40, 14, 0.58, 0.44, 0.71, "Fenmoor.")
    other = with_tables(
        replace(other, choice=replace(summary.choice, headline=headline, rules=rules)),
        subgroups=(low,),
    )
    places = [worry.where for worry in worries_of(other)]
    n_stops = len(other.findings.of("stop"))
    assert places[n_stops:][:5] == [
        "first rule",
        "accuracy",
        "random panels",
        "handling",
        "subgroups",
    ]


def test_a_score_that_follows_a_column_is_judged_by_the_number_of_looks(summary):
    row = Handling("plate", "relapse", 60, "epsilon-squared", 0.2, 0.02)
    one = with_tables(summary, handling=(row,))
    assert "Scores follow how samples were handled (plate)" in worries(one)["handling"]
    calm = Handling("hours", "relapse", 60, "spearman", 0.0, 0.9)
    three = with_tables(summary, handling=(row, calm, calm))
    assert "handling" not in worries(three)


def test_a_marker_whose_loss_leaves_nothing_is_said(summary):
    first, *rest = summary.aftermath.fragility
    grave = replace(
        first, metric=0.53, loss=0.28, loss_low=0.18, loss_high=0.38, marker="VELMA2"
    )
    other = with_tables(summary, fragility=(grave, *rest))
    assert [row.marker for row in fatal_losses(other)] == ["VELMA2"]
    assert "without VELMA2" in worries(other)["fragility"]
    assert "falls to 0.530" in worries(other)["fragility"]
    assert "no skill is left" in fragility_caption(other)
    assert "fragility" not in worries(summary)
    alone = with_tables(summary, fragility=(grave,))
    assert "The panel is one marker" in worries(alone)["fragility"]


def test_losses_within_their_interval_are_not_called_losses(summary):
    rows = tuple(
        replace(row, loss_low=row.loss - 0.2) for row in summary.aftermath.fragility
    )
    assert "No single marker's loss is told apart from none" in fragility_caption(
        with_tables(summary, fragility=rows)
    )


def test_ridge_is_said_both_ways(summary):
    better = with_comparator(
        summary, "ridge", difference=0.05, difference_low=0.02, difference_high=0.08
    )
    assert "more accurate" in worries(better)["comparators"]
    assert (
        "more accurate than choosing a panel" in render(better)["report.html"].decode()
    )
    worse = with_comparator(
        summary, "ridge", difference=-0.05, difference_low=-0.08, difference_high=-0.02
    )
    assert "comparators" not in worries(worse)
    page = render(worse)["report.html"].decode()
    assert "less accurate than choosing a panel" in page


def test_a_group_below_the_headline_is_said(summary):
    low = Subgroup("ward", "Fenmoor", 40, 14, 0.58, 0.44, 0.71, "Fenmoor.")
    other = with_tables(summary, subgroups=(*summary.aftermath.subgroups, low))
    assert "ward = Fenmoor lies below the headline" in worries(other)["subgroups"]
    assert "1 of 5 groups lies below" in subgroup_caption(other)
    assert "1 more are too small" in subgroup_caption(other)


def test_whether_more_people_help(summary):
    """Shown to rise, not rising, and neither: three sentences."""
    last = LearningPoint(1.0, 100.0, 0.78, 0.69, 0.85, 0.02)
    before = LearningPoint(0.8, 80.0, 0.75, 0.65, 0.83, 0.02, 0.03, -0.01, 0.07)
    first = LearningPoint(0.4, 40.0, 0.62, 0.5, 0.73, 0.02, 0.16, 0.05, 0.27)
    rising = with_tables(summary, learning_curve=(first, before, last))
    assert is_rising(rising.aftermath.learning_curve)
    assert learning_words(rising) == (
        "More people would probably bring more: from 40 to 100 training subjects "
        "accuracy rose by +0.160 (+0.050 to +0.270); over the last step (80 to 100) it "
        "rose by +0.030."
    )
    assert "still rising" in worries(rising)["people"]
    unclear = with_tables(summary, learning_curve=(before, last))
    assert not is_rising(unclear.aftermath.learning_curve)
    assert learning_words(unclear).startswith("These data do not tell whether")
    assert learning_words(summary).startswith("More people of the same kind were not")
    none = with_tables(summary, learning_curve=(last,))
    assert "not judged" in learning_words(none)


def test_small_cohorts_are_called_small_and_empty_ones_empty(summary):
    """At 0.80 the figure is high and the people few; at 0.56 nothing is shown."""

    def at(metric):
        headline = replace(
            summary.choice.headline, metric=metric, metric_low=0.45, metric_high=0.95
        )
        choice = replace(summary.choice, headline=headline)
        return replace(summary, n_subjects=20, choice=choice)

    assert "because there are few people (20)" in worries(at(0.80))["accuracy"]
    assert "these data show no accuracy" in worries(at(0.56))["accuracy"]
    headline = replace(
        summary.choice.headline, metric=0.3, metric_low=0.2, metric_high=0.4
    )
    below = replace(summary, choice=replace(summary.choice, headline=headline))
    assert "lies below 0.5" in worries(below)["accuracy"]
    assert summary.doubt == ""


def test_added_value_in_words(summary):
    assert added_value_words(summary).startswith("The panel adds to the covariates")
    row = summary.aftermath.added_value[0]
    unclear = replace(row, gain=0.01, gain_low=-0.02, gain_high=0.04)
    words = added_value_words(with_tables(summary, added_value=(unclear,)))
    assert words.startswith("It is not shown that the panel adds")
    worse = replace(row, gain=-0.05, gain_low=-0.08, gain_high=-0.02)
    words = added_value_words(with_tables(summary, added_value=(worse,)))
    assert "worse" in words


def test_a_difference_that_rounds_to_nothing_has_no_sign():
    assert signed(-0.0004) == signed(0.0004) == "0.000"
    assert signed(0.0006) == "+0.001"
    assert signed(np.nan) == "not estimated"


def test_methods_and_sources_follow_what_ran(summary):
    names = {method.name for method in methods_of(summary)}
    assert {"Random panels", "Net benefit", "Score against groups"} <= names
    used = sources_of(summary)
    for key in ("venet", "phipson", "vickers", "kruskal", "nadeau", "delong"):
        assert key in used
    bare = replace(summary, aftermath=Aftermath((), (), (), (), (), ()), comparators=())
    names = {method.name for method in methods_of(bare)}
    assert not names & {"Random panels", "Net benefit", "More people", "Subgroups"}
    assert not {"venet", "vickers", "kruskal"} & set(sources_of(bare))


@pytest.mark.parametrize(
    ("metric", "words", "floor"),
    [
        ("r-squared", "share of variance explained (R squared)", 0.0),
        ("concordance", "concordance", 0.5),
        ("a-new-one", "agreement by ranks", 0.0),
    ],
)
def test_other_outcomes_are_never_spoken_of_as_two_classes(
    summary, metric, words, floor
):
    measured = replace(
        summary.aftermath,
        added_value=(
            replace(summary.aftermath.added_value[0]),
            replace(summary.aftermath.added_value[-1], measure=metric),
        ),
    )
    other = replace(
        summary,
        metric=metric,
        metric_words=words,
        no_skill=floor,
        aftermath=measured,
    )
    files = render(other)
    html = files["report.html"].decode()
    body = html[: html.index("Published methods used")]
    for phrase in ("AUC", "ROC", "positive class", "redicted chance", "log loss"):
        assert phrase not in body, phrase
    assert f"{floor:g} guessing" in html
    assert f"{words[0].upper()}{words[1:]} of the whole procedure" in html
    for path, content in files.items():
        if path.endswith(".svg"):
            assert b"ROC" not in content, path


def test_tables_that_are_long_can_be_opened(html):
    assert re.search(r"<summary>All 16 losses as a table</summary>", html)
    assert re.search(r"<summary>All 5 groups as a table</summary>", html)
