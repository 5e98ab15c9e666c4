"""From files or four inputs to what prices panels, and all that this assumes."""

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from decimal import Decimal
from pathlib import Path
from typing import Any, Final

from panelkit.config import (
    USUAL_REFERENCES,
    KitSection,
    PlatformSection,
    ProgrammeSection,
    platform_section,
    programme_section,
    read_kits,
    read_platform_file,
    read_programme_file,
    read_study,
    read_toml,
)
from panelkit.costing import PanelPricer
from panelkit.errors import UsageError, name_some
from panelkit.ingest import read_conflicts, read_price_list
from panelkit.records import (
    ANY_MARKER,
    NO_CONFLICTS,
    AssayPrice,
    Assumption,
    Findings,
    PriceList,
)
from panelkit.workflow.price_checks import conflict_findings, kit_findings

__all__ = ["PriceSource", "Priceable", "apply_settings", "load_priceable"]

QUICK: Final = "--family"


@dataclass(frozen=True, slots=True)
class PriceSource:
    """Where prices come from: files, or four inputs.

    Attributes
    ----------
    file : Path or None
        Programme, platforms and kits (TOML), or a study file.
    prices, conflicts : Path or None
        Price list and conflict list (CSV).
    family : str or None
        Without a file: the family whose usual geometry is taken.
    samples : int or None
        Results wanted; overrides the file.
    currency : str or None
        Without a file: ISO 4217 code.
    reaction : str or None
        Without a file: price of one reaction.
    development : str or None
        Without a file: one-off cost of a marker.
    settings : tuple of (str, str)
        Keys of the programme, or of platforms, and their values.
    platforms : tuple of str
        Only these; empty for all.
    """

    file: Path | None = None
    prices: Path | None = None
    conflicts: Path | None = None
    family: str | None = None
    samples: int | None = None
    currency: str | None = None
    reaction: str | None = None
    development: str | None = None
    settings: tuple[tuple[str, str], ...] = ()
    platforms: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class Priceable:
    """What prices panels, with what it rests on.

    Attributes
    ----------
    pricer : PanelPricer
        Prices them.
    assumptions : tuple of Assumption
        Every value.
    findings : Findings
        What was noticed while reading.
    """

    pricer: PanelPricer
    assumptions: tuple[Assumption, ...]
    findings: Findings


def load_priceable(source: PriceSource, n_unnamed: int = 0) -> Priceable:
    """Return what prices panels, from files or from four inputs.

    Parameters
    ----------
    source : PriceSource
        Where prices come from.
    n_unnamed : int
        Markers without a name, which need rows of their own in a list made up here.

    Returns
    -------
    Priceable
        With settings applied.

    Raises
    ------
    UsageError
        An input is missing, or two contradict one another.
    StudyFileError, InputDataError
        A file cannot be used.
    """
    if source.file is None:
        pricer, extra = _from_four(source)
        findings = Findings()
        written: set[str] = {"currency", "samples"}
        origin = "given"
    else:
        pricer, findings = _from_files(source)
        extra = ()
        written = set(pricer.programme.model_fields_set)
        origin = "file"
    settings = list(source.settings)
    if source.file is not None and source.samples is not None:
        settings.append(("samples", str(source.samples)))
    pricer, given = apply_settings(pricer, settings)
    pricer = _only(pricer, source.platforms)
    assumptions = tuple(_assumptions(pricer, written, origin, given)) + extra
    return Priceable(pricer, assumptions, findings)


def _from_four(
    source: PriceSource,
) -> tuple[PanelPricer, tuple[Assumption, ...]]:
    needed = {
        "--family": source.family,
        "--samples": source.samples,
        "--currency": source.currency,
        "--reaction": source.reaction,
    }
    missing = [name for name, value in needed.items() if value is None]
    if missing:
        raise UsageError(
            code="price-inputs-missing",
            where="panelkit price",
            what=f"nothing says what a panel costs (missing {name_some(missing)})",
            accepted="--from FILE with --prices FILE, or the four inputs markers, "
            "--family, --samples, and --currency with --reaction",
            next_step=f"Add {missing[0]}, or name files",
        )
    family = str(source.family)
    programme = programme_section(
        {"currency": source.currency, "samples": source.samples}, "command line"
    )
    # A key that the family leaves open may be among the settings.
    own = {
        key.removeprefix(f"{family}."): value
        for key, value in source.settings
        if key.removeprefix(f"{family}.") in PlatformSection.model_fields
    }
    platform = platform_section(
        {"family": family, **own}, f"--family {family} (keys are given by --set)"
    )
    n_references = USUAL_REFERENCES[family]
    amounts = {"dev": source.development or "0", "test": source.reaction}
    base = AssayPrice.from_row(
        {"marker": ANY_MARKER, "platform": family, "status": "ok", **amounts},
        where="--reaction and --development",
    )
    references = [
        AssayPrice.from_row(
            {
                "marker": f"reference-{number}",
                "platform": family,
                "role": "reference",
                "status": "ok",
                "dev": "0",
                "test": source.reaction,
            },
            where="--reaction",
        )
        for number in range(1, n_references + 1)
    ]
    prices = PriceList((base, *references))
    extra = [
        Assumption("price of a reaction", str(source.reaction), "given"),
        Assumption(
            "development of a marker",
            source.development or "0: none is counted",
            "given" if source.development else "assumed",
        ),
    ]
    if n_references:
        extra.append(
            Assumption(
                "reference assays",
                f"{n_references}, at the price of a marker, validated already",
                f"usual for {family}",
            )
        )
    return PanelPricer(programme, {family: platform}, prices), tuple(extra)


def _from_files(source: PriceSource) -> tuple[PanelPricer, Findings]:
    path = Path(source.file or "")
    strangers = [
        name
        for name, value in (
            ("--family", source.family),
            ("--currency", source.currency),
            ("--reaction", source.reaction),
            ("--development", source.development),
        )
        if value is not None
    ]
    if strangers:
        raise UsageError(
            code="price-inputs-contradict",
            where=f"panelkit price, {strangers[0]}",
            what=f"{name_some(strangers)} stands beside --from {path}, which says it",
            accepted="either files or the four inputs",
            next_step=f"Remove {strangers[0]}, or change the file's key by --set",
        )
    prices, conflicts = source.prices, source.conflicts
    tables = read_toml(path, ("seed", *_STUDY_TABLES))
    kits: Sequence[KitSection]
    if "cohort" in tables:
        study = read_study(path)
        if study.programme is None:
            raise UsageError(
                code="study-without-prices",
                where=str(path),
                what="the study prices nothing (it has no [programme])",
                accepted="a study with [programme], platforms and [panels] prices",
                next_step="Add them, or name a programme file",
            )
        programme, platforms, kits = study.programme, study.platforms, study.kits
        if prices is None and study.panels.prices is not None:
            prices = study.file(study.panels.prices)
        if conflicts is None and study.panels.conflicts is not None:
            conflicts = study.file(study.panels.conflicts)
    else:
        programme = read_programme_file(path)
        platforms, kits = read_platform_file(path), read_kits(path)
    if prices is None:
        raise UsageError(
            code="price-list-missing",
            where="panelkit price",
            what=f"{path} has no prices of assays (got no --prices)",
            accepted="a price list (CSV) with a row for each marker and platform",
            next_step="Add --prices FILE",
        )
    listed = read_price_list(prices)
    unpriced = [name for name in platforms if name not in listed.platforms]
    if unpriced:
        raise UsageError(
            code="platform-without-prices",
            where=str(prices),
            what=f"no row for platform {name_some(unpriced)}",
            accepted=f"rows for every platform of {path} (the list has "
            f"{name_some(listed.platforms)})",
            next_step="Add a row for each marker, or one with marker '*'",
        )
    pairs = NO_CONFLICTS if conflicts is None else read_conflicts(conflicts)
    noticed = [*listed.findings, *kit_findings(kits, listed, str(path))]
    noticed += conflict_findings(pairs, listed, str(conflicts))
    pricer = PanelPricer(programme, platforms, listed, kits, pairs)
    return pricer, Findings(tuple(noticed))


_STUDY_TABLES: Final = (
    "cohort",
    "design",
    "preparation",
    "shortlist",
    "panels",
    "accuracy",
    "choice",
    "statement",
    "programme",
    "platform",
    "kit",
)


def _only(pricer: PanelPricer, names: tuple[str, ...]) -> PanelPricer:
    if not names:
        return pricer
    if strangers := [name for name in names if name not in pricer.platforms]:
        raise UsageError(
            code="platform-unknown",
            where=f"--platform {strangers[0]}",
            what=f"no such platform is described (got {strangers[0]!r})",
            accepted=f"described are {name_some(pricer.platforms)}",
            next_step="Name one of these, or describe it",
        )
    kept = {name: pricer.platforms[name] for name in names}
    return PanelPricer(
        pricer.programme, kept, pricer.prices, pricer.kits, pricer.conflicts
    )


def apply_settings(
    pricer: PanelPricer, settings: Sequence[tuple[str, str]]
) -> tuple[PanelPricer, set[str]]:
    """Return the prices with keys set anew, and which keys these are.

    Parameters
    ----------
    pricer : PanelPricer
        As read.
    settings : sequence of (str, str)
        ``samples`` and the other keys of the programme; a key of platforms, for all
        of them; or ``NAME.KEY`` for one platform.

    Returns
    -------
    tuple of (PanelPricer, set of str)
        Checked like the keys of a file.

    Raises
    ------
    UsageError
        There is no such key.
    StudyFileError
        A value is not accepted.
    """
    programme, platforms = pricer.programme, dict(pricer.platforms)
    given = set()
    for key, value in settings:
        place, dot, name = key.rpartition(".")
        if not dot and key in ProgrammeSection.model_fields:
            programme = programme_section(_written(programme) | {key: value}, "--set")
        elif name in PlatformSection.model_fields and (not dot or place in platforms):
            for each in [place] if dot else list(platforms):
                values = _written(platforms[each]) | {name: _value(value)}
                platforms[each] = platform_section(values, f"--set, platform '{each}'")
                given.add(f"{each}.{name}")
        else:
            raise UsageError(
                code="setting-unknown",
                where=f"--set {key}",
                what=f"no such key of the programme or of a platform (got {key!r})",
                accepted=f"keys such as samples, deliveries, replicates, run_cost, or "
                f"NAME.KEY for one of {name_some(platforms)}",
                next_step="Correct the key",
            )
        given.add(key)
    changed = PanelPricer(
        programme, platforms, pricer.prices, pricer.kits, pricer.conflicts
    )
    return changed, given


def _value(text: str) -> object:
    """Return a setting's value: tiers such as 24:38.00;48:46.00, or the text."""
    if ":" not in text:
        return text
    return [step.split(":", 1) for step in text.split(";") if step]


def _written(section: ProgrammeSection | PlatformSection) -> dict[str, Any]:
    return {key: getattr(section, key) for key in section.model_fields_set}


def _assumptions(
    pricer: PanelPricer, written: set[str], origin: str, given: set[str]
) -> Iterator[Assumption]:
    programme = pricer.programme
    for key in ProgrammeSection.model_fields:
        if key == "repeat_rate":
            continue  # said for each platform, which may have its own
        source = "given" if key in given else origin if key in written else "default"
        yield Assumption(key, plain(getattr(programme, key)), source)
    for name, platform in pricer.platforms.items():
        for key in PlatformSection.model_fields:
            if key == "family":
                continue
            value = getattr(platform, key)
            if key == "repeat_rate":
                value = platform.effective_repeat_rate(programme)
            if key in platform.from_preset:
                source = f"preset of {platform.family}"
            elif key in platform.model_fields_set:
                source = "given" if f"{name}.{key}" in given else "file"
            else:
                source = "default"
            yield Assumption(f"{name}.{key}", plain(value), source)


def plain(value: object) -> str:
    """Return a value of a section in the words of a file."""
    if isinstance(value, tuple):
        return "; ".join(f"{slots}: {price}" for slots, price in value)
    if isinstance(value, Decimal):
        return f"{value:f}"
    return "none" if value is None else str(value)
