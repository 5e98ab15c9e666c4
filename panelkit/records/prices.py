"""Prices and what they add up to: the price list and the cost of one panel."""

import difflib
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field, replace
from datetime import date, datetime
from decimal import Decimal, InvalidOperation
from itertools import pairwise
from typing import TYPE_CHECKING, Final, Literal, cast

from panelkit.errors import InputDataError, UsageError, name_some
from panelkit.records.findings import Findings
from panelkit.records.record import Record, frame

if TYPE_CHECKING:
    import pandas as pd

__all__ = [
    "ANY_MARKER",
    "PRICE_COLUMNS",
    "AssayPrice",
    "PriceList",
    "check_price_columns",
]

ANY_MARKER: Final = "*"
"""Marker of the row that prices every marker without an own row."""

PRICE_COLUMNS: Final = (
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
    "channel",
    "design_success",
    "fail_rate",
    "cv_pct",
    "concordance",
    "backup_of",
    "quote_date",
    "note",
)
"""Columns of a price list, in the order in which they are written."""

INCREMENTAL: Final = "incremental"
MAX_EXPONENT: Final = 15  # beyond it a price is a typing error, and exact sums crawl

Role = Literal["marker", "reference"]
Status = Literal["ok", "no", "unknown"]


@dataclass(frozen=True, slots=True, eq=False)
class AssayPrice(Record):
    """One row of a price list: one assay on one platform.

    Attributes
    ----------
    marker, platform : str
        Keys of the row.
    role : {"marker", "reference"}
        References of a platform are part of every panel on it.
    status : {"ok", "no", "unknown"}
        Whether the marker can be assayed there.
    dev : Decimal or None
        One-off cost; None where no quote is at hand.
    test : Decimal or None
        Reagent price of one reaction.
    pack : int or None
        Reactions in one pack (minimum order); stands in for `test`.
    pack_price : Decimal or None
        Price of one pack.
    tiers : tuple of (int, Decimal)
        Quantity from which a price of one reaction holds; stands in for `test`.
    incremental : bool
        Whether each tier prices only the reactions inside it; else the tier
        reached prices all of them.
    slots : int
        Plex slots that the assay occupies.
    pool_class : str
        Assays of different class cannot share a pool.
    channel : str
        Detection channel that the assay is tied to; assays of one channel cannot
        share a pool.
    design_success : Decimal or None
        Chance that the assay works once it is ordered; None takes the platform's.
    fail_rate : Decimal
        Chance that this assay forces a repeat.
    cv_pct : Decimal or None
        Expected coefficient of variation, in per cent.
    concordance : Decimal or None
        Correlation with the discovery measurement, 0 to 1.
    backup_of : str
        Marker for which this one is a declared stand-in.
    quote_date : date or None
        Day of the quote.
    note : str
        Free text.
    """

    marker: str
    platform: str = ""
    role: Role = "marker"
    status: Status = "unknown"
    dev: Decimal | None = None
    test: Decimal | None = None
    pack: int | None = None
    pack_price: Decimal | None = None
    tiers: tuple[tuple[int, Decimal], ...] = ()
    incremental: bool = False
    slots: int = 1
    pool_class: str = ""
    channel: str = ""
    design_success: Decimal | None = None
    fail_rate: Decimal = Decimal(0)
    cv_pct: Decimal | None = None
    concordance: Decimal | None = None
    backup_of: str = ""
    quote_date: date | None = None
    note: str = ""

    @property
    def has_reagent_quote(self) -> bool:
        """Whether a reaction has a price; 0 is a price."""
        return self.test is not None or self.pack is not None or bool(self.tiers)

    @property
    def is_missing_quote(self) -> bool:
        """Whether the one-off cost or the reagent price is missing."""
        return self.dev is None or not self.has_reagent_quote

    @classmethod
    def from_row(cls, row: Mapping[str, object], *, where: str) -> "AssayPrice":
        """Return the assay that a row of a price list describes.

        Parameters
        ----------
        row : mapping of str to str, int, Decimal, date or None
            Column to cell; absent, empty and None mean the same.
        where : str
            How errors name the row, for example ``"prices.csv, line 7"``.

        Returns
        -------
        AssayPrice
            With every amount exact.

        Raises
        ------
        InputDataError
            If a column is unknown, or a cell is not what its column accepts.
        """
        cells = _Cells(row, where)
        tiers, incremental = cells.tiers()
        pack, pack_price = cells.pack(bool(tiers))
        slots = cells.count("slots")
        role = cast("Role", cells.choice("role", ("marker", "reference"), "marker"))
        status = cells.choice("status", ("ok", "no", "unknown"), "unknown")
        return cls(
            marker=cells.marker(role),
            platform=cells.text("platform"),
            role=role,
            status=cast("Status", status),
            dev=cells.amount("dev"),
            test=cells.amount("test"),
            pack=pack,
            pack_price=pack_price,
            tiers=tiers,
            incremental=incremental,
            slots=1 if slots is None else slots,
            pool_class=cells.text("class"),
            channel=cells.text("channel"),
            design_success=cells.chance("design_success"),
            fail_rate=cells.rate("fail_rate"),
            cv_pct=cells.amount("cv_pct"),
            concordance=cells.correlation("concordance"),
            backup_of=cells.text("backup_of"),
            quote_date=cells.day("quote_date"),
            note=cells.text("note"),
        )

    def as_row(self) -> dict[str, object]:
        """Return the row of a price list that describes this assay.

        Returns
        -------
        dict of str to object
            In the order of `PRICE_COLUMNS`; `from_row` reads it back.
        """
        steps = [f"{quantity}:{price}" for quantity, price in self.tiers]
        head = [INCREMENTAL] if self.incremental else []
        named = {"class": self.pool_class, "tiers": ";".join(head + steps)}
        return {
            name: named[name] if name in named else getattr(self, name)
            for name in PRICE_COLUMNS
        }


def check_price_columns(names: Iterable[str], where: str) -> None:
    """Check that a price list may have columns of these names.

    Parameters
    ----------
    names : iterable of str
        Names of columns.
    where : str
        How errors name the place of the columns.

    Raises
    ------
    InputDataError
        If a name is unknown; the nearest known one is offered.
    """
    unknown = [str(name) for name in names if name not in PRICE_COLUMNS]
    if unknown:
        near = difflib.get_close_matches(unknown[0], PRICE_COLUMNS, n=1)
        hint = f"perhaps '{near[0]}' is meant; " if near else ""
        raise InputDataError(
            code="column-unknown",
            where=f"{where}, column '{unknown[0]}'",
            what=f"a price list has no such column (got {unknown[0]!r})",
            accepted=f"{hint}the columns are {', '.join(PRICE_COLUMNS)}",
            next_step="Rename or remove the column",
        )


class _Cells:
    """The cells of one row, read by what their columns accept."""

    def __init__(self, row: Mapping[str, object], where: str) -> None:
        self.row = row
        self.row_where = where
        check_price_columns(row, where)

    def where(self, name: str) -> str:
        return f"{self.row_where}, column '{name}'"

    def text(self, name: str) -> str:
        value = self.row.get(name)
        return "" if value is None else str(value).strip()

    def marker(self, role: Role) -> str:
        name = self.text("marker")
        if not name:
            raise InputDataError(
                code="marker-empty",
                where=self.where("marker"),
                what="the marker has no name (got an empty cell)",
                accepted=f"a marker's id, or '{ANY_MARKER}' for all others",
                next_step="Name the marker or remove the row",
            )
        if name == ANY_MARKER and role == "reference":
            raise InputDataError(
                code="reference-unnamed",
                where=self.where("role"),
                what=f"'{ANY_MARKER}' cannot be a reference (got role 'reference')",
                accepted="references are named one by one",
                next_step="Give each reference its own row",
            )
        return name

    def choice(self, name: str, accepted: Sequence[str], default: str) -> str:
        value = self.text(name) or default
        if value not in accepted:
            raise InputDataError(
                code="choice-unknown",
                where=self.where(name),
                what=f"the cell holds no known word (got {value!r})",
                accepted=f"accepted are {', '.join(accepted)}, or an empty cell",
                next_step="Correct the cell",
            )
        return value

    def amount(self, name: str) -> Decimal | None:
        value = self.row.get(name)
        if isinstance(value, bool | float):
            raise InputDataError(
                code="binary-float",
                where=self.where(name),
                what=f"a binary float is not exact (got {value!r})",
                accepted="a Decimal, a whole number, or text such as '0.18'",
                next_step="Pass the number as text, or None where it is missing",
            )
        text = self.text(name)
        return parse_amount(text, self.where(name)) if text else None

    def rate(self, name: str) -> Decimal:
        value = self.amount(name)
        if value is not None and value >= 1:
            raise InputDataError(
                code="rate-too-large",
                where=self.where(name),
                what=f"a rate of 1 or more leaves no result (got {value})",
                accepted="a fraction from 0 to below 1 (4 % is 0.04)",
                next_step="Write the rate as a fraction",
            )
        return Decimal(0) if value is None else value

    def chance(self, name: str) -> Decimal | None:
        value = self.amount(name)
        if value is not None and not 0 < value <= 1:
            raise InputDataError(
                code="chance-refused",
                where=self.where(name),
                what=f"the cell is no chance of success (got {value})",
                accepted="a number above 0, up to 1 (90 % is 0.9), or an empty cell",
                next_step="Correct the cell",
            )
        return value

    def correlation(self, name: str) -> Decimal | None:
        value = self.amount(name)
        if value is not None and value > 1:
            raise InputDataError(
                code="correlation-too-large",
                where=self.where(name),
                what=f"a correlation cannot pass 1 (got {value})",
                accepted="a number from 0 to 1",
                next_step="Correct the cell",
            )
        return value

    def count(self, name: str) -> int | None:
        value = self.amount(name)
        if value is None:
            return None
        if value < 1 or value != value.to_integral_value():
            raise InputDataError(
                code="count-refused",
                where=self.where(name),
                what=f"the cell is not a count (got {value})",
                accepted="a whole number of at least 1",
                next_step="Correct the cell",
            )
        return int(value)

    def day(self, name: str) -> date | None:
        value = self.row.get(name)
        if isinstance(value, datetime):
            return value.date()
        if isinstance(value, date):
            return value
        text = self.text(name)
        if not text:
            return None
        try:
            return date.fromisoformat(text)
        except ValueError:
            raise InputDataError(
                code="date-refused",
                where=self.where(name),
                what=f"the cell is not a date (got {text!r})",
                accepted="a date as year-month-day, such as 2025-01-15",
                next_step="Correct the date or leave the cell empty",
            ) from None

    def pack(self, has_tiers: bool) -> tuple[int | None, Decimal | None]:
        pack, price = self.count("pack"), self.amount("pack_price")
        if (pack is None) != (price is None):
            missing = "pack" if pack is None else "pack_price"
            raise InputDataError(
                code="pack-incomplete",
                where=self.where(missing),
                what="a minimum order needs pack and pack_price (got only one)",
                accepted="both filled, or both empty",
                next_step=f"Fill {missing} or empty the other",
            )
        if pack is not None and has_tiers:
            raise InputDataError(
                code="pack-with-tiers",
                where=self.where("tiers"),
                what="the row has two reagent prices (got pack and tiers)",
                accepted="either pack with pack_price, or tiers",
                next_step="Empty one of them",
            )
        return pack, price

    def tiers(self) -> tuple[tuple[tuple[int, Decimal], ...], bool]:
        text = self.text("tiers")
        if not text:
            return (), False
        steps = [part.strip() for part in text.split(";") if part.strip()]
        incremental = bool(steps) and steps[0] == INCREMENTAL
        where = self.where("tiers")
        tiers = tuple(_tier(step, where) for step in steps[incremental:])
        quantities = [quantity for quantity, _ in tiers]
        if not tiers or any(b <= a for a, b in pairwise(quantities)):
            raise InputDataError(
                code="tiers-not-rising",
                where=where,
                what=f"the quantities do not rise (got {text!r})",
                accepted="quantity:price with rising quantities, "
                "such as 1:2.00;500:1.60",
                next_step="Put the tiers in order of quantity",
            )
        if incremental and quantities[0] != 1:
            raise InputDataError(
                code="tiers-start-late",
                where=where,
                what=f"the first reactions have no price (got {text!r})",
                accepted="an incremental schedule starts with quantity 1",
                next_step="Add the price of the first bracket",
            )
        return tiers, incremental


def _tier(step: str, where: str) -> tuple[int, Decimal]:
    quantity, colon, price = step.partition(":")
    quantity = quantity.strip()
    if not colon or not quantity.isdecimal() or not 0 < len(quantity) <= MAX_EXPONENT:
        raise InputDataError(
            code="tiers-unreadable",
            where=where,
            what=f"a tier is not quantity:price (got {step!r})",
            accepted="tiers such as 1:2.00;500:1.60;1000:1.30",
            next_step="Correct the tier",
        )
    if int(quantity) < 1:
        raise InputDataError(
            code="count-refused",
            where=where,
            what=f"a tier starts below one reaction (got {step!r})",
            accepted="a whole number of at least 1",
            next_step="Correct the tier",
        )
    return int(quantity), parse_amount(price.strip(), where)


def parse_amount(text: str, where: str) -> Decimal:
    """Return the exact, non-negative number that a cell holds.

    Parameters
    ----------
    text : str
        The cell.
    where : str
        How errors name the cell.

    Returns
    -------
    Decimal
        Finite and at least 0.

    Raises
    ------
    InputDataError
        If the text is no such number.
    """
    try:
        value = Decimal(text)
    except InvalidOperation:
        raise InputDataError(
            code="number-unreadable",
            where=where,
            what=f"the cell is not a number (got {text!r})",
            accepted="digits with a decimal point and no currency sign",
            next_step="Correct the cell or leave it empty",
        ) from None
    if not value.is_finite() or not is_plausible(value):
        raise InputDataError(
            code="number-implausible",
            where=where,
            what=f"the cell is no usable number (got {text!r})",
            accepted=f"at most {MAX_EXPONENT} digits before and after the point",
            next_step="Correct the cell or leave it empty",
        )
    if value < 0:
        raise InputDataError(
            code="amount-negative",
            where=where,
            what=f"the cell is negative (got {text})",
            accepted="a number of at least 0",
            next_step="Correct the cell or leave it empty",
        )
    return value.copy_abs()  # "-0" is 0; abs() would round to the context


def is_plausible(value: Decimal) -> bool:
    """Return whether exact arithmetic on `value` stays cheap."""
    exponent = value.as_tuple().exponent
    return (
        isinstance(exponent, int)
        and exponent >= -MAX_EXPONENT
        and value.adjusted() < MAX_EXPONENT
    )


@dataclass(frozen=True, slots=True, eq=False)
class PriceList(Record):
    """A checked price list.

    Attributes
    ----------
    rows : tuple of AssayPrice
        In file order; marker and platform together are unique.
    findings : Findings
        What was noticed while reading.
    analytes : mapping of str to str
        Feature to what it measures: a feature without an own row takes the row of its
        analyte, so that a list can be written by analyte.
    """

    rows: tuple[AssayPrice, ...]
    findings: Findings = field(default_factory=Findings)
    analytes: Mapping[str, str] = field(default_factory=dict)
    _places: dict[str, dict[str, int]] = field(
        init=False, repr=False, default_factory=dict
    )

    def __post_init__(self) -> None:
        """Index the rows: a cohort's price list can be long and is asked often."""
        for place, row in enumerate(self.rows):
            self._places.setdefault(row.platform, {})[row.marker] = place
        Record.__post_init__(self)

    @property
    def platforms(self) -> tuple[str, ...]:
        """Platforms in order of first appearance."""
        return tuple(self._places)

    def quotes(self, platform: str) -> tuple[AssayPrice, ...]:
        """Return all rows of one platform, in file order.

        Parameters
        ----------
        platform : str
            Name of the platform.

        Returns
        -------
        tuple of AssayPrice
            Markers, references and the row for any marker.

        Raises
        ------
        UsageError
            If the list has no row for the platform.
        """
        return tuple(self.rows[place] for place in self._at(platform).values())

    def for_panel(
        self, markers: Iterable[str], platform: str
    ) -> tuple[AssayPrice, ...]:
        """Return the assays that a panel needs on a platform.

        Parameters
        ----------
        markers : iterable of str
            Markers of the panel.
        platform : str
            Name of the platform.

        Returns
        -------
        tuple of AssayPrice
            Markers in file order, then those without an own row in the order
            given (at the price of their analyte, else for any marker, else without
            a price), then the platform's references in file order.

        Raises
        ------
        UsageError
            If the platform is not in the list, a marker is named twice, or a
            marker is a reference there.
        """
        places = self._at(platform)
        wanted = list(markers)
        repeated = sorted({name for name in wanted if wanted.count(name) > 1})
        if repeated:
            raise UsageError(
                code="marker-repeated",
                where="markers of the panel",
                what=f"markers are named twice (got {name_some(repeated)})",
                accepted="each marker is named once",
                next_step="Remove the repeated names",
            )
        references = [row for row in self.quotes(platform) if row.role == "reference"]
        both = [row.marker for row in references if row.marker in wanted]
        if both:
            raise UsageError(
                code="marker-is-reference",
                where=f"markers of the panel on platform '{platform}'",
                what=f"references are named as markers (got {name_some(both)})",
                accepted="references join every panel on their own",
                next_step="Remove them from the panel or change their role",
            )
        own = sorted(places[name] for name in wanted if name in places)
        others = [
            self._without_row(name, platform) for name in wanted if name not in places
        ]
        return (*(self.rows[place] for place in own), *others, *references)

    def _without_row(self, marker: str, platform: str) -> AssayPrice:
        places = self._at(platform)
        analyte = self.analytes.get(marker, marker)
        place = places.get(analyte, places.get(ANY_MARKER))
        if place is None or self.rows[place].role == "reference":
            return AssayPrice(marker=marker, platform=platform)
        return replace(self.rows[place], marker=marker)

    def _at(self, platform: str) -> dict[str, int]:
        if platform not in self._places:
            raise UsageError(
                code="platform-unknown",
                where=f"platform '{platform}'",
                what=f"the price list has no row for it (got {platform!r})",
                accepted=f"the list prices {name_some(self.platforms) or 'nothing'}",
                next_step="Name one of these platforms or add prices for it",
            )
        return self._places[platform]

    def to_frame(self) -> "pd.DataFrame":
        """Return one row an assay, in the columns of a price list."""
        rows = [row.as_row() for row in self.rows]
        return frame({name: [row[name] for row in rows] for name in PRICE_COLUMNS})
