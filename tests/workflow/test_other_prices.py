"""Other quotes price a finished run anew without learning a fold again."""

import csv
from itertools import combinations

import pytest

from panelkit import run_study
from panelkit.config import read_study
from panelkit.costing import Procedure
from panelkit.errors import RunFolderError
from panelkit.workflow.cohort import load_cohort, load_prices
from panelkit.workflow.record import without_prices


def totals(path):
    with (path / "frontier.csv").open() as file:
        return [row["cost_total"] for row in csv.DictReader(file)]


def test_other_prices_learn_no_fold(tiny, finished, copy_of_run, contents, monkeypatch):
    def refuse(*_arguments, **_named):
        raise AssertionError("a remembered fold was learnt again")

    before = totals(copy_of_run)
    tiny.sections["programme"] = {"currency": "EUR", "samples": 400}
    monkeypatch.setattr(Procedure, "learn", refuse)
    run_study(tiny.write(), copy_of_run, threads=1)
    assert totals(copy_of_run) != before
    monkeypatch.undo()
    fresh = copy_of_run.parent / "fresh"
    run_study(tiny.write(), fresh, threads=1)
    assert contents(copy_of_run) == contents(fresh)


def test_no_prices_at_all_is_another_run(tiny, copy_of_run):
    """Files of the priced run would stay behind."""
    del tiny.sections["programme"]
    for key in ("prices", "platforms"):
        del tiny.sections["panels"][key]
    with pytest.raises(RunFolderError) as refused:
        run_study(tiny.write(), copy_of_run, threads=1)
    assert refused.value.code == "run-folder-taken"


@pytest.mark.parametrize("junk", [b"", b"[]", b"{}", b"null", b'{"study": 3}'])
def test_junk_is_no_record(junk):
    assert without_prices(junk) == junk


def test_kits_and_conflicts_of_a_study(tiny, tmp_path):
    """Kits of a platform file, and pairs that may not be in one panel, are used."""
    study = tiny.write()
    wells = study.parent / "wells.toml"
    names = ", ".join(f'"F{number:02d}"' for number in range(57))
    wells.write_text(
        wells.read_text() + f"\n[[kit]]\nid = 'all of them'\nmarkers = [{names}]\n"
        "unit_price = 1\ntests_per_unit = 1000\n"
    )
    run_study(study, tmp_path / "out", threads=1)
    assert set(totals(tmp_path / "out")) == {"1.00"}
    assert "all of them" in (tmp_path / "out" / "report.html").read_text()
    pairs = study.parent / "apart.csv"
    taken = [f"F{number:02d}" for number in range(57)]
    lines = [f"{a},{b},panel" for a, b in combinations(taken, 2)]
    pairs.write_text("marker_a,marker_b,scope\n" + "\n".join(lines) + "\n")
    tiny.sections["panels"]["conflicts"] = "apart.csv"
    kept = wells.read_text()
    study = tiny.write()
    wells.write_text(kept)
    run_study(study, tmp_path / "out", threads=1)
    with (tmp_path / "out" / "frontier.csv").open() as file:
        for row in csv.DictReader(file):
            assert row["cost_total"] == ("1.00" if row["size"] == "1" else "")


def test_a_list_by_symbol_prices_features(tiny):
    """Every feature's symbol has a row of its own: the symbol's price is found."""
    study = tiny.write()
    folder = study.parent
    names = [f"F{number:02d}" for number in range(60)]
    table = [f"{name},GENE{name[1:]},marker" for name in names]
    (folder / "features.csv").write_text("feature,symbol,role\n" + "\n".join(table))
    rows = [
        f"GENE{name[1:]},{platform},ok,{number},1"
        for number, name in enumerate(names)
        for platform in ("wells", "pools")
    ]
    (folder / "prices.csv").write_text(
        "marker,platform,status,dev,test\n" + "\n".join(rows) + "\n"
    )
    plan = read_study(study)
    pricer, hashes, findings = load_prices(plan, load_cohort(plan))
    assert set(hashes) == {"prices"}
    assert not list(findings)
    low = {cost.platform: cost for cost in pricer.costs(["F03"])}
    high = {cost.platform: cost for cost in pricer.costs(["F45"])}
    for platform in ("wells", "pools"):
        assert low[platform].missing_quotes == ()
        gap = high[platform].line("development") - low[platform].line("development")
        assert gap == 42
