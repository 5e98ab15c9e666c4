"""What stands in for a marker, and what a panel loses with one."""

import math
from dataclasses import dataclass
from decimal import Decimal

from panelkit.records.record import Record

__all__ = [
    "AddedValue",
    "Aftermath",
    "Fragility",
    "Handling",
    "LearningPoint",
    "StandIn",
    "Subgroup",
]


@dataclass(frozen=True, slots=True, eq=False)
class StandIn(Record):
    """One row of `stand_ins.csv`: what could replace a marker of the chosen panel.

    Attributes
    ----------
    marker, stand_in : str
        Feature ids; an empty stand-in where there is none.
    how : str
        ``maker`` (what the maker takes when the marker is forbidden) or ``companion``
        (the most correlated feature outside the panel).
    correlation : float
        Pearson, on all analysed samples.
    loss, loss_low, loss_high : float
        Metric lost by the panel when the marker in this role is replaced so in every
        outer fold; paired, with its interval.
    kind : str
        ``by role``: learnt inside the folds, never on the printed panel.
    same_in_folds : float
        Share of the outer folds in which this very stand-in came in.
    saving : Decimal or None
        Programme cost saved by the replacement; None where it cannot be priced.
    """

    marker: str
    stand_in: str
    how: str
    correlation: float
    loss: float
    loss_low: float
    loss_high: float
    kind: str
    same_in_folds: float
    saving: Decimal | None


@dataclass(frozen=True, slots=True, eq=False)
class Fragility(Record):
    """One row of `fragility.csv`: what the panel loses when something goes wrong.

    Attributes
    ----------
    event : str
        ``lost-refitted``, ``lost-imputed``, ``added-noise``, ...
    marker : str
        Marker of the printed panel in the role that was lost; empty for all.
    level : float
        Added CV in percent; NaN where it has no meaning.
    metric, loss, loss_low, loss_high : float
        Metric after the event, and what it lost; paired, with its interval.
    kind : str
        ``by role``.
    sentence : str
        In words.
    """

    event: str
    marker: str
    level: float
    metric: float
    loss: float
    loss_low: float
    loss_high: float
    kind: str
    sentence: str


@dataclass(frozen=True, slots=True, eq=False)
class Subgroup(Record):
    """One row of `subgroups.csv`: the headline's predictions within a part of them.

    Attributes
    ----------
    column, group : str
        Column of the sample sheet and its value or range.
    n_samples, n_events : int
        Samples in the group; positives, events, or samples of the smallest class.
    metric, metric_low, metric_high : float
        Within test folds; NaN where the group is too small.
    sentence : str
        In words.
    """

    column: str
    group: str
    n_samples: int
    n_events: int
    metric: float
    metric_low: float
    metric_high: float
    sentence: str


@dataclass(frozen=True, slots=True, eq=False)
class AddedValue(Record):
    """One row of `added_value.csv`: what the panel adds to the covariates.

    Attributes
    ----------
    measure : str
        ``log-loss``, ``brier``, ``net-benefit at ...``, or the metric's code.
    covariates, with_panel : float
        The measure without and with the panel, on the same folds.
    gain, gain_low, gain_high : float
        Paired, positive where the panel helps, with its interval.
    """

    measure: str
    covariates: float
    with_panel: float
    gain: float
    gain_low: float
    gain_high: float


@dataclass(frozen=True, slots=True, eq=False)
class Handling(Record):
    """One row of `handling.csv`: whether the score follows how samples were handled.

    Attributes
    ----------
    column : str
        Nuisance column of the sample sheet.
    group : str
        Class within which it is looked at, so that the outcome plays no part.
    n_samples : int
        Samples with a value.
    statistic : str
        ``spearman`` for numbers, ``epsilon-squared`` (share of rank variance between
        categories, Kelley 1935) for categories.
    value, p : float
        Of the out-of-fold score, averaged over repeats; p is not adjusted for the
        number of columns.
    """

    column: str
    group: str
    n_samples: int
    statistic: str
    value: float
    p: float


@dataclass(frozen=True, slots=True, eq=False)
class LearningPoint(Record):
    """One row of `learning_curve.csv`: the nested metric with fewer people.

    Attributes
    ----------
    share : float
        Of the training subjects.
    n_subjects : float
        Training subjects, mean over the folds.
    metric, metric_low, metric_high : float
        The primary rule's nested metric on the first repeat's folds.
    metric_se_corrected : float
        Standard error over those folds.
    gain, gain_low, gain_high : float
        What all training subjects reach beyond this share, paired over the folds, with
        its interval; NaN for all of them.
    """

    share: float
    n_subjects: float
    metric: float
    metric_low: float
    metric_high: float
    metric_se_corrected: float
    gain: float = math.nan
    gain_low: float = math.nan
    gain_high: float = math.nan


@dataclass(frozen=True, slots=True, eq=False)
class Aftermath(Record):
    """What the chosen panel loses, gains and depends on; tables of rows.

    Attributes
    ----------
    stand_ins : tuple of StandIn
        Two a marker.
    fragility : tuple of Fragility
        The gravest loss first.
    subgroups : tuple of Subgroup
        Of the headline's predictions.
    added_value : tuple of AddedValue
        Beside the covariates; empty without.
    handling : tuple of Handling
        Whether the score follows nuisance columns; empty without.
    learning_curve : tuple of LearningPoint
        Ascending; empty where it was not asked for.
    """

    stand_ins: tuple[StandIn, ...]
    fragility: tuple[Fragility, ...]
    subgroups: tuple[Subgroup, ...]
    added_value: tuple[AddedValue, ...]
    handling: tuple[Handling, ...]
    learning_curve: tuple[LearningPoint, ...]

    @staticmethod
    def rows_of(name: str) -> type[Record]:
        """Return the record class of a table's rows."""
        return {
            "stand_ins": StandIn,
            "fragility": Fragility,
            "subgroups": Subgroup,
            "added_value": AddedValue,
            "handling": Handling,
            "learning_curve": LearningPoint,
        }[name]
