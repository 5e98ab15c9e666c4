"""Make the invented Quillmere sample cohort, the same bytes on every run.

The scenario: people with early joint inflammation seen at three clinics of an
invented town, blood transcripts, and response to a first treatment at six months;
then a later cohort from a fourth clinic. Nothing here describes real people.

Run it as ``python sample_cohorts/make_quillmere.py``; the files go to the folder
``quillmere`` beside this script unless ``--folder`` says otherwise.
"""

import argparse
import csv
import gzip
import io
import json
from collections.abc import Iterable, Mapping
from dataclasses import dataclass, replace
from datetime import date, timedelta
from pathlib import Path
from typing import Any

import numpy as np
import numpy.typing as npt
import pandas as pd
from sklearn.linear_model import LogisticRegression
from sklearn.metrics import roc_auc_score

Floats = npt.NDArray[np.float64]
Ints = npt.NDArray[np.int64]
Bools = npt.NDArray[np.bool_]

SEED = 20_240_917
FEATURE_COUNT = 6_000
CONTROL_COUNT = 12
NULL_GROUP_COUNT = 150

# Standardised mean difference of the best member of each informative group. The
# squares add up to about 4.2, which is what keeps the reachable AUC near 0.92.
GROUP_EFFECTS = (1.0, 0.9, 0.8, 0.7, 0.6, 0.55, 0.5, 0.5, 0.45, 0.45, 0.4, 0.4)
GROUP_SIZES = (3, 4, 3, 5, 4, 6, 4, 5, 7, 5, 6, 7)
GROUP_SIGNS = (1, -1, 1, 1, -1, 1, -1, -1, 1, -1, 1, -1)
GROUPS_LOST_LATER = (4, 8)  # positions in the tuples above

# Responders among the people of each clinic: nearly the same share everywhere.
CLINICS = {"Harbour": (100, 46), "Millgate": (85, 38), "Orchard": (75, 33)}
PEOPLE_PER_PLATE = (37, 37, 36, 34, 31, 29, 28, 28)
SECOND_VISITS_PER_PLATE = (7, 7, 7, 7, 6, 6, 0, 0)
REPLICATE_COUNT = 8
UNKNOWN_OUTCOMES = 6

LATER_COUNT = 90
LATER_RESPONDERS = 32
LATER_PLATES = ("L01", "L02", "L03")

SHIFTED_CLINIC = "Orchard"
CLINIC_SHIFT = 0.35
CLINIC_FEATURE_SD = 0.10
LATER_SHIFT = 0.20
PLATE_FEATURE_SD = 0.05
NOISE_SD = 0.10
LATER_NOISE_SD = 0.25
PERSON_SHARE = 0.75  # of biological variance; the rest is new at each visit

DIRTY_TEXTS = ("n/a", "ERR", "<5", "#VALUE!", "see note", "overflow")
ORACLE_PEOPLE = 40_000

SAMPLE_COLUMNS = [
    "sample_id",
    "person",
    "clinic",
    "run_date",
    "plate",
    "visit",
    "age",
    "sex",
    "handling_hours",
    "replicate_of",
    "response_6m",
]
PRICE_COLUMNS = [
    "marker",
    "platform",
    "role",
    "status",
    "dev",
    "test",
    "pack",
    "pack_price",
    "tiers",
    "slots",
    "class",
    "fail_rate",
    "cv_pct",
    "concordance",
    "backup_of",
    "quote_date",
    "note",
]

PLATFORM_WELLS = """\
# Invented platform: one marker a well. Money is in plain units of one currency.
[platform.wells]
family = "rt-qpcr"
positions = 384          # wells on one plate
plex = 1                 # markers measured in one well
replicates = 2           # wells a marker and sample
controls_per_pool = 2    # control wells for each marker on a plate
controls_per_run = 4     # further control wells on a plate, whatever the panel
groups = "auto"          # any markers may share a plate
refs_scope = "panel"     # reference markers are measured once for each sample
setup = 900.00           # once, to set the method up
pool_setup = 0.00        # once for each pool: there are no pools here
run_cost = 38.00         # each plate run
position_cost = 0.21     # each well filled
sample_cost = 3.40       # each sample, extraction included
prep_positions = 96      # samples in one preparation round
prep_cost = 55.00        # each preparation round
overage = 0.10           # reagent bought beyond what is used
lot_months = 12          # a lot of reagents lasts so long
lot_cost = 140.00        # checking a new lot against the old one
"""

PLATFORM_BEADS = """\
# Invented platform: custom pools of coded beads that catch transcripts. No family is
# given: the known bead family is for proteins and its defaults would mislead.
[platform.beads]
positions = 96           # wells on one plate
plex = 10                # markers in one pool at most
replicates = 1           # wells a pool and sample
controls_per_pool = 16   # standard and control wells for each pool on a plate
controls_per_run = 0     # no others
groups = "each"          # markers of different class never share a pool
refs_scope = "pool"      # reference markers would be needed in every pool
setup = 1500.00          # once, to set the method up
pool_setup = 650.00      # once for each pool
run_cost = 62.00         # each plate run
position_cost = 2.60     # each well filled
sample_cost = 2.10       # each sample
prep_positions = 96      # samples in one preparation round
prep_cost = 30.00        # each preparation round
overage = 0.15           # reagent bought beyond what is used
lot_months = 9           # a lot of beads lasts so long
lot_cost = 480.00        # checking a new lot against the old one
"""


@dataclass(frozen=True)
class Features:
    """What each feature does, one array element a feature.

    Attributes
    ----------
    ids, symbols : arrays of str
        Public names; ids carry no hint of what is planted.
    mean, spread : arrays of float
        Mean and biological standard deviation on the log2 scale.
    group, loading : arrays
        Factor that drives the feature (-1 for none) and its loading.
    sex, age, handling : arrays of float
        Log2 effect of being male, of a decade, of an hour.
    clinic : array of float
        Own part of the shift at the clinic with the shifted scale.
    """

    ids: npt.NDArray[np.str_]
    symbols: npt.NDArray[np.str_]
    mean: Floats
    spread: Floats
    group: Ints
    loading: Floats
    sex: Floats
    age: Floats
    handling: Floats
    clinic: Floats

    def take(self, positions: Ints) -> "Features":
        """Return the features at these positions."""
        return Features(
            *(getattr(self, name)[positions] for name in self.__dataclass_fields__)
        )


@dataclass(frozen=True)
class Layout:
    """Positions of the features with a planted part."""

    informative: list[Ints]
    null_groups: list[Ints]
    sex: Ints
    age: Ints
    handling: Ints
    references: Ints
    constant: Ints
    mostly_missing: Ints
    duplicate: int
    duplicate_source: int
    controls: Ints
    plain: Ints


@dataclass(frozen=True)
class Condition:
    """How one cohort differs from another.

    Attributes
    ----------
    shifts : array of float
        Distance of the factor means between responders and others.
    noise : float
        Standard deviation of measurement noise, log2.
    scale : float
        Shift of all log2 values of the cohort.
    """

    shifts: Floats
    noise: float
    scale: float


def plan_layout(generator: np.random.Generator) -> Layout:
    """Lay the planted parts out one after the other; ids are shuffled later."""
    start = 0

    def block(count: int) -> Ints:
        nonlocal start
        start += count
        return np.arange(start - count, start, dtype=np.int64)

    informative = [block(size) for size in GROUP_SIZES]
    sizes = generator.integers(3, 11, size=NULL_GROUP_COUNT)
    null_groups = [block(int(size)) for size in sizes]
    return Layout(
        informative=informative,
        null_groups=null_groups,
        sex=block(15),
        age=block(30),
        handling=block(40),
        references=block(2),
        constant=block(2),
        mostly_missing=block(2),
        duplicate=int(block(1)[0]),
        duplicate_source=int(null_groups[0][0]),
        controls=block(CONTROL_COUNT),
        plain=block(FEATURE_COUNT - start),
    )


def invent_names(
    generator: np.random.Generator, layout: Layout
) -> tuple[npt.NDArray[np.str_], npt.NDArray[np.str_]]:
    """Return ids and symbols; the stems are built so as to name no real gene."""
    control = np.zeros(FEATURE_COUNT, dtype=bool)
    control[layout.controls] = True
    numbers = generator.permutation(FEATURE_COUNT - CONTROL_COUNT) + 1
    ids = np.empty(FEATURE_COUNT, dtype="U8")
    ids[~control] = [f"QM{number:05d}" for number in numbers]
    ids[control] = [f"CTRL_{number:02d}" for number in range(1, CONTROL_COUNT + 1)]
    stems = ["Q" + a + b + c for a in "BGJNVWXZ" for b in "DHKLMN" for c in "FGPTVX"]
    pool = [f"{stem}{number}" for stem in stems for number in range(1, 22)]
    symbols = np.array(pool, dtype="U8")[generator.permutation(len(pool))]
    symbols = symbols[:FEATURE_COUNT]
    symbols[control] = [f"QCTL{number}" for number in range(1, CONTROL_COUNT + 1)]
    return ids, symbols


def signed(
    generator: np.random.Generator, low: float, high: float, size: int
) -> Floats:
    """Return values between low and high in size, of either sign."""
    signs = generator.choice(np.array([-1.0, 1.0]), size=size)
    return signs * generator.uniform(low, high, size=size)


def plan_features(generator: np.random.Generator, layout: Layout) -> Features:
    """Draw the parameters of all features."""
    ids, symbols = invent_names(generator, layout)
    zero = np.zeros(FEATURE_COUNT)
    mean = 4.0 + 9.0 * generator.beta(1.6, 2.0, size=FEATURE_COUNT)
    spread = generator.uniform(0.5, 0.9, size=FEATURE_COUNT)
    group = np.full(FEATURE_COUNT, -1, dtype=np.int64)
    loading = zero.copy()
    for number, members in enumerate(layout.informative):
        group[members] = number
        loading[members] = np.sqrt(generator.uniform(0.78, 0.86, size=len(members)))
    for number, members in enumerate(layout.null_groups, start=len(GROUP_SIZES)):
        group[members] = number
        common = generator.uniform(0.5, 0.9)
        loading[members] = np.sqrt(common)
    planted = np.concatenate(layout.informative)
    mean[planted] = generator.uniform(6.5, 11.5, size=len(planted))
    mean[layout.references] = (9.4, 10.1)
    spread[layout.references] = 0.12
    mean[layout.controls] = np.linspace(5.0, 12.0, CONTROL_COUNT)
    spread[layout.controls] = 0.06
    sex, age, handling = zero.copy(), zero.copy(), zero.copy()
    sex[layout.sex] = signed(generator, 0.5, 1.4, len(layout.sex))
    age[layout.age] = signed(generator, 0.20, 0.40, len(layout.age))
    handling[layout.handling] = signed(generator, 0.10, 0.22, len(layout.handling))
    clinic = generator.normal(0.0, CLINIC_FEATURE_SD, size=FEATURE_COUNT)
    return Features(
        ids, symbols, mean, spread, group, loading, sex, age, handling, clinic
    )


def single_effects(features: Features, shifts: Floats, noise: float) -> Floats:
    """Return the standardised mean difference of each feature within a clinic."""
    total = np.sqrt(features.spread**2 + noise**2 + PLATE_FEATURE_SD**2)
    shift = np.where(features.group >= 0, shifts[features.group], 0.0)
    effects: Floats = features.loading * shift * features.spread / total
    return effects


def plan_shifts(features: Features, layout: Layout) -> Floats:
    """Return the factor shifts that give the best members their stated effect."""
    count = len(GROUP_SIZES) + NULL_GROUP_COUNT
    reached = single_effects(features, np.ones(count), NOISE_SD)
    shifts = np.zeros(count)
    for number, members in enumerate(layout.informative):
        wanted = GROUP_EFFECTS[number] * GROUP_SIGNS[number]
        shifts[number] = wanted / reached[members].max()
    return shifts


def spaced_slots(counts: tuple[int, ...]) -> Ints:
    """Spread labels 0, 1, ... evenly so that any run of slots is a fair share."""
    places = [
        ((step + 0.5) / count, label)
        for label, count in enumerate(counts)
        for step in range(count)
    ]
    return np.array([label for _, label in sorted(places)], dtype=np.int64)


def draw_people(generator: np.random.Generator) -> pd.DataFrame:
    """Draw the people of the first cohort with clinic, outcome and plate."""
    clinic = [name for name, (count, _) in CLINICS.items() for _ in range(count)]
    responder = [
        place < responders
        for count, responders in CLINICS.values()
        for place in range(count)
    ]
    people = pd.DataFrame({"clinic": clinic, "responder": responder})
    people = people.iloc[generator.permutation(len(people))]
    # Dealt within outcome and clinic, so that no plate leans to either.
    people = people.sort_values(["responder", "clinic"], kind="stable")
    people["plate"] = spaced_slots(PEOPLE_PER_PLATE)
    return finish_people(generator, people, first_number=1)


def finish_people(
    generator: np.random.Generator, people: pd.DataFrame, first_number: int
) -> pd.DataFrame:
    """Shuffle people, number them, and draw what is not tied to the outcome."""
    people = people.iloc[generator.permutation(len(people))].reset_index(drop=True)
    count = len(people)
    people["person"] = [f"QP{first_number + place:03d}" for place in range(count)]
    age = generator.normal(49.0, 13.0, size=count)
    people["age"] = np.clip(np.rint(age), 20, 82).astype(int)
    people["sex"] = np.where(generator.random(count) < 0.66, "F", "M")
    people["known"] = True
    return people


def draw_rows(generator: np.random.Generator, people: pd.DataFrame) -> pd.DataFrame:
    """Return one row a measurement: first visits, second visits, replicates."""
    first = pd.DataFrame({"who": people.index, "plate": people["plate"], "visit": 1})
    again: list[int] = []
    for plate, count in enumerate(SECOND_VISITS_PER_PLATE):
        pool = people.index[people["plate"] == plate].to_numpy()
        again += generator.choice(pool, size=count, replace=False).tolist()
    # Two plates on: the second visit is always measured after the first.
    second = first.loc[again].assign(visit=2)
    second["plate"] += 2
    rows = pd.concat([first, second], ignore_index=True)
    rows["handling_hours"] = np.round(
        generator.gamma(4.0, 1.0, size=len(rows)) + 0.5, 1
    )
    rows["biology"] = np.arange(len(rows))
    rows["copy"] = False
    pool = rows.index[(rows["plate"] < 7) & (rows["visit"] == 1)].to_numpy()
    copied = generator.choice(pool, size=REPLICATE_COUNT, replace=False)
    copies = rows.loc[copied].assign(copy=True)
    copies["plate"] += 1
    rows = pd.concat([rows, copies], ignore_index=True)
    return date_rows(generator, rows, date(2024, 2, 5), 37)


def date_rows(
    generator: np.random.Generator, rows: pd.DataFrame, start: date, days_apart: int
) -> pd.DataFrame:
    """Give each row a run date within the weeks of its plate, and sort by date."""
    # Three run days a plate; the first day of a plate follows the last of the former.
    extra = generator.choice(np.array([0, 7, 16]), size=len(rows))
    days = rows["plate"].to_numpy() * days_apart + extra
    rows = rows.assign(
        day=days, run_date=[(start + timedelta(int(day))).isoformat() for day in days]
    )
    order = np.lexsort((generator.random(len(rows)), rows["day"].to_numpy()))
    return rows.iloc[order].reset_index(drop=True)


def publish_samples(
    rows: pd.DataFrame, people: pd.DataFrame, plates: list[str], prefix: str
) -> pd.DataFrame:
    """Return the sample table as written, with names for numbers."""
    who = rows["who"].to_numpy()
    table = people.loc[who].reset_index(drop=True).drop(columns="plate")
    width = 4 if len(rows) > 99 else 3
    table["sample_id"] = [
        f"{prefix}{place + 1:0{width}d}" for place in range(len(rows))
    ]
    table["plate"] = [plates[plate] for plate in rows["plate"]]
    for column in ("run_date", "visit", "handling_hours"):
        table[column] = rows[column]
    original = rows["copy"].to_numpy() == np.False_
    named = dict(
        zip(rows["biology"][original], table["sample_id"][original], strict=True)
    )
    table["replicate_of"] = [
        named[biology] if copy else ""
        for biology, copy in zip(rows["biology"], rows["copy"], strict=True)
    ]
    outcome = np.where(table["responder"], "responder", "non-responder")
    table["response_6m"] = np.where(table["known"], outcome, "")
    return table


def draw_factors(
    generator: np.random.Generator, people: pd.DataFrame, shifts: Floats, who: Ints
) -> Floats:
    """Return factor values, one row for each visit of a person in ``who``."""
    side = np.where(people["responder"].to_numpy(), 0.5, -0.5)
    lasting = generator.standard_normal((len(people), len(shifts)))
    passing = generator.standard_normal((len(who), len(shifts)))
    factors: Floats = (
        side[who, np.newaxis] * shifts
        + np.sqrt(PERSON_SHARE) * lasting[who]
        + np.sqrt(1.0 - PERSON_SHARE) * passing
    )
    return factors


def draw_log2(
    generator: np.random.Generator,
    features: Features,
    people: pd.DataFrame,
    rows: pd.DataFrame,
    condition: Condition,
) -> tuple[Floats, Floats]:
    """Measure all rows.

    Returns
    -------
    values : array of shape (rows, features)
        Log2 intensities.
    factors : array of shape (visits, factors)
        The factor values behind them, in the order of ``rows["biology"]``.
    """
    unique = rows.drop_duplicates("biology").sort_values("biology")
    who = unique["who"].to_numpy()
    factors = draw_factors(generator, people, condition.shifts, who)
    width = len(features.ids)
    lasting = generator.standard_normal((len(people), width))
    own = np.sqrt(PERSON_SHARE) * lasting[who]
    own += np.sqrt(1.0 - PERSON_SHARE) * generator.standard_normal((len(who), width))
    common = np.where(features.group >= 0, factors[:, features.group], 0.0)
    biology = features.loading * common + np.sqrt(1.0 - features.loading**2) * own
    values = features.mean + features.spread * biology[rows["biology"].to_numpy()]
    of_rows = people.loc[rows["who"]]
    hours = rows["handling_hours"].to_numpy() - 4.5
    values += np.outer(of_rows["sex"].to_numpy() == "M", features.sex)
    values += np.outer((of_rows["age"].to_numpy() - 49) / 10, features.age)
    values += np.outer(hours, features.handling)
    shifted = of_rows["clinic"].to_numpy() == SHIFTED_CLINIC
    values += np.outer(shifted, CLINIC_SHIFT + features.clinic)
    plate = rows["plate"].to_numpy()
    steps = generator.normal(0.0, PLATE_FEATURE_SD, size=(int(plate.max()) + 1, width))
    values += steps[plate] + condition.scale
    values += generator.normal(0.0, condition.noise, size=values.shape)
    return values, factors


def blank_cells(
    generator: np.random.Generator, log2_values: Floats, layout: Layout
) -> Floats:
    """Return linear values with blanks, constants and the duplicate put in."""
    chance = 0.001 + np.minimum(0.30, 0.066 * np.exp2(-1.1 * (log2_values - 4.0)))
    chance[:, layout.controls] = 0.001
    chance[:, layout.mostly_missing] = (0.46, 0.58)
    values = np.exp2(log2_values)
    values[generator.random(values.shape) < chance] = np.nan
    values[:, layout.constant] = (64.0, 250.0)
    values[:, layout.duplicate] = values[:, layout.duplicate_source]
    return values


def show(value: float) -> str:
    """Write an intensity with three significant digits, blank when missing."""
    if value != value:
        return ""
    if value < 9.995:
        return f"{value:.2f}"
    if value < 99.95:
        return f"{value:.1f}"
    if value < 999.5:
        return f"{value:.0f}"
    return f"{float(f'{value:.3g}'):.0f}"


def write_matrix(path: Path, names: list[str], cells: list[list[str]]) -> None:
    """Write a compressed table whose bytes depend on its content only."""
    text = io.StringIO()
    for row in [names, *cells]:
        text.write(",".join(row) + "\n")
    with (
        path.open("wb") as raw,
        gzip.GzipFile("", "wb", compresslevel=9, fileobj=raw, mtime=0) as packed,
    ):
        packed.write(text.getvalue().encode())


def as_cells(sample_ids: list[str], values: Floats, order: Ints) -> list[list[str]]:
    """Turn values into text, columns in the given order."""
    return [
        [sample_id, *(show(value) for value in row)]
        for sample_id, row in zip(sample_ids, values[:, order].tolist(), strict=True)
    ]


def plant_dirt(
    generator: np.random.Generator, cells: list[list[str]], names: list[str], pool: Ints
) -> list[dict[str, Any]]:
    """Overwrite one filled cell for each dirty text and say where."""
    columns = generator.choice(pool, size=len(DIRTY_TEXTS), replace=False) + 1
    rows = generator.choice(len(cells), size=len(DIRTY_TEXTS), replace=False)
    found = []
    for text, row, column in zip(DIRTY_TEXTS, rows, columns, strict=True):
        # Only a filled cell counts as dirtied: move down past blanks.
        while not cells[row][column]:
            row = (row + 1) % len(cells)
        cells[row][column] = text
        found.append(
            {
                "row": int(row),
                "sample_id": cells[row][0],
                "column": names[column],
                "text": text,
            }
        )
    return found


def column_order(generator: np.random.Generator, features: Features) -> Ints:
    """Order columns by id with the controls strewn among them."""
    places = [
        generator.uniform(0, FEATURE_COUNT) if name.startswith("C") else float(name[2:])
        for name in features.ids
    ]
    return np.argsort(places, kind="stable").astype(np.int64)


def draw_later(generator: np.random.Generator) -> tuple[pd.DataFrame, pd.DataFrame]:
    """Draw the people and rows of the later cohort, one row a person."""
    people = pd.DataFrame({"responder": np.arange(LATER_COUNT) < LATER_RESPONDERS})
    people["clinic"] = "Lantern"
    third = LATER_COUNT // len(LATER_PLATES)
    people["plate"] = spaced_slots((third,) * len(LATER_PLATES))
    people = finish_people(generator, people, first_number=301)
    rows = pd.DataFrame({"who": people.index, "plate": people["plate"], "visit": 1})
    hours = generator.gamma(4.0, 1.2, size=LATER_COUNT) + 0.5
    rows = rows.assign(handling_hours=np.round(hours, 1), biology=rows["who"])
    rows["copy"] = False
    return people, date_rows(generator, rows, date(2025, 3, 3), 45)


def draw_flares(
    generator: np.random.Generator, factors: Floats, shifts: Floats
) -> pd.DataFrame:
    """Draw months to flare; the hazard falls with what makes a responder."""
    score = factors @ shifts
    score = (score - score.mean()) / score.std()
    months = generator.exponential(1.0 / (0.045 * np.exp(-0.8 * score)))
    watched = generator.uniform(8.0, 30.0, size=len(score))
    shown = np.maximum(0.1, np.round(np.minimum(months, watched), 1))
    return pd.DataFrame(
        {"months_to_flare": shown, "flare": (months <= watched).astype(int)}
    )


def simulate_large(
    generator: np.random.Generator,
    features: Features,
    condition: Condition,
    share: float,
    clinics: dict[str, float],
) -> tuple[Floats, Bools, Bools]:
    """Return log2 values, outcome and shifted-clinic flag of many new people."""
    count = ORACLE_PEOPLE
    people = pd.DataFrame({"responder": generator.random(count) < share})
    people["clinic"] = generator.choice(
        list(clinics), size=count, p=np.array(list(clinics.values()))
    )
    people = people.assign(sex="F", age=49)
    rows = pd.DataFrame({"who": people.index, "biology": people.index})
    rows = rows.assign(plate=rows["who"] % 8, handling_hours=4.5)
    values, _ = draw_log2(generator, features, people, rows, condition)
    shifted = people["clinic"].to_numpy() == SHIFTED_CLINIC
    return values, people["responder"].to_numpy(), shifted


def measure_oracle(
    seeds: list[np.random.SeedSequence],
    best: Features,
    now: Condition,
    later: Condition,
) -> dict[str, float]:
    """Measure the AUC that a logistic model of the best members reaches."""
    total = sum(count for count, _ in CLINICS.values())
    mixed = {name: count / total for name, (count, _) in CLINICS.items()}
    responders = sum(count for _, count in CLINICS.values()) / total
    fit, test = (
        simulate_large(np.random.default_rng(seed), best, now, responders, mixed)
        for seed in seeds[:2]
    )
    after = simulate_large(
        np.random.default_rng(seeds[2]),
        best,
        later,
        LATER_RESPONDERS / LATER_COUNT,
        {"Lantern": 1.0},
    )
    raw = LogisticRegression(C=1e6).fit(fit[0], fit[1])
    step = CLINIC_SHIFT + best.clinic
    level = [values - np.outer(moved, step) for values, _, moved in (fit, test)]
    levelled = LogisticRegression(C=1e6).fit(level[0], fit[1])

    def area(model: Any, values: Floats, truth: Bools) -> float:
        return round(float(roc_auc_score(truth, model.decision_function(values))), 3)

    return {
        "discovery": area(levelled, level[1], test[1]),
        "discovery_scale_not_corrected": area(raw, test[0], test[1]),
        "later": area(levelled, after[0], after[1]),
    }


def price_row(
    generator: np.random.Generator, marker: str, platform: str, weight: float
) -> dict[str, str]:
    """Draw one quote; ``weight`` above one makes a dearer marker."""
    wells = platform == "wells"
    dev = (180.0 if wells else 700.0) * weight * generator.uniform(0.8, 1.25)
    test = (1.40 if wells else 0.55) * weight * generator.uniform(0.75, 1.3)
    row = dict.fromkeys(PRICE_COLUMNS, "")
    row |= {"marker": marker, "platform": platform, "role": "marker", "status": "ok"}
    row |= {"dev": f"{dev:.2f}", "slots": "1"}
    way = generator.random()
    if way < 0.15:
        size = int(generator.choice(np.array([100, 250, 500])))
        row |= {"pack": str(size), "pack_price": f"{test * size * 0.95:.2f}"}
    else:
        row["test"] = f"{test:.2f}"
    if way > 0.85:
        row["tiers"] = f"1:{test:.2f};500:{test * 0.9:.2f};2000:{test * 0.78:.2f}"
    if not wells:
        row["class"] = "abundant" if generator.random() < 0.3 else "ordinary"
    row["fail_rate"] = f"{generator.uniform(0.001, 0.006 if wells else 0.009):.3f}"
    row["cv_pct"] = (
        f"{generator.uniform(3, 9) if wells else generator.uniform(6, 15):.1f}"
    )
    row["concordance"] = f"{generator.uniform(0.82, 0.98):.2f}"
    quoted = date(2026, 1, 12) + timedelta(int(generator.integers(0, 285)))
    row["quote_date"] = quoted.isoformat()
    return row


def withdraw(row: dict[str, str], status: str, note: str) -> None:
    """Turn a quote into one that cannot be had, or not yet."""
    blank = ["dev", "test", "pack", "pack_price", "tiers", "fail_rate", "cv_pct"]
    row |= dict.fromkeys([*blank, "concordance"], "")
    row |= {"status": status, "note": note}


def star_rows() -> list[dict[str, str]]:
    """Return the price of any marker without a row of its own."""
    empty = dict.fromkeys(PRICE_COLUMNS, "") | {
        "marker": "*",
        "role": "marker",
        "status": "ok",
        "slots": "1",
        "quote_date": "2026-09-01",
        "note": "list price",
    }
    wells = {"platform": "wells", "dev": "240.00", "test": "1.75", "fail_rate": "0.08"}
    beads = {"platform": "beads", "dev": "850.00", "test": "0.70", "fail_rate": "0.15"}
    wells |= {"cv_pct": "7.0", "concordance": "0.90"}
    beads |= {"cv_pct": "11.0", "concordance": "0.87", "class": "ordinary"}
    return [empty | wells, empty | beads]


def member_rows(
    generator: np.random.Generator, features: Features, layout: Layout, effects: Floats
) -> list[dict[str, str]]:
    """Quote the planted members: the best dear, the stand-ins cheaper."""
    rows = []
    for members in layout.informative:
        order = members[np.argsort(-np.abs(effects[members]))]
        best = str(features.ids[order[0]])
        for rank, member in enumerate(order):
            weight = 1.0 + 1.4 * abs(float(effects[member])) if rank == 0 else 0.7
            for platform in ("wells", "beads"):
                marker = str(features.ids[member])
                row = price_row(generator, marker, platform, weight)
                if rank == 1:
                    row |= {"backup_of": best, "note": "stand-in of its group"}
                rows.append(row)
    return rows


def write_prices(
    path: Path,
    generator: np.random.Generator,
    features: Features,
    layout: Layout,
    effects: Floats,
) -> None:
    """Write the price list of both platforms."""
    rows = member_rows(generator, features, layout, effects)
    others = generator.choice(layout.plain, size=40, replace=False)
    for place, other in enumerate(others):
        marker = str(features.ids[other])
        platforms = ("wells", "beads") if place % 2 else ("wells",)
        rows += [
            price_row(generator, marker, platform, float(generator.uniform(0.6, 2.0)))
            for platform in platforms
        ]
    # Refused on beads only, so that every member can still be had somewhere.
    beads = [row for row in rows if row["platform"] == "beads" and not row["backup_of"]]
    picked = generator.choice(len(beads), size=9, replace=False)
    for place, number in enumerate(picked):
        if place < 5:
            withdraw(beads[number], "no", "no probe could be designed")
        else:
            withdraw(beads[number], "unknown", "quote awaited")
    wells = [row for row in rows if row["platform"] == "wells" and not row["backup_of"]]
    for number in generator.choice(len(wells), size=3, replace=False):
        withdraw(wells[number], "unknown", "quote awaited")
    for position in layout.references:
        row = price_row(generator, str(features.ids[position]), "wells", 0.6)
        rows.append(row | {"role": "reference", "note": "stable in all clinics"})
    write_records(path, PRICE_COLUMNS, star_rows() + rows)


def write_records(
    path: Path, columns: list[str], rows: Iterable[Mapping[Any, Any]]
) -> None:
    """Write rows of text as CSV with plain line ends."""
    with path.open("w", newline="", encoding="utf-8") as handle:
        writer = csv.DictWriter(
            handle, columns, lineterminator="\n", extrasaction="ignore"
        )
        writer.writeheader()
        writer.writerows(rows)


def describe_groups(
    features: Features, layout: Layout, effects: Floats, later: Floats
) -> list[dict[str, Any]]:
    """Describe the informative groups for the truth file."""
    best = np.array([np.abs(effects[members]).max() for members in layout.informative])
    return [
        {
            "name": f"G{number + 1:02d}",
            "direction": "up" if GROUP_SIGNS[number] > 0 else "down",
            "effect": round(GROUP_EFFECTS[number] * GROUP_SIGNS[number], 3),
            "share": round(float(np.mean(features.loading[members] ** 2)), 3),
            "share_of_signal": round(float(best[number] ** 2 / np.sum(best**2)), 3),
            "carries_effect_later": number not in GROUPS_LOST_LATER,
            "best": str(features.ids[members[np.argmax(np.abs(effects[members]))]]),
            "members": features.ids[members].tolist(),
            "member_effects": np.round(effects[members], 3).tolist(),
            "member_effects_later": np.round(later[members] + 0.0, 3).tolist(),
        }
        for number, members in enumerate(layout.informative)
    ]


def describe_layout(features: Features, layout: Layout) -> dict[str, Any]:
    """Describe the planted parts that carry no outcome information."""

    def names(positions: Ints) -> list[str]:
        return [str(name) for name in features.ids[positions]]

    def effects(positions: Ints, values: Floats) -> dict[str, float]:
        return {str(features.ids[at]): round(float(values[at]), 3) for at in positions}

    return {
        "correlated_null_group_count": len(layout.null_groups),
        "correlated_null_groups": [names(members) for members in layout.null_groups],
        "sex_features_log2_male": effects(layout.sex, features.sex),
        "age_features_log2_per_decade": effects(layout.age, features.age),
        "handling_features_log2_per_hour": effects(layout.handling, features.handling),
        "shifted_clinic": {
            "clinic": SHIFTED_CLINIC,
            "log2_shift": CLINIC_SHIFT,
            "log2_sd_by_feature": CLINIC_FEATURE_SD,
        },
        "reference_features": names(layout.references),
        "control_features": names(layout.controls),
        "constant_features": names(layout.constant),
        "mostly_missing_features": names(layout.mostly_missing),
        "duplicate_feature": {
            "duplicate": str(features.ids[layout.duplicate]),
            "of": str(features.ids[layout.duplicate_source]),
        },
    }


def describe_study() -> dict[str, Any]:
    """State the scenario and the sizes that hold for all features."""
    return {
        "scenario": (
            "260 people with early joint inflammation at three clinics of Quillmere, "
            "blood transcripts, response to a first treatment at six months; a later "
            "cohort of 90 people from a fourth clinic."
        ),
        "invented": (
            "Everything is invented: people, town, clinics, features, symbols, prices. "
            "The values are drawn by a program and describe nobody."
        ),
        "seed": SEED,
        "effect_meaning": (
            "Mean of responders less mean of others, log2, over the standard deviation "
            "within outcome and clinic; a group's effect is that of its best member. "
            "share: mean part of a member's biological variance due to the group's "
            "factor. share_of_signal: the best member's squared effect over the sum "
            "of squares of all groups."
        ),
        "noise_log2_sd": {"discovery": NOISE_SD, "later": LATER_NOISE_SD},
        "plate_log2_sd_by_feature": PLATE_FEATURE_SD,
        "person_share_of_biological_variance": PERSON_SHARE,
        "later_log2_shift": LATER_SHIFT,
    }


def write_first_cohort(
    folder: Path,
    seed: np.random.SeedSequence,
    features: Features,
    layout: Layout,
    condition: Condition,
) -> list[dict[str, Any]]:
    """Write the first cohort and return its dirty cells."""
    generator = np.random.default_rng(seed)
    people = draw_people(generator)
    rows = draw_rows(generator, people)
    unknown = generator.choice(len(people), size=UNKNOWN_OUTCOMES, replace=False)
    people.loc[unknown, "known"] = False
    plates = [f"P{number:02d}" for number in range(1, len(PEOPLE_PER_PLATE) + 1)]
    samples = publish_samples(rows, people, plates, "S")
    log2_values, _ = draw_log2(generator, features, people, rows, condition)
    values = blank_cells(generator, log2_values, layout)
    order = column_order(generator, features)
    names = ["sample_id", *features.ids[order].tolist()]
    cells = as_cells(samples["sample_id"].tolist(), values, order)
    pool = np.flatnonzero(np.isin(order, layout.plain)).astype(np.int64)
    dirty = plant_dirt(generator, cells, names, pool)
    write_matrix(folder / "expression.csv.gz", names, cells)
    write_records(folder / "samples.csv", SAMPLE_COLUMNS, samples.to_dict("records"))
    listed = [
        {
            "feature": str(features.ids[at]),
            "symbol": str(features.symbols[at]),
            "role": "control" if at in layout.controls else "marker",
        }
        for at in order
    ]
    write_records(folder / "features.csv", ["feature", "symbol", "role"], listed)
    return dirty


def write_later_cohort(
    folder: Path,
    seed: np.random.SeedSequence,
    features: Features,
    layout: Layout,
    condition: Condition,
) -> None:
    """Write the later cohort, its columns in an order of their own."""
    generator = np.random.default_rng(seed)
    people, rows = draw_later(generator)
    samples = publish_samples(rows, people, list(LATER_PLATES), "L")
    log2_values, factors = draw_log2(generator, features, people, rows, condition)
    flares = draw_flares(generator, factors, condition.shifts)
    flares = flares.loc[rows["biology"]].reset_index(drop=True)
    samples = pd.concat([samples, flares], axis=1)
    values = blank_cells(generator, log2_values, layout)
    order = generator.permutation(FEATURE_COUNT).astype(np.int64)
    names = ["sample_id", *features.ids[order].tolist()]
    cells = as_cells(samples["sample_id"].tolist(), values, order)
    write_matrix(folder / "later_expression.csv.gz", names, cells)
    columns = [*SAMPLE_COLUMNS, "months_to_flare", "flare"]
    records = samples.to_dict("records")
    write_records(folder / "later_samples.csv", columns, records)


def make(folder: Path) -> dict[str, float]:
    """Write all files and return the AUC an oracle reaches."""
    folder.mkdir(parents=True, exist_ok=True)
    seeds = np.random.SeedSequence(SEED).spawn(7)
    planner = np.random.default_rng(seeds[0])
    layout = plan_layout(planner)
    features = plan_features(planner, layout)
    shifts = plan_shifts(features, layout)
    now = Condition(shifts=shifts, noise=NOISE_SD, scale=0.0)
    kept = shifts.copy()
    kept[list(GROUPS_LOST_LATER)] = 0.0
    later = replace(now, shifts=kept, noise=LATER_NOISE_SD, scale=LATER_SHIFT)
    effects = single_effects(features, shifts, NOISE_SD)
    effects_later = single_effects(features, kept, LATER_NOISE_SD)

    dirty = write_first_cohort(folder, seeds[1], features, layout, now)
    write_later_cohort(folder, seeds[2], features, layout, later)
    prices = np.random.default_rng(seeds[3])
    write_prices(folder / "prices.csv", prices, features, layout, effects)
    (folder / "platform_wells.toml").write_text(
        PLATFORM_WELLS, encoding="utf-8", newline="\n"
    )
    (folder / "platform_beads.toml").write_text(
        PLATFORM_BEADS, encoding="utf-8", newline="\n"
    )

    best = np.array(
        [at[np.argmax(np.abs(effects[at]))] for at in layout.informative],
        dtype=np.int64,
    )
    oracle = measure_oracle(seeds[4:7], features.take(best), now, later)
    truth = describe_study() | {
        "groups": describe_groups(features, layout, effects, effects_later),
        "groups_lost_later": [f"G{number + 1:02d}" for number in GROUPS_LOST_LATER],
        "dirty_cells": dirty,
        "oracle_auc": oracle,
        "oracle_people": ORACLE_PEOPLE,
    }
    truth |= describe_layout(features, layout)
    text = json.dumps(truth, indent=1)
    (folder / "truth.json").write_text(text + "\n", encoding="utf-8", newline="\n")
    return oracle


def main() -> None:
    """Make the cohort and report sizes and the AUC that can be reached."""
    parser = argparse.ArgumentParser(description="Make the Quillmere sample cohort.")
    beside = Path(__file__).resolve().parent / "quillmere"
    parser.add_argument("--folder", type=Path, default=beside)
    folder: Path = parser.parse_args().folder
    oracle = make(folder)
    for name, area in oracle.items():
        print(f"oracle AUC, {name}: {area:.3f}")
    for path in sorted(folder.iterdir()):
        print(f"{path.name}: {path.stat().st_size / 1024:.0f} KiB")


if __name__ == "__main__":
    main()
