"""Wrong study files: one sentence that names file, table and key."""

import pytest

from panelkit.config import read_study
from panelkit.errors import StudyFileError

WRONG_VALUES = {
    "text for a number": ("accuracy", 'folds = "five"'),
    "list for a number": ("accuracy", "folds = [5]"),
    "half a fold": ("accuracy", "folds = 2.5"),
    "one fold": ("accuracy", "folds = 1"),
    "no repeat": ("accuracy", "repeats = 0"),
    "certainty": ("accuracy", "confidence = 1.0"),
    "another metric": ("accuracy", 'metric = "accuracy"'),
    "threshold of a half": ("shortlist", "threshold = 0.5"),
    "threshold above one": ("shortlist", "threshold = 1.01"),
    "threshold that is none": ("shortlist", "threshold = nan"),
    "negative false markers": ("shortlist", "false_markers = -1"),
    "no false markers": ("shortlist", "false_markers = 0"),
    "no candidates": ("shortlist", "candidates = 0"),
    "text for a list": ("shortlist", 'always = "F01"'),
    "unsorted sizes": ("panels", "sizes = [3, 1]"),
    "sizes twice": ("panels", "sizes = [1, 2, 2]"),
    "no sizes": ("panels", "sizes = []"),
    "size of nothing": ("panels", "sizes = [0, 1]"),
    "no makers": ("panels", "makers = []"),
    "negative offset": ("preparation", "log2_offset = -0.5"),
    "share above one": ("preparation", "max_missing_share = 1.5"),
    "number for a text": ("statement", "ethics = 3"),
    "unknown rule": ("choice", 'primary = { rule = "largest" }'),
    "rule without braces": ("choice", 'primary = "smallest-within-one-se"'),
}


@pytest.mark.parametrize(("table", "line"), WRONG_VALUES.values(), ids=WRONG_VALUES)
def test_wrong_values(refused, table, line):
    error = refused(f"[{table}]\n{line}\n")
    assert error.code == "value-refused"
    assert f"study.toml, [{table}], key '{line.partition(' = ')[0]}" in error.where


@pytest.mark.parametrize(
    ("line", "near"),
    [
        ("[shortlist]\nthreshhold = 0.8", "threshold"),
        ("[accuracy]\nfold = 3", "folds"),
        ("[panels]\nsize = [1]", "sizes"),
        ("[preparation]\nlog2offset = 1", "log2_offset"),
        ("[acuracy]\nfolds = 3", "accuracy"),
        ("[choice.primary]\nrule = 'smallest-within-one-se'\nrules = 1", None),
        ("[platform.wells]\npositions = 96\nplexes = 4", "plex"),
    ],
)
def test_unknown_keys_are_told_with_the_nearest_name(refused, line, near):
    error = refused(f"{line}\n")
    assert error.code == "key-unknown"
    if near:
        assert f"perhaps '{near}' is meant" in str(error)


def test_unknown_key_beside_the_tables(refused):
    error = refused(head='sed = 1\n[cohort]\nexpression = "e.csv"\n')
    assert error.code == "key-unknown"
    assert "perhaps 'seed' is meant" in str(error)


def test_no_cohort(refused):
    assert refused(head="seed = 1\n").code == "cohort-table-missing"
    assert refused(head="").code == "cohort-table-missing"


@pytest.mark.parametrize("head", ["cohort = 3\n", "[[cohort]]\nexpression = 'e'\n"])
def test_cohort_that_is_no_table(refused, head):
    assert refused(head=head).code == "value-refused"


def test_no_expression(refused):
    error = refused(head='[cohort]\nsamples = "s.csv"\n')
    assert error.code == "key-missing"
    assert "'expression'" in error.where


@pytest.mark.parametrize(
    "lines", ["[shortlist]\nsubsamples = 7", "[accuracy]\ninner_subsamples = 5"]
)
def test_odd_subsamples(refused, lines):
    error = refused(f"{lines}\n")
    assert error.code == "subsamples-odd"
    assert error.next_step in ("Write 8", "Write 6")


@pytest.mark.parametrize("seed", ["-1", "true", "1.0", '"1"', "[1]"])
def test_seeds(refused, seed):
    error = refused(head=f'seed = {seed}\n[cohort]\nexpression = "e.csv"\n')
    assert error.code == "seed-not-whole"


PARTS = {
    "programme": '[programme]\ncurrency = "EUR"\nsamples = 10\n',
    "platforms": "[platform.wells]\npositions = 96\n",
    "prices": '[panels]\nprices = "prices.csv"\n',
}


@pytest.mark.parametrize(
    "there", [{a} for a in PARTS] + [set(PARTS) - {a} for a in PARTS]
)
def test_half_a_price(refused, there):
    error = refused("".join(PARTS[name] for name in sorted(there)))
    assert error.code == "pricing-incomplete"
    for name, words in (
        ("programme", "[programme]"),
        ("platforms", "[platform.NAME]"),
        ("prices", "[panels] prices"),
    ):
        assert (words in error.what) == (name not in there)


def test_the_whole_price_is_accepted(study):
    """Each of the three parts is right in itself: only half of it is wrong."""
    assert study("".join(PARTS.values())).programme.samples == 10


def test_platform_twice(refused, tmp_path):
    (tmp_path / "wells.toml").write_text(PARTS["platforms"])
    text = PARTS["prices"] + 'platforms = ["wells.toml"]\n'
    error = refused(text + PARTS["platforms"] + PARTS["programme"])
    assert error.code == "platform-twice"
    assert "wells.toml, [platform.wells]" in error.where


def test_missing_platform_file(refused):
    error = refused('[panels]\nprices = "p.csv"\nplatforms = ["nowhere.toml"]\n')
    assert error.code == "file-unreadable"
    assert "nowhere.toml" in error.where


@pytest.mark.parametrize("text", ["platform = 3\n", "[platform]\nwells = 3\n"])
def test_platform_that_is_no_table(refused, text):
    refused(head=f'{text}[cohort]\nexpression = "e.csv"\n')


@pytest.mark.parametrize(
    ("line", "code"),
    [
        ('currency = "euro"', "currency-unknown"),
        ("samples = 10.5", "count-not-whole"),
        ('samples = "many"', "amount-unreadable"),
        ("repeat_rate = 1.0", "value-refused"),
        ("collection_cost = -1", "value-refused"),
        ("collection_cost = inf", "amount-implausible"),
        ("collection_cost = 1e20", "amount-implausible"),
        ("samples = true", "amount-not-exact"),
    ],
)
def test_wrong_programmes(refused, line, code):
    whole = {"currency": 'currency = "EUR"', "samples": "samples = 10"}
    whole[line.partition(" ")[0]] = line
    error = refused("[programme]\n" + "\n".join(whole.values()) + "\n")
    assert error.code == code
    assert "[programme], key " in error.where


NO_TOML = {
    "open bracket": b"[cohort",
    "table twice": b"[cohort]\n[cohort]\n",
    "key twice": b"seed = 1\nseed = 2\n",
    "a sheet": b"sample_id,response\nS1,yes\n",
    "unquoted": b"[cohort]\nexpression = e.csv\n",
}


@pytest.mark.parametrize("content", NO_TOML.values(), ids=NO_TOML)
def test_not_toml(tmp_path, content, sentence):
    path = tmp_path / "study.toml"
    path.write_bytes(content)
    with pytest.raises(StudyFileError) as caught:
        read_study(path)
    sentence(caught.value)
    assert caught.value.code == "toml-unreadable"


@pytest.mark.parametrize(
    "content", [b"\xff\xfe[\x00c\x00", b"\x89PNG\r\n\x1a\n\xff", bytes(99)]
)
def test_junk(tmp_path, content, sentence):
    path = tmp_path / "study.toml"
    path.write_bytes(content)
    with pytest.raises(StudyFileError) as caught:
        read_study(path)
    sentence(caught.value)
    assert caught.value.code in ("file-unreadable", "toml-unreadable")


def test_missing_file_and_folder(tmp_path, sentence):
    for path in (tmp_path / "study.toml", tmp_path):
        with pytest.raises(StudyFileError) as caught:
            read_study(path)
        sentence(caught.value)
        assert caught.value.code == "file-unreadable"


def test_long_values_are_shortened(refused):
    """A pasted column in the wrong place must not fill the screen."""
    many = ", ".join(f'"F{number:05d}"' for number in range(5000))
    error = refused(f"[accuracy]\nfolds = [{many}]\n")
    assert len(str(error)) < 400


@pytest.mark.parametrize("sizes", ['[1, "2"]', "[[1], [2]]", "[1, [2]]"])
def test_sizes_of_other_types(refused, sizes):
    assert refused(f"[panels]\nsizes = {sizes}\n").code == "value-refused"


UNBOUNDED = ["[shortlist]\nfalse_markers = inf", "[preparation]\nlog2_offset = inf"]


@pytest.mark.parametrize("lines", UNBOUNDED)
def test_infinity(refused, lines):
    refused(f"{lines}\n")


@pytest.mark.parametrize(
    "lines",
    [
        '[panels]\nmakers = ["frequency", "frequency"]',
        '[shortlist]\nalways = ["F01"]\nnever = ["F01"]',
    ],
)
def test_names_that_no_data_can_make_right(refused, lines):
    refused(f"{lines}\n")


@pytest.mark.parametrize(
    "lines",
    [
        "[panels]\nsizes = [3, 1]",
        "[panels]\nsizes = []",
        '[panels]\nmakers = "frequency"',
        '[choice]\nprimary = "smallest-within-one-se"',
        "[shortlist]\nalways = 3",
    ],
)
def test_the_sentence_is_in_the_words_of_toml(refused, lines):
    """TOML has tables and lists, and no key accepts a `Value error`."""
    accepted = refused(f"{lines}\n").accepted
    for word in ("tuple", "dictionary", "instance of", "Value error", "Section"):
        assert word.lower() not in accepted.lower()


def test_a_byte_order_mark_is_passed_over(study):
    """Editors of one operating system write it in front of every UTF-8 file."""
    study(head='\ufeff[cohort]\nexpression = "e.csv"\n')
