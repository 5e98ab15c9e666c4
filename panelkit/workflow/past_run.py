"""What a finished run folder says, read back."""

import csv
import json
from collections.abc import Mapping
from pathlib import Path
from typing import Any, Final

import numpy as np
from numpy.typing import NDArray

from panelkit.config import Study
from panelkit.costing import PRIMARY
from panelkit.errors import RunFolderError, UsageError, name_some
from panelkit.lock import OutOfFoldRows
from panelkit.workflow.check import CheckedStudy
from panelkit.workflow.recipes import preparation_tables
from panelkit.workflow.record import run_record

__all__ = ["PastRun", "log_odds_of"]

EDGE: Final = 1e-15  # chances of 0 and 1 as written


def log_odds_of(chances: NDArray[np.float64]) -> NDArray[np.float64]:
    """Return the log-odds of chances as ``predictions.csv`` holds them.

    A run locks by these too, so that `lock` gives the same bits later.
    """
    p = np.clip(chances, EDGE, 1.0 - EDGE)
    return np.asarray(np.log(p) - np.log1p(-p), np.float64)


class PastRun:
    """A finished run folder.

    Parameters
    ----------
    path : Path
        The folder.

    Raises
    ------
    RunFolderError
        It holds no finished run.
    """

    def __init__(self, path: Path) -> None:
        self.path = path
        record, choice = self._json("record.json"), self._json("choice.json")
        self.record: Mapping[str, Any] = record
        self._choice = choice
        self._frontier = self.rows("frontier.csv")

    @property
    def seed(self) -> int:
        """Root of the run's random draws."""
        return int(self.record["study"]["seed"])

    def _json(self, name: str) -> dict[str, Any]:
        try:
            found = json.loads((self.path / name).read_text(encoding="utf-8"))
        except (OSError, ValueError) as error:
            raise _unfinished(self.path, name) from error
        if not isinstance(found, dict):
            raise _unfinished(self.path, name)
        return found

    def rows(self, name: str) -> list[dict[str, str]]:
        """Return a table as rows of text.

        Raises
        ------
        RunFolderError
            It is not there.
        """
        try:
            with (self.path / name).open(newline="", encoding="utf-8") as file:
                return list(csv.DictReader(file))
        except OSError as error:
            raise _unfinished(self.path, name) from error

    def panel_named(self, rule: str | None, panel: str | None) -> str:
        """Return the panel that a rule chose, or the one that is named.

        Parameters
        ----------
        rule, panel : str, optional
            One of the two; None for both takes the primary rule.

        Returns
        -------
        str
            Its name.

        Raises
        ------
        UsageError
            Both are given, or there is no such one.
        """
        rules = {each["rule"]: each["panel"] for each in self._choice["rules"]}
        names = [row["panel"] for row in self._frontier]
        if rule is not None and panel is not None:
            raise UsageError(
                code="rule-and-panel",
                where="rule, panel",
                what="both are given",
                accepted="one of the two",
                next_step="Leave one out",
            )
        wanted, known = (rule, list(rules)) if panel is None else (panel, names)
        if wanted is not None and wanted not in known:
            raise UsageError(
                code="no-such-panel",
                where=str(self.path),
                what=f"the run has no such rule or panel (got {wanted!r})",
                accepted=f"one of {name_some(known)}",
                next_step="Correct the name",
            )
        if panel is not None:
            return panel
        first = str(self._choice["rules"][0]["panel"])
        found = first if rule is None else str(rules[rule])
        if not found:
            raise UsageError(
                code="rule-without-panel",
                where=str(self.path),
                what="no panel met the rule's demand",
                accepted=f"a panel of the frontier: {name_some(names)}",
                next_step="Name one by --panel, or run with another demand",
            )
        return found

    def frontier_row(self, name: str) -> dict[str, str]:
        """Return a panel's row of ``frontier.csv``."""
        return next(row for row in self._frontier if row["panel"] == name)

    def headline(self, name: str) -> Mapping[str, Any] | None:
        """Return the headline where it is this panel's, else None."""
        if self._choice["rules"][0]["panel"] != name:
            return None
        found: Mapping[str, Any] = self._choice["headline"]
        return found

    def penalty(self, name: str) -> float:
        """Return the tuned ridge penalty of a panel.

        Raises
        ------
        RunFolderError
            The run did not write it.
        """
        for row in self.rows("panels/penalties.csv"):
            if row["panel"] == name:
                return float(row["ridge_penalty"])
        raise _unfinished(self.path, "panels/penalties.csv")

    def out_of_fold(self, name: str) -> OutOfFoldRows:
        """Return out-of-fold log-odds of a panel: nested ones for the primary choice.

        Parameters
        ----------
        name : str
            The panel.

        Returns
        -------
        OutOfFoldRows
            Samples in the run's order.

        Raises
        ------
        RunFolderError
            The tables are not there.
        """
        row = self.frontier_row(name)
        maker, size = row["maker"], row["size"]
        if self.headline(name) is not None:
            maker, size = PRIMARY, "0"
        order: dict[str, tuple[str, float]] = {}
        for each in self.rows("folds.csv"):
            order[each["sample"]] = (each["subject"], float(each["weight"]))
        place = {sample: i for i, sample in enumerate(order)}
        people = {
            s: k for k, s in enumerate(dict.fromkeys(s for s, _ in order.values()))
        }
        own = [
            each
            for each in self.rows("predictions.csv")
            if each["maker"] == maker and each["size"] == size
        ]
        if not own:
            raise _unfinished(self.path, "predictions.csv")
        repeats = 1 + max(int(each["repeat"]) for each in own)
        chances = np.full((repeats, len(order)), np.nan)
        outcome = np.zeros(len(order))
        for each in own:
            i = place[each["sample"]]
            outcome[i] = float(each["outcome"])
            if each["score"]:
                chances[int(each["repeat"]), i] = float(each["score"])
        return OutOfFoldRows(
            log_odds_of(chances),
            outcome,
            np.array([weight for _subject, weight in order.values()]),
            np.array([people[subject] for subject, _w in order.values()], np.int64),
        )

    def refuse_other_study(self, plan: Study, known: CheckedStudy) -> None:
        """Refuse a study that is not the one of the run.

        Raises
        ------
        RunFolderError
            Other settings or other data.
        """
        steps = preparation_tables(known.procedure.recipe, known.procedure.assay)
        inputs = {**(known.cohort.sources or {}), **known.price_hashes}
        own = run_record(plan, inputs, steps)
        kept = self.record
        settings = json.loads(json.dumps(own.study))
        if settings != kept["study"] or dict(own.inputs) != kept["inputs"]:
            raise RunFolderError(
                code="study-of-another-run",
                where=str(plan.path),
                what=f"its settings or data are not those of {self.path}",
                accepted="the study file that made the run, and the same data",
                next_step="Name that study, or run this one",
            )


def _unfinished(path: Path, name: str) -> RunFolderError:
    return RunFolderError(
        code="no-finished-run",
        where=f"{path}, {name}",
        what="it is missing or cannot be read",
        accepted="the folder of a finished `panelkit run`",
        next_step="Name such a folder, or finish the run",
    )
