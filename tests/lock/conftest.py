"""A small cohort of linear intensities, its run, and the panel locked on it."""

from dataclasses import dataclass
from pathlib import Path

import numpy as np
import pandas as pd
import pytest

from panelkit import lock_panel, run_study

N_FEATURES = 30
FEATURES = [f"F{number:02d}" for number in range(N_FEATURES)]
STUDY = """seed = 3
[cohort]
expression = "expression.csv"
samples = "samples.csv"
features = "features.csv"
outcome = "response"
positive = "yes"
subject = "person"
{more}
[shortlist]
subsamples = 8
candidates = 8
[panels]
sizes = [2, 3]
makers = ["univariate"]
[accuracy]
folds = 3
repeats = 2
inner_folds = 2
inner_subsamples = 8
learning_curve = false
[choice]
primary = {{ rule = "smallest-within-margin", margin = 0.001 }}
"""


def drawn(seed, n, *, shift=0.0, effect=1.0):
    """Return intensities and the outcome of invented people."""
    draws = np.random.default_rng(seed)
    sick = np.arange(n) % 2
    logs = draws.normal(8.0, 1.0, (n, N_FEATURES)) + shift
    logs[:, :4] += effect * sick[:, None]
    values = (2.0**logs).round(2)
    values[draws.random(values.shape) < 0.02] = np.nan
    ids = pd.Index([f"S{seed}-{k:03d}" for k in range(n)], name="sample_id")
    expression = pd.DataFrame(values, index=ids, columns=FEATURES)
    samples = pd.DataFrame(
        {
            "response": np.where(sick, "yes", "no"),
            "person": [f"P{seed}-{k:03d}" for k in range(n)],
            "site": np.where(np.arange(n) % 3, "north", "south"),
        },
        index=ids,
    )
    return expression, samples


@dataclass(frozen=True)
class Locked:
    """Files around one locked panel."""

    folder: Path
    study: Path
    run: Path
    panel: Path


def written(folder, expression, samples):
    folder.mkdir(parents=True, exist_ok=True)
    expression.to_csv(folder / "expression.csv")
    samples.to_csv(folder / "samples.csv")
    return folder / "expression.csv", folder / "samples.csv"


def write_study(folder, more=""):
    expression, samples = drawn(1, 90)
    written(folder, expression, samples)
    sheet = {"feature": FEATURES, "role": ["marker"] * 28 + ["reference"] * 2}
    sheet["analyte"] = [f"A{number:02d}" for number in range(N_FEATURES)]
    pd.DataFrame(sheet).to_csv(folder / "features.csv", index=False)
    (folder / "study.toml").write_text(STUDY.format(more=more))
    return folder / "study.toml"


@pytest.fixture(scope="session")
def locked(tmp_path_factory):
    folder = tmp_path_factory.mktemp("lock")
    study = write_study(folder)
    run = run_study(study, folder / "run", threads=1).path
    lock_panel(run, folder / "panel.json", cutoffs=["youden", "sensitivity=0.9"])
    return Locked(folder, study, run, folder / "panel.json")


@pytest.fixture
def study_with(tmp_path):
    """Write the study with more keys."""
    return lambda more: write_study(tmp_path / "study", more)


@pytest.fixture
def people(tmp_path):
    """Write new people; return their two files."""

    def make(seed=2, n=80, **how):
        return written(tmp_path / f"people-{seed}", *drawn(seed, n, **how))

    return make
