"""Wrong input ends in one sentence on standard error, with its exit code."""

import re

import pytest

SENTENCE = re.compile(r"^\w+Error \([a-z-]+\): .+; .+\. [A-Z].+\.$")


def missing_expression(files):
    files.change("expression.csv", "no such file.csv")


def missing_sheet(files):
    files.change("samples.csv", "no such sheet.csv")


def unknown_outcome(files):
    files.change('"response"', '"respons"')


def unknown_subject(files):
    files.change("[shortlist]", 'subject = "person"\n[shortlist]')


def unknown_class(files):
    files.change('"yes"', '"Yes"')


def one_class_only(files):
    files.samples["response"] = "yes"


def text_everywhere(files):
    files.expression = files.expression.map(lambda value: f"{value} units")


def ids_that_do_not_match(files):
    files.samples["sample_id"] = "Z" + files.samples["sample_id"]


def ids_twice(files):
    files.samples.loc[1, "sample_id"] = files.samples.loc[0, "sample_id"]


def unknown_never(files):
    files.change("candidates = 8", 'candidates = 8\nnever = ["F99"]')


def unknown_key(files):
    files.change("candidates = 8", "candidate = 8")


def unknown_table(files):
    files.change("[shortlist]", "[shortlst]")


def not_toml(files):
    files.change("[shortlist]", "[shortlist")


def no_outcome(files):
    files.change('outcome = "response"\npositive = "yes"\n', "")


def no_positive(files):
    files.change('positive = "yes"\n', "")


def two_outcomes(files):
    files.change("[shortlist]", 'time = "days"\nevent = "death"\n[shortlist]')


def survival(files):
    files.samples["days"] = range(1, 41)
    files.samples["died"] = [0, 1] * 20
    files.change(
        'outcome = "response"\npositive = "yes"', 'time = "days"\nevent = "died"'
    )


def named(line):
    """Return what puts a line with a name that does not exist into [cohort]."""

    def spoil(files):
        files.change("[shortlist]", f"{line}\n[shortlist]")

    spoil.__name__ = line.partition(" ")[0]
    return spoil


def unknown_folds(files):
    files.change("folds = 2\nrepeats = 1\n", "")
    files.change("[shortlist]", 'folds = "part"\n[shortlist]')


def unknown_maker(files):
    files.change("[1, 2, 3]", '[1, 2, 3]\nmakers = ["guess"]')


def missing_prices(files):
    files.price()
    files.change("prices.csv", "no prices.csv")


def missing_platform(files):
    files.change("[1, 2, 3]", '[1, 2, 3]\nplatforms = ["no platform.toml"]')


def platform_without_prices(files):
    files.price()
    files.change("[platform.wells]", "[platform.welz]")


def matched_without_sets(files):
    files.study += '[design]\nkind = "matched"\n'


def half_a_price(files):
    files.study += '[programme]\ncurrency = "EUR"\nsamples = 10\n'


WRONG = {
    missing_expression: (3, "no such file.csv"),
    missing_sheet: (3, "no such sheet.csv"),
    unknown_outcome: (3, "'respons'"),
    unknown_subject: (3, "'person'"),
    unknown_class: (3, "the nearest is 'yes'"),
    one_class_only: (3, "both classes are needed"),
    text_everywhere: (3, "text instead of numbers"),
    ids_that_do_not_match: (3, "none of the 40 sample ids"),
    ids_twice: (3, "S00"),
    unknown_never: (3, "F99"),
    unknown_key: (2, "perhaps 'candidates' is meant"),
    unknown_table: (2, "perhaps 'shortlist' is meant"),
    not_toml: (2, "not valid TOML"),
    no_outcome: (2, "no outcome is named"),
    no_positive: (2, "positive"),
    two_outcomes: (2, "to which outcome and positive does not belong"),
    unknown_maker: (2, "makers are"),
    missing_prices: (3, "no prices.csv"),
    missing_platform: (2, "no platform.toml"),
    platform_without_prices: (3, "welz"),
    matched_without_sets: (2, "matched_set"),
    # names that only the data can prove wrong: always 3
    named('negative = "No"'): (3, "the nearest is 'no'"),
    named('site = "clinc"'): (3, "'clinc'"),
    named('matched_set = "pair"\n[design]\nkind = "matched"'): (3, "'pair'"),
    named('run_order = "place"'): (3, "'place'"),
    named('replicate_of = "copy"'): (3, "'copy'"),
    unknown_folds: (3, "'part'"),
    named('covariates = ["age"]'): (3, "'age'"),
    named('nuisance = ["age"]'): (3, "'age'"),
    named('keep = { age = ["3"] }'): (3, "'age'"),
    named('set_aside = { column = "year", from = 2019 }'): (3, "'year'"),
    named('features = "no features.csv"'): (3, "no features.csv"),
    named('assays = "no assays.csv"'): (3, "no assays.csv"),
    half_a_price: (2, "cannot be priced without"),
}


def clear(answer):
    assert "Traceback" not in answer.err
    lines = answer.err.strip().splitlines()
    assert len(lines) == 1, lines
    assert SENTENCE.match(lines[0]), lines[0]


@pytest.mark.parametrize("spoil", WRONG, ids=lambda spoil: spoil.__name__)
@pytest.mark.parametrize("command", ["check", "run"])
def test_one_sentence_and_its_exit_code(panelkit, files, command, spoil):
    spoil(files)
    code, said = WRONG[spoil]
    out = files.folder / "out"
    options = ("--out", out, "--quiet") if command == "run" else ()
    answer = panelkit(command, files.write(), *options)
    assert answer.code == code
    assert answer.out == ""
    assert said in answer.err
    clear(answer)
    assert not out.exists()


@pytest.mark.parametrize("command", ["check", "run"])
def test_missing_study(panelkit, tmp_path, command):
    options = ("--out", tmp_path / "out") if command == "run" else ()
    answer = panelkit(command, tmp_path / "study.toml", *options)
    assert answer.code == 2
    clear(answer)


@pytest.mark.parametrize("content", [b"", b"\xff\xfe\x00seed", b"PK\x03\x04" * 50])
def test_study_that_is_no_text(panelkit, tmp_path, content):
    path = tmp_path / "study.toml"
    path.write_bytes(content)
    answer = panelkit("check", path)
    assert answer.code == 2
    clear(answer)


def test_study_that_is_a_folder(panelkit, tmp_path):
    answer = panelkit("check", tmp_path)
    assert answer.code == 2
    clear(answer)


ODD = {
    "infinite false markers": ("candidates = 8", "false_markers = inf"),
    "offset out of bounds": (
        "seed = 4",
        "seed = 4\npreparation.log2_offset = 1e400",
    ),
    "number and text": ("[1, 2, 3]", '[1, "2"]'),
    "lists in a list": ("[1, 2, 3]", "[[1], [2]]"),
}


@pytest.mark.parametrize(
    ("old", "new"),
    ODD.values(),
    ids=list(ODD),
)
def test_odd_values_are_refused_and_not_a_bug(panelkit, files, old, new):
    files.change(old, new)
    answer = panelkit("run", files.write(), "--out", files.folder / "out", "--quiet")
    assert answer.code == 2
    clear(answer)


def test_a_stop_is_exit_code_three(panelkit, files):
    """Each class has a plate of its own."""
    files.change("[shortlist]", 'batch = "plate"\n[shortlist]')
    out = files.folder / "out"
    answer = panelkit("run", files.write(), "--out", out, "--quiet")
    assert answer.code == 3
    assert "outcome-tied-to-batch" in answer.err
    assert not out.exists()


def test_unknown_command(panelkit):
    answer = panelkit("runn")
    assert answer.code == 2
    assert "runn" in answer.err
    assert answer.out == ""


def test_unknown_option(panelkit, files):
    answer = panelkit("run", files.write(), "--ou", "x")
    assert answer.code == 2
    assert "--out" in answer.err


def test_missing_argument(panelkit):
    assert panelkit("run").code == 2
    assert panelkit("check").code == 2
    assert panelkit("draft").code == 2
