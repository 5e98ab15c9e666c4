"""The command line in process, and a tiny study for it."""

import json
from dataclasses import dataclass
from pathlib import Path

import numpy as np
import pandas as pd
import pytest

from panelkit.cli.app import main

STUDY = """seed = 4
[cohort]
expression = "expression.csv"
samples = "samples.csv"
outcome = "response"
positive = "yes"
[shortlist]
subsamples = 8
candidates = 8
[panels]
sizes = [1, 2, 3]
[accuracy]
folds = 2
repeats = 1
inner_folds = 2
inner_subsamples = 8
"""
PRICING = """
[programme]
currency = "EUR"
samples = 100
[platform.wells]
positions = 96
"""


@dataclass(frozen=True)
class Answer:
    """What a command left behind."""

    code: int
    out: str
    err: str

    @property
    def sentence(self):
        """The last line of standard error: the error."""
        return self.err.strip().splitlines()[-1]


@dataclass
class Files:
    """Forty samples, sixty features, three of which differ between the classes."""

    folder: Path

    def __post_init__(self):
        draws = np.random.default_rng(3)
        sick = np.arange(40) % 2
        values = draws.normal(8.0, 1.0, (40, 60))
        values[:, :3] += 1.2 * sick[:, None]
        ids = [f"S{number:02d}" for number in range(40)]
        self.expression = pd.DataFrame(
            values.round(4),
            index=pd.Index(ids, name="sample_id"),
            columns=[f"F{number:02d}" for number in range(60)],
        )
        self.samples = pd.DataFrame(
            {"sample_id": ids, "response": np.where(sick, "yes", "no")}
        )
        self.samples["plate"] = self.samples["response"]
        self.study = STUDY

    @property
    def path(self):
        return self.folder / "study.toml"

    def change(self, old, new):
        assert old in self.study
        self.study = self.study.replace(old, new)

    def price(self):
        """Add a programme, a platform and prices to the study."""
        self.change("[1, 2, 3]\n", '[1, 2, 3]\nprices = "prices.csv"\n')
        self.study += PRICING
        (self.folder / "prices.csv").write_text(
            "marker,platform,status,dev,test\n*,wells,ok,100,2.50\n"
        )

    def write(self):
        self.expression.to_csv(self.folder / "expression.csv")
        self.samples.to_csv(self.folder / "samples.csv", index=False)
        self.path.write_text(self.study)
        return str(self.path)


@pytest.fixture
def panelkit(capfd):
    """Run a command as `main` does; a traceback is not caught."""

    def run(*arguments):
        capfd.readouterr()
        with pytest.raises(SystemExit) as left:
            main([str(each) for each in arguments])
        said = capfd.readouterr()
        return Answer(left.value.code, said.out, said.err)

    return run


@pytest.fixture
def files(tmp_path):
    folder = tmp_path / "files"
    folder.mkdir()
    return Files(folder)


@pytest.fixture(scope="session")
def run_folder(tmp_path_factory):
    """The run folder of a priced study, made once by `panelkit run`."""
    base = tmp_path_factory.mktemp("cli")
    files = Files(base)
    files.price()
    out = base / "out"
    with pytest.raises(SystemExit) as left:
        main(["run", files.write(), "--out", str(out), "--threads", "1", "--quiet"])
    assert left.value.code == 0
    return out


@pytest.fixture(scope="session")
def read_json():
    """Read JSON as strictly as a program of somebody else: no NaN."""

    def refuse(word):
        raise AssertionError(f"{word} is not JSON")

    def read(text):
        return json.loads(text, parse_constant=refuse)

    return read
