"""Other quotes price a finished run anew without learning a fold again."""

import csv

import pytest

from panelkit import run_study
from panelkit.costing import Procedure
from panelkit.errors import RunFolderError
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
