"""The study file: one TOML file that says everything a run depends on."""

from collections.abc import Mapping
from dataclasses import dataclass
from decimal import Decimal
from pathlib import Path
from typing import Annotated, Any, Literal

from pydantic import BeforeValidator, Field, model_validator

from panelkit.config.defaults import (
    ACCURACY,
    CHOICE,
    COHORT,
    PANELS,
    PREPARATION,
    SEED,
    SHORTLIST,
)
from panelkit.config.design import DesignSection
from panelkit.config.kits import KitSection, kit_sections, read_kits
from panelkit.config.programme import (
    PlatformSection,
    ProgrammeSection,
    platform_section,
    programme_section,
    read_platform_file,
)
from panelkit.config.sections import (
    Section,
    check_section,
    plain_number,
    read_toml,
    refuse_key,
)
from panelkit.config.study_checks import (
    check_cohort_section,
    check_even,
    check_lists,
    check_rule,
)
from panelkit.errors import StudyFileError

__all__ = [
    "PLAIN_SECTIONS",
    "AccuracySection",
    "ChoiceSection",
    "CohortSection",
    "PanelsSection",
    "PreparationSection",
    "ShortlistSection",
    "StatementSection",
    "Study",
    "read_study",
]


def _text(value: object) -> object:
    """Let a number or a truth value stand for a class of the sample sheet."""
    return str(value) if isinstance(value, int | Decimal) else value


def _ascending(value: object) -> object:
    if isinstance(value, list | tuple):
        whole = all(type(size) is int for size in value)
        if not whole or not value or list(value) != sorted(set(value)):
            raise ValueError("a list of whole numbers, ascending, each once")
    return value


def _paths(value: object) -> object:
    several = isinstance(value, list | tuple) and len(value) > 0
    for path in value if isinstance(value, list | tuple) and several else [value]:
        if not isinstance(path, str):
            raise ValueError("a path, or a list of paths")
    return value


Number = Annotated[float, BeforeValidator(plain_number)]
Share = Annotated[float, Field(gt=0, lt=1), BeforeValidator(plain_number)]
ClassName = Annotated[str, BeforeValidator(_text)]
Size = Annotated[int, Field(ge=1, le=1000)]


class CohortSection(Section):
    """``[cohort]``: files, outcome, and how samples belong together.

    Attributes
    ----------
    expression : str or tuple of str
        The expression matrix: delimited text, Parquet, Arrow or Feather, .h5ad, GCT,
        Matrix Market or Excel. A list of files is joined by feature; the column
        source_file then says where a sample came from.
    format : str or None
        What the file is, where its content does not tell: text, parquet, arrow, h5ad,
        gct, matrix-market, excel.
    layer : str or None
        Of an .h5ad file: a layer's name, or raw, in place of X.
    sheet : str or None
        Of a workbook: the sheet's name; without it the first one.
    row_names, column_names : str or None
        Of a Matrix Market file: the files of its ids; without them they are looked
        for beside it.
    join : str
        ``refuse`` makes different features of several matrices an error,
        ``intersection`` keeps the features of all of them.
    samples : str or None
        The sample sheet; an .h5ad file brings its own.
    features : str or None
        Optional feature sheet with the columns feature, symbol, analyte, role and
        assayable (platform names joined by ``;``), or a column assayable_NAME for each
        platform.
    assays : str or None
        Optional sheet with the columns feature, analyte, assay: what measures what.
    outcome : str or None
        A column of the sample sheet: classes or a number.
    kind : str or None
        binary, classes, number or survival. Without it the other keys tell.
    positive : str
        Binary: the class that scores point to.
    negative : str or None
        Binary: the other class; samples of further classes are then left out and
        counted.
    classes : tuple of str
        Three or more classes, in order; all of the column where only the kind is given.
    unit : str
        Of an outcome that is a number.
    time, event : str or None
        Survival: the columns with the time and with the event codes.
    event_value, censored_value : str or None
        Survival: the codes that mean event and censored, when they aren't 1 and 0.
    horizon : float or None
        Survival: the time up to which chances are asked for.
    time_unit : str
        Survival: unit of the times.
    keep : mapping
        Row filters: column to a list of values, to ``{ min, max }``, or to
        ``{ from, to }`` with numbers or dates such as "2019-06-30"; ends included.
    set_aside : mapping
        Rows that nothing reads until they are opened, as ``{ column, values }`` or
        ``{ column, from, to }``.
    openings : str or None
        File in which every opening of the rows set aside is recorded.
    subject, site, batch, matched_set, replicate_of : str or None
        Columns of the sample sheet.
    run_order : str or None
        Column with each sample's place in the order of measurement.
    folds : str or None
        Column with the fold in which each sample is tested, in place of drawn folds.
    covariates, nuisance : tuple of str
        Columns that are checked against the outcome.
    accept : mapping of str to str
        Code of a `stop` finding to the written reason for going on all the same.
    orientation : str
        ``auto`` decides by the ids of the sample sheet.
    max_bad_cells : int
        Cells that are no numbers and are read as missing; more are an error.
    """

    expression: Annotated[str | tuple[str, ...], BeforeValidator(_paths)]
    format: str | None = None
    layer: str | None = None
    sheet: str | None = None
    row_names: str | None = None
    column_names: str | None = None
    join: Literal["refuse", "intersection"] = COHORT.join
    samples: str | None = None
    features: str | None = None
    assays: str | None = None
    outcome: str | None = None
    kind: Literal["binary", "classes", "number", "survival"] | None = None
    positive: ClassName | None = None
    negative: ClassName | None = None
    classes: tuple[ClassName, ...] = ()
    unit: str = ""
    time: str | None = None
    event: str | None = None
    event_value: ClassName | None = None
    censored_value: ClassName | None = None
    horizon: Annotated[
        Annotated[float, Field(gt=0)] | None, BeforeValidator(plain_number)
    ] = None
    time_unit: str = ""
    keep: Mapping[str, Any] = Field(default_factory=dict)
    set_aside: Mapping[str, Any] = Field(default_factory=dict)
    openings: str | None = None
    subject: str | None = None
    site: str | None = None
    batch: str | None = None
    matched_set: str | None = None
    run_order: str | None = None
    replicate_of: str | None = None
    folds: str | None = None
    covariates: tuple[str, ...] = ()
    nuisance: tuple[str, ...] = ()
    accept: Mapping[str, str] = Field(default_factory=dict)
    orientation: Literal["auto", "samples-in-rows", "features-in-rows"] = (
        COHORT.orientation
    )
    max_bad_cells: int = Field(default=COHORT.max_bad_cells, ge=0)


def _steps(value: object) -> object:
    """Let each step be a name, or a table with its name and its parameters."""
    if not isinstance(value, list | tuple):
        return value
    steps: list[object] = []
    for step in value:
        named = step.get("step") if isinstance(step, Mapping) else step
        if not isinstance(named, str):
            raise ValueError(
                'a list of steps, each a name or { step = "name", parameter = value }'
            )
        if isinstance(step, Mapping):
            step = {key: plain_number(part) for key, part in step.items()}
        steps.append(step)
    return tuple(steps)


StepEntries = Annotated[tuple[str | dict[str, Any], ...], BeforeValidator(_steps)]


class PreparationSection(Section):
    """``[preparation]``: what is done to the values before anything is fitted.

    Attributes
    ----------
    discovery : tuple of str or table, or None
        Steps in order, each a name or a table { step = "log-cpm", prior = 2.0 }:
        log2, m-values, log-cpm, median-of-ratios, trimmed-mean, upper-quartile; then
        quantile, median-difference; then batch-centre, reference-ratio; then
        collapse; filter, variance, prevalence, detection, replicate-reliability; and
        one of median-fill, half-minimum, below-limit, neighbours. None follows the
        scale finding.
    assay : tuple of str or table, or None
        Steps that panels are refitted and judged with, from the panel's markers and
        reference features alone: log2, m-values, reference-ratio, batch-centre,
        median-fill, half-minimum, below-limit. None uses the discovery steps.
    log2_offset : float
        Added before the logarithm.
    max_missing_share : float
        Features missing in a larger share of the training rows are left out.
    """

    discovery: StepEntries | None = None
    assay: StepEntries | None = None
    log2_offset: Annotated[float, Field(ge=0), BeforeValidator(plain_number)] = (
        PREPARATION.log2_offset
    )
    max_missing_share: Annotated[
        float, Field(ge=0, le=1), BeforeValidator(plain_number)
    ] = PREPARATION.max_missing_share


class ShortlistSection(Section):
    """``[shortlist]``: stability selection.

    Of threshold, false_markers and markers_per_subsample two are given and the third
    follows; where fewer are given, the defaults of the first two stand in.

    Attributes
    ----------
    subsamples : int
        Halves in all, an even number: complementary pairs. Fixed before the first fit.
    threshold : float or None
        Selection frequency from which a feature is shortlisted.
    false_markers : float or None
        Tolerated expected number of low-chance features in the shortlist.
    markers_per_subsample : int or None
        How many features each subsample may pick.
    bound : str
        The bound that decides: worst-case, unimodal, or r-concave (from threshold
        0.6); the first two are always shown.
    selector : str
        What picks in a subsample: lasso, elastic-net, or univariate (the largest test
        statistics).
    l1_share : float
        Share of the L1 part of the elastic net.
    stratify_by_site : bool
        Each half gets its share of every site.
    candidates : int
        Companion groups, and univariate features, that panels may be built from.
    candidates_on : str or None
        A platform: candidates are features that can be assayed there.
    always, never : tuple of str
        Features that are candidates whatever happens; features never used.
    companion_correlation : float
        Smallest absolute correlation of companions.
    shuffles : int
        Shuffles of the people that `panelkit shortlist` compares with, 0 for none;
        from 1,000 every feature gets a p-value.
    precision : float
        Half width of a frequency's interval from which subsamples count as enough.
    n_penalties, penalty_floor : int, float
        Penalties of each path, and the last one relative to the largest.
    """

    subsamples: int = Field(default=SHORTLIST.subsamples, ge=4, le=100_000)
    threshold: (
        Annotated[float, Field(gt=0.5, le=1), BeforeValidator(plain_number)] | None
    ) = SHORTLIST.threshold
    false_markers: (
        Annotated[float, Field(gt=0), BeforeValidator(plain_number)] | None
    ) = SHORTLIST.false_markers
    markers_per_subsample: Size | None = None
    bound: Literal["worst-case", "unimodal", "r-concave"] = SHORTLIST.bound
    selector: Literal["lasso", "elastic-net", "univariate"] = SHORTLIST.selector
    l1_share: Annotated[float, Field(gt=0, le=1), BeforeValidator(plain_number)] = (
        SHORTLIST.l1_share
    )
    stratify_by_site: bool = SHORTLIST.stratify_by_site
    candidates: int = Field(default=SHORTLIST.candidates, ge=1, le=1000)
    candidates_on: str | None = None
    always: tuple[str, ...] = ()
    never: tuple[str, ...] = ()
    companion_correlation: Share = SHORTLIST.companion_correlation
    shuffles: int = Field(default=SHORTLIST.shuffles, ge=0, le=1_000_000)
    precision: Share = SHORTLIST.precision
    n_penalties: int = Field(default=SHORTLIST.n_penalties, ge=2, le=1000)
    penalty_floor: Share = SHORTLIST.penalty_floor

    @model_validator(mode="before")
    @classmethod
    def _two_of_three(cls, values: object) -> object:
        """Make the figure that follows None, so that equal demands are equal."""
        if not isinstance(values, dict) or "markers_per_subsample" not in values:
            return values
        if {"threshold", "false_markers"} <= values.keys():
            raise ValueError(
                "two of threshold, false_markers and markers_per_subsample, the third "
                "follows"
            )
        follows = "threshold" if "false_markers" in values else "false_markers"
        return {**values, follows: None}


class PanelsSection(Section):
    """``[panels]``: which panels are built, and what they are priced by.

    Attributes
    ----------
    sizes : tuple of int
        Markers a panel, ascending.
    makers : tuple of str
        Procedures that propose panels: frequency, univariate, groups, forward,
        exhaustive, price-weighted, own.
    own : tuple of str
        Markers of the maker ``own``, in the order in which smaller panels are cut.
    prices : str or None
        Price list (CSV).
    platforms : tuple of str
        Platform files (TOML), beside any ``[platform.NAME]`` of the study file.
    conflicts : str or None
        Pairs of markers that must be kept apart (CSV).
    """

    sizes: Annotated[tuple[Size, ...], BeforeValidator(_ascending)] = Field(
        default=PANELS.sizes, min_length=1
    )
    makers: tuple[str, ...] = Field(default=PANELS.makers, min_length=1)
    own: tuple[str, ...] = ()
    prices: str | None = None
    platforms: tuple[str, ...] = ()
    conflicts: str | None = None


class AccuracySection(Section):
    """``[accuracy]``: how honest accuracy is estimated.

    Attributes
    ----------
    folds, repeats : int
        Outer folds, and how often they are drawn anew.
    inner_folds : int
        Inner folds that tune penalties and choose the size for the headline.
    inner_subsamples : int
        Halves of the stability selection inside an inner fold, an even number.
    random_panels : int
        Random panels of each size and kind, to compare with.
    learning_curve : bool
        Whether the headline is repeated with fewer training people.
    leave_out : {"site"} or None
        Each site is an outer fold, instead of folds that are drawn.
    metric : {"auc"}
        Area under the ROC curve.
    confidence : float
        Of the intervals.
    """

    folds: int = Field(default=ACCURACY.folds, ge=2, le=100)
    repeats: int = Field(default=ACCURACY.repeats, ge=1, le=1000)
    inner_folds: int = Field(default=ACCURACY.inner_folds, ge=2, le=20)
    inner_subsamples: int = Field(default=ACCURACY.inner_subsamples, ge=4, le=100_000)
    random_panels: int = Field(default=ACCURACY.random_panels, ge=20, le=10_000)
    learning_curve: bool = ACCURACY.learning_curve
    leave_out: Literal["site"] | None = None
    metric: Literal["auc"] = ACCURACY.metric
    confidence: Share = ACCURACY.confidence


class PrimaryRule(Section):
    """``primary`` of ``[choice]``: the rule declared before the run.

    Attributes
    ----------
    rule : str
        Smallest or cheapest within one standard error or within a margin of the most
        accurate; best under a budget; cheapest above a required accuracy.
    margin : float or None
        Loss of the metric that counts as none; for the margin rules.
    budget : Decimal or None
        Largest programme cost; for ``best-under-budget``.
    required_accuracy : float or None
        Smallest metric; for ``cheapest-above-accuracy``.
    """

    rule: Literal[
        "smallest-within-one-se",
        "cheapest-within-one-se",
        "smallest-within-margin",
        "cheapest-within-margin",
        "best-under-budget",
        "cheapest-above-accuracy",
    ]
    margin: Share | None = None
    budget: Annotated[Decimal, Field(gt=0)] | None = None
    required_accuracy: Share | None = None


class ChoiceSection(Section):
    """``[choice]``: which panel is taken.

    Attributes
    ----------
    primary : PrimaryRule or None
        None: the default rule is used and the headline says exploratory.
    margin, budget, required_accuracy : as in `primary`
        For the rules shown beside the primary one, where they are given.
    """

    primary: PrimaryRule | None = None
    margin: Share | None = None
    budget: Annotated[Decimal, Field(gt=0)] | None = None
    required_accuracy: Share | None = None

    @property
    def rule(self) -> str:
        """Name of the rule that is used."""
        return CHOICE.rule if self.primary is None else self.primary.rule

    def demand(self, name: str) -> Any:
        """Return the primary rule's margin, budget or accuracy, else the section's."""
        own = None if self.primary is None else getattr(self.primary, name)
        return getattr(self, name) if own is None else own


class StatementSection(Section):
    """``[statement]``: texts for the report; an empty one is shown as missing.

    Attributes
    ----------
    intended_use, population, specimen, reference_standard, blinding, registration, \
ethics : str
        In the study's own words.
    """

    intended_use: str = ""
    population: str = ""
    specimen: str = ""
    reference_standard: str = ""
    blinding: str = ""
    registration: str = ""
    ethics: str = ""


@dataclass(frozen=True, slots=True)
class Study:
    """A checked study file.

    Attributes
    ----------
    path : Path
        Where it was read; its relative paths are relative to this file's folder.
    seed : int
        Root of every random draw.
    cohort, design, preparation, shortlist, panels, accuracy, choice, statement : \
Section
        The tables, defaults filled in.
    programme : ProgrammeSection or None
        None: nothing is priced.
    platforms : mapping of str to PlatformSection
        From the study file and from platform files.
    kits : tuple of KitSection
        From the same files.
    """

    path: Path
    seed: int
    cohort: CohortSection
    design: DesignSection
    preparation: PreparationSection
    shortlist: ShortlistSection
    panels: PanelsSection
    accuracy: AccuracySection
    choice: ChoiceSection
    statement: StatementSection
    programme: ProgrammeSection | None
    platforms: Mapping[str, PlatformSection]
    kits: tuple[KitSection, ...] = ()

    def file(self, name: str) -> Path:
        """Return the path of a file that the study names."""
        return self.path.parent / name

    def effective(self) -> dict[str, Any]:
        """Return every setting that determines results, plain and sorted.

        File names are left out, since the record holds the files' hashes.
        """
        tables: dict[str, Any] = {"seed": self.seed}
        for name in _DECIDING:
            section: Section = getattr(self, name)
            tables[name] = section.model_dump(mode="json")
        cohort = self.cohort.model_dump(mode="json")
        for name in FILE_KEYS:
            cohort.pop(name)
        tables["cohort"] = cohort
        for name in ("prices", "platforms", "conflicts"):
            tables["panels"].pop(name)
        if self.programme is None:
            return tables
        tables["programme"] = self.programme.model_dump(mode="json")
        tables["platform"] = {}
        for name, platform in sorted(self.platforms.items()):
            values = platform.model_dump(mode="json")
            # where it comes from does not matter to results, its value does
            rate = platform.effective_repeat_rate(self.programme)
            tables["platform"][name] = values | {"repeat_rate": str(rate)}
        if self.kits:
            tables["kit"] = [kit.model_dump(mode="json") for kit in self.kits]
        return tables


# tables read as they stand; programme and platform have readers of their own
PLAIN_SECTIONS: dict[str, type[Section]] = {
    "cohort": CohortSection,
    "design": DesignSection,
    "preparation": PreparationSection,
    "shortlist": ShortlistSection,
    "panels": PanelsSection,
    "accuracy": AccuracySection,
    "choice": ChoiceSection,
    "statement": StatementSection,
}
FILE_KEYS = (
    "expression",
    "samples",
    "features",
    "assays",
    "openings",
    "row_names",
    "column_names",
)
"""Keys of ``[cohort]`` that name files; the record holds their hashes instead."""
_DECIDING = ("design", "preparation", "shortlist", "panels", "accuracy", "choice")
_KEYS = ("seed", *PLAIN_SECTIONS, "programme", "platform", "kit")


def read_study(path: str | Path) -> Study:
    """Return the checked study file.

    Parameters
    ----------
    path : str or Path
        A TOML file.

    Returns
    -------
    Study
        Frozen, defaults filled in, platform files read.

    Raises
    ------
    StudyFileError
        If the file cannot be read, a key is unknown or missing, or a value is not
        accepted.
    """
    tables = read_toml(path, _KEYS)
    if "cohort" not in tables:
        raise StudyFileError(
            code="cohort-table-missing",
            where=str(path),
            what="the file has no table [cohort]",
            accepted="a study file with at least [cohort] expression, samples, outcome "
            "and positive",
            next_step="Write one with `panelkit draft EXPRESSION SAMPLES`",
        )
    seed = tables.get("seed", SEED)
    if not isinstance(seed, int) or isinstance(seed, bool) or seed < 0:
        raise StudyFileError(
            code="seed-not-whole",
            where=f"{path}, key 'seed'",
            what=f"the value is no seed (got {seed!r})",
            accepted="a whole number of at least 0",
            next_step="Correct the value",
        )
    sections: dict[str, Any] = {
        name: check_section(kind, tables.get(name, {}), f"{path}, [{name}]")
        for name, kind in PLAIN_SECTIONS.items()
    }
    check_lists(sections, str(path))
    check_rule(sections["choice"], str(path), priced="programme" in tables)
    check_cohort_section(sections, str(path))
    for table, key in (("shortlist", "subsamples"), ("accuracy", "inner_subsamples")):
        check_even(getattr(sections[table], key), f"{path}, [{table}], key '{key}'")
    programme = None
    if "programme" in tables:
        programme = programme_section(tables["programme"], f"{path}, [programme]")
    study = Study(
        path=Path(path),
        seed=seed,
        programme=programme,
        platforms=_platforms(Path(path), tables, sections["panels"]),
        kits=_kits(Path(path), tables, sections["panels"]),
        **sections,
    )
    _check_pricing(study)
    return study


def _platforms(
    path: Path, tables: Mapping[str, Any], panels: PanelsSection
) -> dict[str, PlatformSection]:
    """Return the platforms of the study file and of the files that it names."""
    own = tables.get("platform", {})
    if not isinstance(own, dict):
        refuse_key("platform", ["platform.NAME"], str(path))
    platforms = {
        name: platform_section(table, f"{path}, [platform.{name}]")
        for name, table in own.items()
    }
    for name in panels.platforms:
        for key, section in read_platform_file(path.parent / name).items():
            if key in platforms:
                raise StudyFileError(
                    code="platform-twice",
                    where=f"{path.parent / name}, [platform.{key}]",
                    what=f"a platform of that name is there already (got {key!r})",
                    accepted="each platform once",
                    next_step="Rename or remove one of them",
                )
            platforms[key] = section
    return platforms


def _kits(
    path: Path, tables: Mapping[str, Any], panels: PanelsSection
) -> tuple[KitSection, ...]:
    """Return the kits of the study file and of the files that it names."""
    own = tables.get("kit", [])
    if not isinstance(own, list):
        refuse_key("kit", ["[[kit]]"], str(path))
    kits = list(kit_sections(own, f"{path}, [[kit]]"))
    for name in panels.platforms:
        kits += read_kits(path.parent / name)
    return kit_sections(kits, f"{path} and its platform files")


def _check_pricing(study: Study) -> None:
    """Refuse half of a price: programme, platforms and prices go together."""
    parts = {
        "[programme]": study.programme is not None,
        "[panels] platforms or [platform.NAME]": bool(study.platforms),
        "[panels] prices": study.panels.prices is not None,
    }
    missing = [name for name, there in parts.items() if not there]
    if missing and len(missing) < len(parts):
        raise StudyFileError(
            code="pricing-incomplete",
            where=str(study.path),
            what=f"panels cannot be priced without {' and '.join(missing)}",
            accepted="[programme], platforms and prices together, or none of them",
            next_step=f"Add {missing[0]}, or remove the others",
        )
