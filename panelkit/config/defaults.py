"""Every default of panelkit, and the only place where one is written down.

Signatures, the study file's sections and the commented study file all read these
values; `tests/config/test_defaults.py` compares the three. Standard library only,
so that a signature can use a default without loading the study file's machinery.
"""

from dataclasses import dataclass
from decimal import Decimal
from typing import Final, Literal

__all__ = [
    "ACCURACY",
    "CHOICE",
    "COHORT",
    "DESIGN",
    "ENGINE",
    "KIT",
    "LOCK",
    "PANELS",
    "PLATFORM",
    "PREPARATION",
    "PRICING",
    "PROGRAMME",
    "SEED",
    "SHORTLIST",
    "SIZING",
    "STEPS",
    "DesignKind",
]

SEED: Final = 1

DesignKind = Literal["cohort", "case-control", "matched"]


@dataclass(frozen=True, slots=True)
class _Cohort:
    orientation: Literal["auto", "samples-in-rows", "features-in-rows"] = "auto"
    max_bad_cells: int = 100
    """Non-numeric cells read as missing; more than these are an error."""
    join: Literal["refuse", "intersection"] = "refuse"
    """What is done when several matrices have different features."""


@dataclass(frozen=True, slots=True)
class _Design:
    kind: DesignKind = "cohort"


@dataclass(frozen=True, slots=True)
class _Preparation:
    log2_offset: float = 1.0
    max_missing_share: float = 0.5
    """A feature missing in more than this share of training rows is left out."""


@dataclass(frozen=True, slots=True)
class _Steps:
    """Parameters of the steps of a recipe, beside those of [preparation] itself."""

    cpm_prior: float = 2.0
    """Counts added to every cell of a library of average size."""
    count_offset: float = 1.0
    """Added to counts that are already divided by their size factor."""
    ratio_trim: float = 0.3
    level_trim: float = 0.05
    upper_quantile: float = 0.75
    m_value_offset: float = 0.001
    variance_number: int = 5000
    prevalence_above: float = 0.0
    prevalence_share: float = 0.1
    detection_level: float = 0.0
    detection_samples: int = 3
    detection_unit: Literal["value", "per-million"] = "value"
    least_reliability: float = 0.5
    neighbours: int = 5
    unseen_batch: Literal["grand-mean", "refuse"] = "grand-mean"
    reference_measure: Literal["pairwise-variation", "variance-components"] = (
        "pairwise-variation"
    )
    reference_number: int = 3
    collapse_rule: Literal["highest-mean", "highest-variance", "median"] = (
        "highest-mean"
    )
    value_scale: Literal["log2", "linear"] = "log2"


@dataclass(frozen=True, slots=True)
class _Engine:
    n_penalties: int = 100
    penalty_floor_wide: float = 0.01
    """Last relative penalty when there are more features than rows."""
    penalty_floor_tall: float = 0.0001
    tol: float = 1e-6
    max_steps: int = 200
    """Newton steps for one penalty before a refit counts as not converged."""
    ridge_penalties: tuple[float, ...] = (1.0, 0.3, 0.1, 0.03, 0.01, 0.003)
    """Ridge penalties of panel refits; the inner folds choose one."""


@dataclass(frozen=True, slots=True)
class _Shortlist:
    subsamples: int = 100
    threshold: float = 0.75
    false_markers: float = 1.0
    bound: Literal["worst-case", "unimodal", "r-concave"] = "worst-case"
    selector: Literal["lasso", "elastic-net", "univariate"] = "lasso"
    l1_share: float = 0.5
    """Share of the L1 part of the elastic net."""
    stratify_by_site: bool = False
    shuffles: int = 50
    precision: float = 0.1
    """Half width of a frequency's interval from which subsamples are enough."""
    candidates: int = 25
    n_penalties: int = 40
    penalty_floor: float = 0.1
    companion_correlation: float = 0.8


@dataclass(frozen=True, slots=True)
class _Panels:
    sizes: tuple[int, ...] = (1, 2, 3, 4, 5, 6, 8, 10, 12, 15, 20, 25)
    makers: tuple[str, ...] = ("frequency", "univariate")


@dataclass(frozen=True, slots=True)
class _Accuracy:
    folds: int = 5
    repeats: int = 5
    inner_folds: int = 5
    inner_subsamples: int = 40
    random_panels: int = 200
    learning_curve: bool = True
    metric: Literal["auc"] = "auc"
    confidence: float = 0.95


@dataclass(frozen=True, slots=True)
class _Choice:
    rule: Literal["smallest-within-one-se"] = "smallest-within-one-se"


@dataclass(frozen=True, slots=True)
class _Lock:
    """Locked panels: their cut-offs and how new people judge them."""

    cutoffs: tuple[str, ...] = ("youden",)
    confidence: float = 0.95
    bootstrap: int = 1000
    """Draws of subjects behind the intervals of a cut-off."""
    grey_deviations: float = 1.0
    """Standard errors of a cut-off, and of the assay, on either side of it."""
    recalibration_folds: int = 5
    """Folds that judge a recalibration on rows that did not fit it."""
    small_group: int = 10
    """Cases or controls below which a subgroup is called too small."""
    calibration_groups: int = 5


@dataclass(frozen=True, slots=True)
class _Programme:
    horizon_months: int = 12
    deliveries: int = 1
    repeat_rate: Decimal = Decimal(0)
    repeat_mode: Literal["none", "once", "until"] = "once"
    collection_cost: Decimal = Decimal(0)
    sample_volume: Decimal = Decimal(0)
    missing_price: Literal["refuse", "bound", "impute", "exclude"] = "bound"


@dataclass(frozen=True, slots=True)
class _Platform:
    plex: int = 1
    replicates: int = 1
    controls_per_pool: int = 0
    controls_per_run: int = 0
    groups: int | Literal["auto", "each"] = "auto"
    refs_scope: Literal["panel", "pool"] = "panel"
    setup: Decimal = Decimal(0)
    pool_setup: Decimal = Decimal(0)
    run_cost: Decimal = Decimal(0)
    position_cost: Decimal = Decimal(0)
    sample_cost: Decimal = Decimal(0)
    prep_positions: int = 0
    prep_cost: Decimal = Decimal(0)
    overage: Decimal = Decimal(0)
    lot_months: int = 0
    lot_cost: Decimal = Decimal(0)
    run_budget: Decimal = Decimal(0)
    slot_budget: Decimal = Decimal(0)
    max_positions_per_sample: int = 0
    pool_volume: Decimal = Decimal(0)
    design_success: Decimal = Decimal(1)


@dataclass(frozen=True, slots=True)
class _Kit:
    once: Decimal = Decimal(0)
    splittable: bool = False
    shelf_months: int = 0
    volume: Decimal = Decimal(0)


@dataclass(frozen=True, slots=True)
class _Pricing:
    """What `panelkit price` and the cover do when nothing else is said."""

    time_limit_s: float = 60.0
    """For one integer programme; what is found by then is reported as not proved."""
    probability: float = 0.95
    """With which enough designs are to land when spares are ordered."""
    stairs_beyond: int = 6
    """Sizes above the panel's own that the staircase goes on for."""


@dataclass(frozen=True, slots=True)
class _Sizing:
    confidence: float = 0.95
    power: float = 0.8
    significance: float = 0.05
    controls_per_case: float = 1.0
    shrinkage: float = 0.9
    """Least expected shrinkage of a model under development (Riley et al. 2020)."""
    optimism: float = 0.05
    """Largest optimism of Nagelkerke's R2 (Riley et al. 2020)."""
    risk_margin: float = 0.05
    """Half-width of the interval of the overall risk (Riley et al. 2020)."""
    prediction_error: float = 0.05
    """Mean absolute prediction error (van Smeden et al. 2019)."""
    ratio_width: float = 0.2
    """Full width of the interval of observed over expected events."""
    slope_width: float = 0.2
    """Full width of the interval of the calibration slope."""
    area_width: float = 0.1
    """Full width of the interval of the area under the ROC curve."""
    benefit_width: float = 0.2
    """Full width of the interval of the standardised net benefit."""
    r_squared_width: float = 0.1
    simulations: int = 20
    """Invented cohorts for each number of people."""
    subsamples: int = 50
    """Subsamples of each invented cohort."""
    features: int = 2000
    true_markers: int = 10
    error_draws: int = 200
    people_per_draw: int = 2000
    plates: int = 8
    cut_off_specificity: float = 0.9
    point_loss: float = 0.05
    """Largest loss of sensitivity or specificity at a locked cut-off."""
    concordance_width: float = 0.1
    """Full width of the interval of the correlation of two platforms."""
    limits_width: float = 1.0
    """Half-width of the interval of the limits of agreement, in SD of differences."""
    wells: int = 96
    controls: int = 8
    """Wells of a plate kept for controls and references."""
    chance_draws: int = 500
    """Allocations by chance that an allocation is held against."""
    attempts: int = 50
    """Allocations that are drawn; the best balanced one is taken."""


COHORT: Final = _Cohort()
DESIGN: Final = _Design()
PREPARATION: Final = _Preparation()
SIZING: Final = _Sizing()
STEPS: Final = _Steps()
ENGINE: Final = _Engine()
SHORTLIST: Final = _Shortlist()
PANELS: Final = _Panels()
ACCURACY: Final = _Accuracy()
CHOICE: Final = _Choice()
LOCK: Final = _Lock()
PROGRAMME: Final = _Programme()
PLATFORM: Final = _Platform()
KIT: Final = _Kit()
PRICING: Final = _Pricing()
