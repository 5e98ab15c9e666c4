"""A small cohort whose files tests write, spoil and read."""

from dataclasses import dataclass, field
from pathlib import Path

import numpy as np
import pandas as pd
import pytest


@dataclass
class Small:
    """Twenty-four samples with leading zeros in their ids, six features."""

    folder: Path
    matrix: pd.DataFrame = field(init=False)
    sheet: pd.DataFrame = field(init=False)

    def __post_init__(self):
        draws = np.random.default_rng(0)
        ids = [f"{number:04d}" for number in range(1, 25)]
        self.matrix = pd.DataFrame(
            draws.normal(7.0, 2.0, (24, 6)),
            index=pd.Index(ids, name="sample_id"),
            columns=["007", "B_2", "C-3", "d 4", "E5", "F6"],
        )
        self.sheet = pd.DataFrame(
            {
                "sample_id": ids,
                "group": ["case", "control"] * 12,
                "age": [str(30 + number) for number in range(24)],
                "clinic": ["north"] * 12 + ["south"] * 12,
            }
        )

    def write(self, **options):
        """Write both files as another program would; return their paths."""
        expression = self.folder / "expression.csv"
        samples = self.folder / "samples.csv"
        self.matrix.to_csv(expression, **options)
        self.sheet.to_csv(samples, index=False)
        return expression, samples


@pytest.fixture
def small(tmp_path):
    return Small(tmp_path)
