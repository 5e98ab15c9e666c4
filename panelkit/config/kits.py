"""Kits: analytes that are bought together, whatever part of them is wanted."""

from collections.abc import Iterable, Mapping
from decimal import Decimal
from pathlib import Path
from typing import Annotated

from pydantic import BeforeValidator, Field

from panelkit.config.defaults import KIT
from panelkit.config.programme import (
    PROGRAMME_FILE_KEYS,
    Count,
    Money,
    Positive,
    TieredPrice,
)
from panelkit.config.sections import Section, check_section, read_toml
from panelkit.errors import StudyFileError, name_some

__all__ = ["KitSection", "kit_sections", "read_kits"]


def _names(value: object) -> object:
    if isinstance(value, list | tuple):
        names = [name.strip() if isinstance(name, str) else "" for name in value]
        if not all(names) or len(set(names)) < len(names):
            raise ValueError("a list of names, each once")
        return tuple(names)
    return value


def _word(value: object) -> object:
    if isinstance(value, str) and not value.strip():
        raise ValueError("a name that is not empty")
    return value.strip() if isinstance(value, str) else value


Names = Annotated[tuple[str, ...], BeforeValidator(_names)]


class KitSection(Section):
    """A predefined set of analytes: one ``[[kit]]`` of a programme file.

    Its price holds all that the kit needs for a sample; collection is counted by the
    programme. A kit keeps its price when one of its markers leaves the panel.

    Attributes
    ----------
    id : str
        Name of the kit.
    markers : tuple of str
        What it measures.
    once : Decimal
        Onboarding: verification, training.
    unit_price : Decimal or tuple of (int, Decimal)
        For each unit; or tiers, each the price of all units from so many on.
    tests_per_unit : int
        Samples that one unit measures, controls already taken off.
    splittable : bool
        Whether a part-used unit may be finished with a later delivery.
    shelf_months : int
        How long a unit keeps; 0 is no limit.
    volume : Decimal
        Sample volume it uses, in the unit of the programme's `sample_volume`.
    excludes : tuple of str
        Kits that cannot be bought beside it.
    """

    id: Annotated[str, BeforeValidator(_word)]
    markers: Names = Field(min_length=1)
    once: Money = KIT.once
    unit_price: TieredPrice
    tests_per_unit: Positive
    splittable: bool = KIT.splittable
    shelf_months: Count = KIT.shelf_months
    volume: Money = KIT.volume
    excludes: Names = ()

    @property
    def price_tiers(self) -> tuple[tuple[int, Decimal], ...]:
        """Price of a unit by the number of units from which it holds."""
        price = self.unit_price
        return ((1, price),) if isinstance(price, Decimal) else price


def kit_sections(
    kits: Iterable[Mapping[str, object] | KitSection], where: str = "kits"
) -> tuple[KitSection, ...]:
    """Return the checked kits.

    Parameters
    ----------
    kits : iterable of mapping of str to object, or KitSection
        The keys of each ``[[kit]]``.
    where : str
        How errors name the place of the kits.

    Returns
    -------
    tuple of KitSection
        In the order given.

    Raises
    ------
    StudyFileError
        If a key is unknown, missing, or holds what it does not accept, or two kits
        have one id.
    """
    made: list[KitSection] = []
    for number, kit in enumerate(kits, start=1):
        section = check_section(KitSection, kit, f"{where}, kit {number}")
        if section.id in {other.id for other in made}:
            raise StudyFileError(
                code="kit-twice",
                where=f"{where}, kit {number}, key 'id'",
                what=f"a kit of that name is there already (got {section.id!r})",
                accepted="each kit once",
                next_step="Rename or remove one of them",
            )
        made.append(section)
    known = {kit.id for kit in made}
    for kit in made:
        if strangers := [name for name in kit.excludes if name not in known]:
            raise StudyFileError(
                code="kit-unknown",
                where=f"{where}, kit '{kit.id}', key 'excludes'",
                what=f"it excludes strangers (got {name_some(strangers)})",
                accepted=f"ids of the other kits ({name_some(sorted(known))})",
                next_step="Correct the id",
            )
    return tuple(made)


def read_kits(path: str | Path) -> tuple[KitSection, ...]:
    """Return the kits that a TOML file describes under ``[[kit]]``.

    Parameters
    ----------
    path : str or Path
        The file; it may also hold ``[programme]`` and ``[platform.NAME]``.

    Returns
    -------
    tuple of KitSection
        Empty where the file has none.

    Raises
    ------
    StudyFileError
        If the file cannot be read, or a kit cannot be used.
    """
    kits = read_toml(path, PROGRAMME_FILE_KEYS).get("kit", [])
    if not isinstance(kits, list):
        raise StudyFileError(
            code="kit-unreadable",
            where=f"{path}, [[kit]]",
            what=f"kits are no list of tables (got {type(kits).__name__})",
            accepted="one table [[kit]], with double brackets, for each kit",
            next_step="Double the brackets",
        )
    return kit_sections(kits, f"{path}, [[kit]]")
