"""Makers: procedures that propose a panel of a given size."""

from panelkit.costing.makers.contract import Evidence, Maker
from panelkit.costing.makers.exhaustive import by_trying_all
from panelkit.costing.makers.forward import by_forward_choice
from panelkit.costing.makers.own_list import by_own_list
from panelkit.costing.makers.price_weighted import by_weighted_price
from panelkit.costing.makers.ranking import by_difference, by_frequency, by_group
from panelkit.errors import StudyFileError, UsageError, name_some

__all__ = [
    "MAKERS",
    "USING_PRICES",
    "Evidence",
    "Maker",
    "maker_named",
    "register_maker",
]

MAKERS: dict[str, Maker] = {
    "frequency": by_frequency,
    "univariate": by_difference,
    "groups": by_group,
    "forward": by_forward_choice,
    "exhaustive": by_trying_all,
    "price-weighted": by_weighted_price,
    "own": by_own_list,
}

USING_PRICES = ("groups", "price-weighted")
"""Makers whose panels change with the prices."""


def maker_named(name: str) -> Maker:
    """Return a maker by its name.

    Raises
    ------
    StudyFileError
        No maker of that name.
    """
    if name not in MAKERS:
        raise StudyFileError(
            code="unknown-maker",
            where="[panels] makers",
            what=f"no such maker (got {name!r})",
            accepted=f"makers are {name_some(MAKERS)}",
            next_step="Correct the name",
        )
    return MAKERS[name]


def register_maker(name: str, maker: Maker) -> None:
    """Make a procedure known under a name that study files can use.

    Parameters
    ----------
    name : str
        Not taken yet.
    maker : Maker
        The same procedure in every fold; it sees training rows only, through its
        evidence.

    Raises
    ------
    UsageError
        The name is taken.
    """
    if name in MAKERS:
        raise UsageError(
            code="maker-name-taken",
            where="register_maker, name",
            what=f"there is a maker of that name already (got {name!r})",
            accepted="a name of its own",
            next_step="Choose another name",
        )
    MAKERS[name] = maker
