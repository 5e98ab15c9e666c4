"""`panelkit shortlist`: its table, its sentences, its JSON."""

import pytest


@pytest.fixture
def files(files):
    files.change("candidates = 8\n", "candidates = 8\nshuffles = 5\n")
    return files


def test_table_and_sentences(panelkit, files):
    answer = panelkit("shortlist", files.write(), "--out", files.folder / "out")
    assert answer.code == 0
    for part in (
        "feature",
        "AUC (apparent)",
        "worst case",
        "fixed before the first fit",
        "With people shuffled 5 times",
        "univariate: shortlist",
        "For research and planning only",
    ):
        assert part in answer.out
    assert "shuffles: done" in answer.err
    assert "Report" not in answer.out


def test_json_is_one_document(panelkit, files, read_json):
    answer = panelkit("shortlist", files.write(), "--out", files.folder / "o", "--json")
    assert answer.code == 0
    content = read_json(answer.out)
    assert (content["samples"], content["features"]) == (40, 60)
    assert set(content["shortlist"]) <= set(content["candidates"]) | {
        "F00",
        "F01",
        "F02",
    }
    assert content["shuffles"]["number"] == 5
    assert content["bound"]["decides"] == "worst-case"
    assert content["bound"]["r_concave"] is None
    assert len(content["sentences"]) >= 5


def test_quiet_prints_nothing(panelkit, files):
    out = files.folder / "out"
    answer = panelkit("shortlist", files.write(), "--out", out, "--quiet")
    assert (answer.code, answer.out, answer.err) == (0, "", "")
    assert (out / "shortlist.csv").exists()


def test_demands_that_contradict(panelkit, files):
    files.change(
        "shuffles = 5\n",
        "markers_per_subsample = 3\nthreshold = 0.8\nfalse_markers = 1\n",
    )
    answer = panelkit("shortlist", files.write(), "--out", files.folder / "out")
    assert answer.code == 2
    assert "the third follows" in answer.sentence


def test_occupied_folder(panelkit, files):
    out = files.folder / "out"
    out.mkdir()
    (out / "thesis.txt").write_text("mine")
    answer = panelkit("shortlist", files.write(), "--out", out)
    assert answer.code == 7
    assert [path.name for path in out.iterdir()] == ["thesis.txt"]
