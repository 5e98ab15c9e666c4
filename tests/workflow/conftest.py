"""A tiny cohort with people, roles and prices, and its study; a run takes a second."""

import json
import shutil
from dataclasses import dataclass, field
from pathlib import Path

import numpy as np
import pandas as pd
import pytest

from panelkit import run_study

N_SAMPLES, N_PEOPLE, N_FEATURES = 40, 30, 60
FEATURES = [f"F{number:02d}" for number in range(N_FEATURES)]
MARKERS = FEATURES[:4]
CONTROLS = ["F58", "F59"]
NEVER, ALWAYS = "F57", "F56"
NOT_IN_RESULTS = {"timings.json", "run.log"}
PLATFORM = """
[platform.{name}]
positions = 96
plex = {plex}
setup = 500
run_cost = 40
sample_cost = 1
"""


def written(value):
    """Return a value as TOML writes it."""
    if isinstance(value, dict):
        inside = ", ".join(f'"{key}" = {written(v)}' for key, v in value.items())
        return f"{{ {inside} }}"
    if isinstance(value, list | tuple):
        return f"[{', '.join(written(item) for item in value)}]"
    return json.dumps(value)


def settings():
    return {
        "cohort": {
            "expression": "expression.csv",
            "samples": "samples.csv",
            "features": "features.csv",
            "outcome": "response",
            "positive": "yes",
            "subject": "person",
        },
        "preparation": {"discovery": ["filter", "median-fill"]},
        "shortlist": {
            "subsamples": 8,
            "candidates": 8,
            "never": [NEVER],
            "always": [ALWAYS],
        },
        "panels": {
            "sizes": [1, 2, 3],
            "prices": "prices.csv",
            "platforms": ["wells.toml", "pools.toml"],
        },
        "accuracy": {
            "folds": 3,
            "repeats": 2,
            "inner_folds": 2,
            "inner_subsamples": 8,
        },
        "choice": {"primary": {"rule": "smallest-within-one-se"}},
        "programme": {"currency": "EUR", "samples": 200},
    }


@dataclass
class Tiny:
    """Files of a study that tests write, change and run.

    Thirty people, ten of them with two samples. Controls and the feature that is
    never to be used separate the classes better than every marker, so that a run
    that does not bar them chooses them first.
    """

    folder: Path
    seed: int = 4
    sections: dict = field(default_factory=settings)
    expression: pd.DataFrame = field(init=False)
    samples: pd.DataFrame = field(init=False)

    def __post_init__(self):
        draws = np.random.default_rng(11)
        person = np.concatenate([np.arange(N_PEOPLE), np.arange(10)])
        sick = person % 2
        values = draws.normal(8.0, 1.0, (N_SAMPLES, N_FEATURES))
        values[:, :4] += 1.2 * sick[:, None]
        values[:, 57:] += 3.0 * sick[:, None]
        values[draws.random(values.shape) < 0.05] = np.nan
        ids = [f"S{number:02d}" for number in range(N_SAMPLES)]
        self.expression = pd.DataFrame(
            values.round(4), index=pd.Index(ids, name="sample_id"), columns=FEATURES
        )
        self.samples = pd.DataFrame(
            {
                "sample_id": ids,
                "response": np.where(sick, "yes", "no"),
                "person": [f"P{number:02d}" for number in person],
                "plate": [f"plate {number % 3}" for number in range(N_SAMPLES)],
            }
        )

    def write(self):
        """Write all files; return the study's path."""
        self.folder.mkdir(parents=True, exist_ok=True)
        self.expression.to_csv(self.folder / "expression.csv")
        self.samples.to_csv(self.folder / "samples.csv", index=False)
        roles = ["control" if name in CONTROLS else "marker" for name in FEATURES]
        pd.DataFrame({"feature": FEATURES, "role": roles}).to_csv(
            self.folder / "features.csv", index=False
        )
        for name, plex in (("wells", 1), ("pools", 8)):
            text = PLATFORM.format(name=name, plex=plex)
            (self.folder / f"{name}.toml").write_text(text)
        prices = [("*", "wells", "ok", 100, "2.50"), ("*", "pools", "ok", 300, "1.20")]
        pd.DataFrame(
            prices, columns=["marker", "platform", "status", "dev", "test"]
        ).to_csv(self.folder / "prices.csv", index=False)
        lines = [f"seed = {self.seed}"]
        for name, keys in self.sections.items():
            lines.append(f"[{name}]")
            lines += [f"{key} = {written(value)}" for key, value in keys.items()]
        path = self.folder / "study.toml"
        path.write_text("\n".join(lines) + "\n")
        return path


@dataclass(frozen=True)
class Finished:
    """A finished run of the tiny study; tests read it and change nothing."""

    path: Path

    def table(self, name):
        return pd.read_csv(
            self.path / name, dtype={"sample": str, "markers": str, "subject": str}
        )

    def json(self, name):
        return json.loads((self.path / name).read_text(encoding="utf-8"))


@pytest.fixture
def tiny(tmp_path):
    return Tiny(tmp_path / "study")


@pytest.fixture(scope="session")
def contents():
    """Every file of a run folder with its bytes, but the clock and the log."""

    def read(folder):
        return {
            path.relative_to(folder).as_posix(): path.read_bytes()
            for path in sorted(folder.rglob("*"))
            if path.is_file() and path.name not in NOT_IN_RESULTS
        }

    return read


@pytest.fixture(scope="session")
def study(tmp_path_factory):
    """The tiny study as it stands, written once."""
    return Tiny(tmp_path_factory.mktemp("tiny") / "study").write()


@pytest.fixture(scope="session")
def finished(study, tmp_path_factory):
    """A run of the tiny study on one thread."""
    out = tmp_path_factory.mktemp("run") / "out"
    return Finished(run_study(study, out, threads=1).path)


@pytest.fixture
def copy_of_run(finished, tmp_path):
    """A copy of the finished run that a test may spoil."""
    return Path(shutil.copytree(finished.path, tmp_path / "copy"))
