"""``panelkit size`` and ``panelkit bridge``: answers, files, and plain refusals."""

import csv
import json
from xml.etree import ElementTree

import pytest

SIZE = {
    "accuracy": "--sensitivity 0.9 --specificity 0.85 --half-width 0.1 "
    "--prevalence 0.2",
    "area": "--area 0.8 --width 0.1",
    "develop": "--parameters 15 --prevalence 0.2 --cox-snell 0.1",
    "validate": "--prevalence 0.2 --area 0.8",
    "compare": "--area 0.8 --other-area 0.88 --correlation 0.5",
    "detect": "--people 40 --differences 2.5 --prevalence 0.5 --features 60 "
    "--true-markers 2 --simulations 2 --quiet",
}
PANEL = "--size 4 --area 0.85 --sd 0.8"
BRIDGE = {
    "limits": f"{PANEL} --loss 0.02",
    "loss": f"{PANEL} --cv 20",
    "replicates": "--size 4 --area 0.85 --sd 0.8 --cv 40 --loss 0.02",
    "samples": "--cv 10 --other-cv 15 --shift 0.1 --expected 0.95",
}
ASKED = [("size", *each) for each in SIZE.items()]
ASKED += [("bridge", *each) for each in BRIDGE.items()]


def table(path):
    with path.open(newline="") as file:
        return list(csv.DictReader(file))


@pytest.mark.parametrize(("group", "question", "words"), ASKED)
def test_every_question_is_answered(
    panelkit, tmp_path, read_json, group, question, words
):
    """Words, JSON, tables, a picture and its numbers: all from one answer."""
    out = tmp_path / "out"
    shown = panelkit(group, question, *words.split(), "--out", out)
    assert shown.code == 0
    assert "What this rests on" in shown.out
    assert "Sources: " in shown.out
    answer = read_json((out / "answer.json").read_text())
    assert answer["sentence"] in " ".join(shown.out.split())
    assert answer["assumptions"]
    assert all(words in " ".join(shown.out.split()) for words in answer["assumptions"])
    printed = panelkit(group, question, *words.split(), "--json")
    assert json.loads(printed.out) == answer
    for name, rows in answer["tables"].items():
        assert len(table(out / f"{name}.csv")) == len(rows) > 0
    (picture,) = out.glob("*.svg")
    assert ElementTree.fromstring(picture.read_bytes()).tag.endswith("svg")
    points = table(picture.with_suffix(".csv"))
    assert len(points) > 0
    assert "research" in answer["research_use"]


def test_the_figures_are_those_of_the_formulas(panelkit):
    """The worked values of tests/sizing, through the command."""

    def figures(group, question, words):
        shown = panelkit(group, question, *words.split(), "--json")
        return json.loads(shown.out)["figures"]

    found = figures("size", "accuracy", SIZE["accuracy"])
    assert (found["people"], found["people_normal_rounded_late"]) == (185, 173)
    assert found["people_normal_rounded_early"] == 175
    found = figures("size", "area", SIZE["area"])
    assert (found["cases_hanley_mcneil"], found["cases_binormal"]) == (151, 184)
    assert figures("size", "develop", SIZE["develop"])["people"] == 1274
    survival = "--parameters 30 --rate 0.065 --follow-up 2.07 --cox-snell 0.051"
    assert figures("size", "develop", survival)["people"] == 5143
    assert figures("size", "validate", "--r-squared 0.5")["people"] == 769
    assert figures("size", "compare", SIZE["compare"])["cases"] == 140
    shares = figures("size", "compare", "--discordant 0.2 --difference 0.1")
    assert shares["people_formula"] == 155
    assert shares["people_exact_test"] > 155
    one = "--marker A=1:0.8 --cv 20 --replicates 2"
    assert figures("bridge", "loss", one)["area"] == pytest.approx(0.8042716576)


def test_a_wide_search_is_told_that_it_fails_by_design(panelkit):
    shown = panelkit(
        *[
            "size",
            "develop",
            "--parameters",
            "20000",
            "--prevalence",
            "0.2",
            "--area",
            "0.8",
        ]
    )
    assert "fails these criteria by design" in " ".join(shown.out.split())
    assert "learning curve" in shown.out


def test_people_are_priced_by_the_programme(panelkit, files):
    files.price()
    study = files.write()
    asked = f"size area {SIZE['area']} --markers F00,F01 --json --prices".split()
    answer = json.loads(panelkit(*asked, study).out)
    rows = answer["tables"]["range"]
    totals = [float(row["cost_total_EUR"]) for row in rows]
    assert totals == sorted(totals)
    own = next(row for row in rows if row["people"] == answer["figures"]["people"])
    assert own["cost_total_EUR"] == answer["figures"]["cost_total"]
    # two markers to develop at 100, and as many reactions as results at 2.50 each
    assert totals[0] >= 200 + 2 * 2.5 * rows[0]["people"]
    without = panelkit(
        *["size", "area", "--area", "0.8", "--width", "0.1", "--prices"], study
    )
    assert without.code == 2
    assert "no panel is named" in without.sentence


def test_learning_curve_of_a_run(panelkit, run_folder):
    rows = table(run_folder / "learning_curve.csv")
    shown = panelkit("size", "learning", run_folder, "--json")
    if len(rows) < 3:  # too few people for a curve: said plainly
        assert shown.code == 2
        assert "do not make a curve" in shown.sentence
        return
    answer = json.loads(shown.out)
    most = max(float(row["n_subjects"]) for row in rows)
    assert answer["inputs"]["training_people"] == pytest.approx(most)
    figures = answer["figures"]
    assert figures["metric_with_twice"] >= figures["metric_now"] - 1e-9


@pytest.fixture
def curve(tmp_path):
    """A run folder that holds a learning curve with plateau 0.9, and no more."""
    lines = ["share,n_subjects,metric,metric_low,metric_high,metric_se_corrected"]
    lines += [
        f"{n / 240},{n},{0.9 - 1.2 / n**0.5},0.5,0.95,0.01" for n in (30, 60, 120, 240)
    ]
    (tmp_path / "learning_curve.csv").write_text("\n".join(lines) + "\n")
    return tmp_path


def test_a_target_of_the_learning_curve(panelkit, curve):
    near = json.loads(
        panelkit("size", "learning", curve, "--target", "0.85", "--json").out
    )
    assert near["figures"]["people"] == pytest.approx(576, rel=0.03)
    far = panelkit("size", "learning", curve, "--target", "0.95")
    assert "never reaches" in far.out
    shown = panelkit("size", "learning", curve / "no-such")
    assert (shown.code, "cannot be read" in shown.sentence) == (7, True)


def test_limits_of_the_panel_of_a_run(panelkit, run_folder):
    shown = panelkit("bridge", "limits", run_folder, "--loss", "0.02", "--json")
    answer = json.loads(shown.out)
    chosen = json.loads((run_folder / "choice.json").read_text())["rules"][0]["panel"]
    rows = {row["panel"]: row for row in table(run_folder / "frontier.csv")}
    markers = rows[chosen]["markers"].split(";")
    assert [row["marker"] for row in answer["tables"]["requirements"]] == markers
    assert answer["figures"]["area"] == pytest.approx(
        float(rows[chosen]["metric"]), abs=1e-9
    )
    for row in answer["tables"]["simulation"]:
        gap = row["area_simulated"] - row["area_closed_form"]
        assert abs(gap) < 4.5 * row["se"]
    wrong = panelkit("bridge", "limits", run_folder, "--loss", "0.1", "--panel", "no")
    assert (wrong.code, "no panel is called 'no'" in wrong.sentence) == (3, True)


def test_a_bridging_set_of_a_study(panelkit, files, run_folder):
    shown = panelkit(
        "bridge", "choose", files.write(), run_folder, "--size", "12", "--json"
    )
    answer = json.loads(shown.out)
    samples = [row["sample"] for row in answer["tables"]["samples"]]
    assert len(set(samples)) == 12
    assert set(samples) <= set(files.samples["sample_id"])
    for row in answer["tables"]["ranges"]:
        assert (row["low"], row["high"]) == (row["chosen_low"], row["chosen_high"])


@pytest.fixture
def sheet(tmp_path):
    lines = ["sample_id,person,outcome,clinic,age"]
    lines += [
        f"S{k:03d},P{k // 2:03d},{'yes' if k // 2 % 3 else 'no'},{'AB'[k // 2 % 2]},"
        f"{30 + k % 37}"
        for k in range(150)
    ]
    path = tmp_path / "samples.csv"
    path.write_text("\n".join(lines) + "\n")
    return path


def test_plates(panelkit, sheet, tmp_path):
    asked = f"size plates {sheet} --balance outcome,clinic,age --subject person".split()
    shown = panelkit(*asked, "--out", tmp_path / "out")
    assert shown.code == 0
    assert "and 130 more rows" in shown.out
    rows = table(tmp_path / "out" / "plates.csv")
    assert {row["sample"] for row in rows} == {f"S{k:03d}" for k in range(150)}
    assert len({(row["plate"], row["well"]) for row in rows}) == 150
    homes = {}
    for row in rows:
        homes.setdefault(row["subject"], set()).add(row["plate"])
    assert {len(plates) for plates in homes.values()} == {1}
    assert {row["age"][:7] for row in rows} == {"quarter"}
    for row in table(tmp_path / "out" / "balance.csv"):
        assert float(row["cramers_v"]) < float(row["by_chance_mean"])
    again = panelkit(*asked, "--json").out
    assert again == panelkit(*asked, "--json").out
    assert again != panelkit(*asked, "--seed", "2", "--json").out


@pytest.mark.parametrize(
    ("words", "said"),
    [
        ("size accuracy --sensitivity 1.2 --specificity 0.8 --half-width 0.1 "
         "--prevalence 0.2", "sensitivity: a share lies between 0 and 1 (got 1.2)"),
        ("size accuracy --sensitivity 0.9 --specificity 0.8 --half-width 0 "
         "--prevalence 0.2", "half-width"),
        ("size accuracy --sensitivity 0.9 --specificity 0.8 --half-width 0.1 "
         "--prevalence 0", "prevalence"),
        ("size area --area 0.8 --width 0", "width"),
        ("size area --area 0.4 --width 0.1", "got 0.4"),
        ("size develop --parameters 0 --prevalence 0.2 --area 0.8", "parameters"),
        ("size develop --parameters 5 --prevalence 0.2", "an input is missing"),
        ("size develop --parameters 5 --rate 1 --follow-up 2 --cox-snell 0.1 "
         "--prevalence 0.2", "mixed"),
        ("size validate --prevalence 0 --area 0.8", "prevalence"),
        ("size validate --prevalence 0.2 --area 0.8 --r-squared 0.5", "mixed"),
        ("size validate --prevalence 0.2 --area 0.8 --threshold 1.5", "threshold"),
        ("size compare --area 0.8 --other-area 0.8 --correlation 0.5", "equal areas"),
        ("size compare --discordant 0.1 --difference 0.3", "cannot differ by 0.3"),
        ("size detect --people x --differences 1 --prevalence 0.5", "no numbers"),
        ("size detect --people 10 --differences 1 --prevalence 0.5", "8 of each"),
        ("bridge limits --loss 0.02", "not stated"),
        (f"bridge limits {PANEL} --loss 0", "cannot lose it"),
        (f"bridge limits {PANEL} --loss 0.4", "cannot lose it"),
        (f"bridge loss {PANEL} --cv -3", "no assay has this"),
        (f"bridge loss {PANEL} --cv 20 --replicates 0", "replicates"),
        ("bridge limits --size 3 --loss 0.1", "--size needs --area"),
        ("bridge limits --marker IL6 --loss 0.1", "states no marker"),
        ("bridge limits --marker A=1:0 --loss 0.1", "SD"),
        ("bridge limits --marker A=1:1 --marker A=1:1 --loss 0.1", "named twice"),
        ("bridge samples --cv 10 --other-cv 10 --shift 0 --expected 0.9", "shift"),
        ("bridge samples --cv 10 --other-cv 10 --shift 1 --expected 1", "correlation"),
    ],
)  # fmt: skip
def test_nonsense_gets_one_clear_sentence(panelkit, words, said):
    shown = panelkit(*words.split())
    assert shown.code == 2
    assert said in shown.sentence
    assert shown.out == ""
    assert len(shown.err.strip().splitlines()) == 1
