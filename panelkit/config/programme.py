"""The programme and the platforms of a study: what to measure, how, at what price."""

from collections.abc import Mapping
from decimal import Decimal, InvalidOperation
from itertools import pairwise
from pathlib import Path
from typing import Annotated, Any, Final, Literal, Self

from pydantic import (
    BeforeValidator,
    Field,
    ModelWrapValidatorHandler,
    ValidationInfo,
    model_validator,
)

from panelkit.config.currency import MINOR_DIGITS
from panelkit.config.defaults import PLATFORM, PROGRAMME
from panelkit.config.presets import FAMILY_PRESETS, Family
from panelkit.config.sections import Section, check_section, read_toml
from panelkit.errors import StudyFileError, name_some

__all__ = [
    "PROGRAMME_FILE_KEYS",
    "Count",
    "Money",
    "PlatformSection",
    "Positive",
    "ProgrammeSection",
    "TieredPrice",
    "platform_section",
    "programme_section",
    "read_platform_file",
    "read_programme_file",
]

MAX_COUNT: Final = 10**9
MAX_EXPONENT: Final = 15  # beyond it an amount is a typing error, and exact sums crawl


def _where(info: ValidationInfo) -> str:
    place = (info.context or {}).get("where", "programme or platform")
    return f"{place}, key '{info.field_name}'"


def _exact(value: object, info: ValidationInfo) -> Decimal:
    if isinstance(value, bool) or not isinstance(value, Decimal | int | str):
        raise StudyFileError(
            code="amount-not-exact",
            where=_where(info),
            what=f"the value is not an exact number (got {value!r})",
            accepted="a Decimal, a whole number, or text such as '0.04'; "
            "binary floats are refused since they are not exact",
            next_step="Write the number as text or as a Decimal",
        )
    try:
        amount = Decimal(value)
    except InvalidOperation:
        raise StudyFileError(
            code="amount-unreadable",
            where=_where(info),
            what=f"the value is not a number (got {value!r})",
            accepted="digits with a decimal point and no currency sign",
            next_step="Correct the value",
        ) from None
    exponent = amount.as_tuple().exponent
    if (
        not isinstance(exponent, int)
        or exponent < -MAX_EXPONENT
        or amount.adjusted() >= MAX_EXPONENT
    ):
        raise StudyFileError(
            code="amount-implausible",
            where=_where(info),
            what=f"the value is no usable number (got {value!r})",
            accepted=f"at most {MAX_EXPONENT} digits before and after the point",
            next_step="Correct the value",
        )
    return amount


def _whole(value: object, info: ValidationInfo) -> int:
    amount = _exact(value, info)
    if amount != amount.to_integral_value():
        raise StudyFileError(
            code="count-not-whole",
            where=_where(info),
            what=f"the value is not a whole number (got {value})",
            accepted="a whole number",
            next_step="Round the value",
        )
    return int(amount)


def _currency(value: object, info: ValidationInfo) -> str:
    if not isinstance(value, str) or value not in MINOR_DIGITS:
        raise StudyFileError(
            code="currency-unknown",
            where=_where(info),
            what=f"no currency has this code (got {value!r})",
            accepted="a three-letter code of ISO 4217 in capitals, such as EUR or JPY",
            next_step="Write the currency as its code",
        )
    return value


def _groups(value: object, info: ValidationInfo) -> int | str:
    if value in ("auto", "each"):
        return str(value)
    digits = isinstance(value, str) and value.isdecimal()
    number = value if isinstance(value, int) and not isinstance(value, bool) else 0
    if digits:
        number = _whole(value, info)
    if not 1 <= number <= MAX_COUNT:
        raise StudyFileError(
            code="groups-refused",
            where=_where(info),
            what=f"the value is no way to spread pools over runs (got {value!r})",
            accepted="'auto', 'each', or a whole number of at least 1",
            next_step="Write one of these",
        )
    return number


def _position_cost(value: object, info: ValidationInfo) -> object:
    if not isinstance(value, list | tuple):
        price = _exact(value, info)
        _check_position_prices([price], info)
        return price
    tiers = []
    for tier in value:
        if not isinstance(tier, list | tuple) or len(tier) != 2:
            raise StudyFileError(
                code="position-tier-unreadable",
                where=_where(info),
                what=f"a tier is not a pair (got {tier!r})",
                accepted="pairs of slots and price, such as [[24, 38.00], [48, 46.00]]",
                next_step="Correct the tier",
            )
        tiers.append((_whole(tier[0], info), _exact(tier[1], info)))
    edges = [slots for slots, _ in tiers]
    rising = all(a < b for a, b in pairwise(edges))
    if not edges or edges[0] < 1 or not rising:
        raise StudyFileError(
            code="position-tiers-not-rising",
            where=_where(info),
            what=f"the slots of the tiers do not rise from 1 on (got {edges})",
            accepted="at least one tier, each with more slots than the one before",
            next_step="Put the tiers in order of slots",
        )
    _check_position_prices([price for _, price in tiers], info)
    return tuple(tiers)


def _check_position_prices(prices: list[Decimal], info: ValidationInfo) -> None:
    if min(prices) < 0:
        raise StudyFileError(
            code="amount-negative",
            where=_where(info),
            what=f"a price is negative (got {min(prices)})",
            accepted="prices of at least 0",
            next_step="Correct the price",
        )


Money = Annotated[Decimal, Field(ge=0), BeforeValidator(_exact)]
Rate = Annotated[Decimal, Field(ge=0, lt=1), BeforeValidator(_exact)]
Chance = Annotated[Decimal, Field(gt=0, le=1), BeforeValidator(_exact)]
Count = Annotated[int, Field(ge=0, le=MAX_COUNT), BeforeValidator(_whole)]
Positive = Annotated[int, Field(ge=1, le=MAX_COUNT), BeforeValidator(_whole)]
Groups = Annotated[int | Literal["auto", "each"], BeforeValidator(_groups)]
TieredPrice = Annotated[
    Decimal | tuple[tuple[int, Decimal], ...],
    BeforeValidator(_position_cost),
]


class ProgrammeSection(Section):
    """What is to be measured: ``[programme]`` of a study.

    Attributes
    ----------
    currency : str
        ISO 4217 code; every price is in it.
    samples : int
        Results wanted over the horizon.
    horizon_months : int
        Length of the programme.
    deliveries : int
        Separate occasions on which the samples arrive.
    repeat_rate : Decimal
        Share of panel runs that fail, 0 to below 1, whatever the platform.
    repeat_mode : {"none", "once", "until"}
        Whether failed samples are run again, once, or until they succeed.
    collection_cost : Decimal
        For each sample, once, whatever the platforms.
    sample_volume : Decimal
        What is at hand of each sample for all pools and kits; 0 is no limit.
    missing_price : {"refuse", "bound", "impute", "exclude"}
        What to do about assays without a quote.
    """

    currency: Annotated[str, BeforeValidator(_currency)]
    samples: Positive
    horizon_months: Positive = PROGRAMME.horizon_months
    deliveries: Positive = PROGRAMME.deliveries
    repeat_rate: Rate = PROGRAMME.repeat_rate
    repeat_mode: Literal["none", "once", "until"] = PROGRAMME.repeat_mode
    collection_cost: Money = PROGRAMME.collection_cost
    sample_volume: Money = PROGRAMME.sample_volume
    missing_price: Literal["refuse", "bound", "impute", "exclude"] = (
        PROGRAMME.missing_price
    )


class PlatformSection(Section):
    """How panels are measured: one ``[platform.NAME]`` of a study.

    Keys left out take the family's usual value where there is one, else the
    default; `from_preset` names the former. `model_fields_set` holds only the keys
    that the user wrote, so dumping those reads back as the same platform.

    Attributes
    ----------
    family : str or None
        Family of assays, a key of `FAMILY_PRESETS`.
    positions : int
        Reaction positions of one run.
    plex : int
        Slots of one pool.
    replicates : int
        Positions of each pool and sample.
    controls_per_pool, controls_per_run : int
        Control positions of a run for each of its pools, and whatever the pools.
    groups : int, "each" or "auto"
        Over how many runs the pools of one sample are spread.
    refs_scope : {"panel", "pool"}
        References once for a panel, or in every pool.
    repeat_rate : Decimal or None
        Overrides the programme's rate on this platform.
    setup, pool_setup : Decimal
        Paid once, and once for each pool.
    run_cost : Decimal
        For each run.
    position_cost : Decimal or tuple of (int, Decimal)
        For each filled position; or tiers, each the price up to so many slots in
        the pool.
    sample_cost : Decimal
        For each sample run.
    prep_positions : int
        Positions that one preparation of a sample feeds; 0 is no limit.
    prep_cost : Decimal
        For each preparation.
    overage : Decimal
        Dead volume, as a share of reactions and positions.
    lot_months : int
        Life of a reagent lot; 0 is no limit.
    lot_cost : Decimal
        Bridging at each change of lot.
    run_budget, slot_budget : Decimal
        Shared resource of one run (0 is none), and what one occupied slot of one
        position takes of it.
    max_positions_per_sample : int
        Limit by sample volume; 0 is none.
    pool_volume : Decimal
        Sample volume that one pool takes, in the unit of `sample_volume`.
    design_success : Decimal
        Chance that an assay ordered for this platform works, above 0 to 1; the
        price list may say it for each marker.
    """

    family: Family | None = None
    positions: Positive
    plex: Positive = PLATFORM.plex
    replicates: Positive = PLATFORM.replicates
    controls_per_pool: Count = PLATFORM.controls_per_pool
    controls_per_run: Count = PLATFORM.controls_per_run
    groups: Groups = PLATFORM.groups
    refs_scope: Literal["panel", "pool"] = PLATFORM.refs_scope
    repeat_rate: Rate | None = None
    setup: Money = PLATFORM.setup
    pool_setup: Money = PLATFORM.pool_setup
    run_cost: Money = PLATFORM.run_cost
    position_cost: TieredPrice = PLATFORM.position_cost
    sample_cost: Money = PLATFORM.sample_cost
    prep_positions: Count = PLATFORM.prep_positions
    prep_cost: Money = PLATFORM.prep_cost
    overage: Rate = PLATFORM.overage
    lot_months: Count = PLATFORM.lot_months
    lot_cost: Money = PLATFORM.lot_cost
    run_budget: Money = PLATFORM.run_budget
    slot_budget: Money = PLATFORM.slot_budget
    max_positions_per_sample: Count = PLATFORM.max_positions_per_sample
    pool_volume: Money = PLATFORM.pool_volume
    design_success: Chance = PLATFORM.design_success

    @model_validator(mode="wrap")
    @classmethod
    def _fill_from_family(
        cls, values: Any, handler: ModelWrapValidatorHandler[Self]
    ) -> Self:
        if not isinstance(values, Mapping):
            return handler(values)
        family = values.get("family")
        preset = FAMILY_PRESETS.get(family, {}) if isinstance(family, str) else {}
        filled = {key: preset[key] for key in preset if key not in values}
        section = handler({**filled, **values})
        # Keys of the preset count as left out: the report must tell them apart.
        section.model_fields_set.difference_update(filled)
        return section

    @model_validator(mode="after")
    def _check_budget(self, info: ValidationInfo) -> Self:
        if self.run_budget > 0 and self.slot_budget == 0:
            place = (info.context or {}).get("where", "platform")
            raise StudyFileError(
                code="slot-budget-missing",
                where=f"{place}, key 'slot_budget'",
                what=f"nothing takes from the run budget of {self.run_budget} (got 0)",
                accepted="a slot_budget above 0 wherever run_budget is above 0",
                next_step="Give slot_budget or remove run_budget",
            )
        return self

    @property
    def from_preset(self) -> tuple[str, ...]:
        """Keys whose value came from the family's preset."""
        if self.family is None:
            return ()
        keys = FAMILY_PRESETS[self.family]
        return tuple(key for key in keys if key not in self.model_fields_set)

    def effective_repeat_rate(self, programme: ProgrammeSection) -> Decimal:
        """Return the share of panel runs that fail on this platform.

        Parameters
        ----------
        programme : ProgrammeSection
            Holds the rate for all platforms.

        Returns
        -------
        Decimal
            What the user wrote for the platform, else for the programme, else the
            family's preset, else the programme's default.
        """
        own = self.repeat_rate
        if own is None:
            return programme.repeat_rate
        if "repeat_rate" in self.model_fields_set:
            return own
        written = "repeat_rate" in programme.model_fields_set
        return programme.repeat_rate if written else own


def programme_section(
    values: Mapping[str, object] | ProgrammeSection, where: str = "programme"
) -> ProgrammeSection:
    """Return the checked programme.

    Parameters
    ----------
    values : mapping of str to object, or ProgrammeSection
        The keys of ``[programme]``; amounts as int, str or Decimal.
    where : str
        How errors name the place of the keys.

    Returns
    -------
    ProgrammeSection
        With defaults filled in.

    Raises
    ------
    StudyFileError
        If a key is unknown, missing, or holds what it does not accept.
    """
    return check_section(ProgrammeSection, values, where)


def platform_section(
    values: Mapping[str, object] | PlatformSection, where: str = "platform"
) -> PlatformSection:
    """Return the checked platform.

    Parameters
    ----------
    values : mapping of str to object, or PlatformSection
        The keys of ``[platform.NAME]``; amounts as int, str or Decimal.
    where : str
        How errors name the place of the keys.

    Returns
    -------
    PlatformSection
        With the family's preset and defaults filled in.

    Raises
    ------
    StudyFileError
        If a key is unknown, missing, or holds what it does not accept.
    """
    return check_section(PlatformSection, values, where)


PROGRAMME_FILE_KEYS: Final = ("programme", "platform", "kit")


def read_programme_file(path: str | Path) -> ProgrammeSection:
    """Return the programme that a TOML file describes under ``[programme]``.

    Parameters
    ----------
    path : str or Path
        The file; it may also hold ``[platform.NAME]`` and ``[[kit]]``, which other
        readers take up.

    Returns
    -------
    ProgrammeSection
        With amounts exactly as written.

    Raises
    ------
    StudyFileError
        If the file cannot be read, or its ``[programme]`` cannot be used.
    """
    tables = read_toml(path, PROGRAMME_FILE_KEYS)
    if "programme" not in tables:
        raise StudyFileError(
            code="programme-missing",
            where=str(path),
            what=f"the file describes no programme (got {name_some(tables)})",
            accepted="a table [programme] with at least currency and samples",
            next_step="Add the table",
        )
    return programme_section(tables["programme"], f"{path}, [programme]")


def read_platform_file(path: str | Path) -> dict[str, PlatformSection]:
    """Return the platforms that a TOML file describes under ``[platform.NAME]``.

    Parameters
    ----------
    path : str or Path
        The file; it may also hold ``[programme]`` and ``[[kit]]``.

    Returns
    -------
    dict of str to PlatformSection
        Name to platform, in file order.

    Raises
    ------
    StudyFileError
        If the file cannot be read, or one of its platforms cannot be used.
    """
    tables = read_toml(path, PROGRAMME_FILE_KEYS)
    platforms = tables.get("platform")
    if not isinstance(platforms, dict) or not all(
        isinstance(table, dict) for table in platforms.values()
    ):
        raise StudyFileError(
            code="platform-missing",
            where=str(path),
            what="the file describes no named platform "
            f"(got {name_some(platforms) if isinstance(platforms, dict) else 'none'})",
            accepted="a table [platform.NAME] for each platform",
            next_step="Add or rename the table",
        )
    return {
        name: platform_section(table, f"{path}, [platform.{name}]")
        for name, table in platforms.items()
    }
