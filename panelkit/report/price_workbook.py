"""A spreadsheet of one priced panel whose formulas are live.

Change an input and every count, line and total follows. Which assays share a pool and
how pools are spread over runs are as computed; ceilings guard against binary floats.
"""

import io
from decimal import Decimal
from typing import TYPE_CHECKING, Any

from panelkit.errors import RunFolderError
from panelkit.records import LINE_WORDS, RESEARCH_USE, CostSheet, SheetAssay

if TYPE_CHECKING:
    from openpyxl.workbook import Workbook
    from openpyxl.worksheet.worksheet import Worksheet

__all__ = ["price_workbook"]

AS_COMPUTED = (
    "Kits, which assays share a pool, and how pools are spread over runs stay as "
    "computed; all else follows the inputs."
)
GUARD = 9  # digits after which a float's error is no more than noise


def price_workbook(sheets: tuple[CostSheet, ...]) -> bytes:
    """Return a workbook with the cost of one scenario, or of two, as live formulas.

    Parameters
    ----------
    sheets : tuple of CostSheet
        One a scenario.

    Returns
    -------
    bytes
        An .xlsx file.

    Raises
    ------
    RunFolderError
        openpyxl is not installed.
    """
    try:
        from openpyxl import Workbook
    except ImportError:
        raise RunFolderError(
            code="openpyxl-missing",
            where="--out, the spreadsheet",
            what="spreadsheets need openpyxl, which is not installed",
            accepted="an installation with the extra 'excel'",
            next_step="Install panelkit[excel], or ask for --no-workbook",
        ) from None
    book = Workbook()
    book.remove(book.active)
    for sheet in sheets:
        _Book(book, sheet, f" {sheet.name}" if len(sheets) > 1 else "").write()
    target = io.BytesIO()
    book.save(target)
    return target.getvalue()


class _Book:
    """The four sheets of one scenario."""

    def __init__(self, book: "Workbook", sheet: CostSheet, suffix: str) -> None:
        self.sheet = sheet
        self.cost = sheet.cost
        self.names = {
            part: f"{part}{suffix}" for part in ("Cost", "Inputs", "Runs", "Assays")
        }
        self.pages: dict[str, Worksheet] = {
            part: book.create_sheet(name) for part, name in self.names.items()
        }
        self.at: dict[str, str] = {}

    def write(self) -> None:
        self._inputs()
        self._assays_head()
        self._runs()
        self._assays()
        self._cost()
        for page in self.pages.values():
            _look(page)

    def _ref(self, part: str, cell: str) -> str:
        column, row = cell.rstrip("0123456789"), cell.lstrip("ABCDEFGHIJKLMNOP")
        return f"'{self.names[part]}'!${column}${row}"

    def _span(self, part: str, column: str, first: int, last: int) -> str:
        return f"'{self.names[part]}'!${column}${first}:${column}${last}"

    def _inputs(self) -> None:
        page = self.pages["Inputs"]
        _row(page, 1, "input", "value")
        row = 2
        for key, value in self.sheet.inputs:
            _row(page, row, key, value)
            self.at[key] = self._ref("Inputs", f"B{row}")
            row += 1
        for slots, price in self.sheet.position_tiers:
            key = f"position_cost up to {slots} slots" if slots else "position_cost"
            _row(page, row, key, price)
            self.at[f"tier {slots}"] = self._ref("Inputs", f"B{row}")
            row += 1

    def _assays_head(self) -> None:
        """Fix where rows of assays stand: runs refer to them and they to runs."""
        self.first = 2
        self.last = 1 + len(self.sheet.assays)

    def _ceil(self, text: str) -> str:
        return f"ROUNDUP(ROUND({text},{GUARD}),0)"

    def _runs(self) -> None:
        page, at = self.pages["Runs"], self.at
        _row(page, 1, "count", "value")
        passes = "1"
        if self.sheet.assays:
            passes = f"PRODUCT({self._span('Assays', 'M', self.first, self.last)})"
        n, mode = at["samples"], at["repeat_mode"]
        slots = max(self.cost.fullest_pool, 1)
        counts = [
            ("chance that a panel run fails", f"1-(1-{at['repeat_rate']})*{passes}"),
            (
                "samples run",
                f'IF({mode}="once",{self._ceil(f"{n}*(1+B2)")},'
                f'IF({mode}="until",{self._ceil(f"{n}/(1-B2)")},{n}))',
            ),
            (
                "results expected",
                f'IF({mode}="once",{n}*(1-B2^2),IF({mode}="until",{n},{n}*(1-B2)))',
            ),
            ("pools", len(self._pools())),
            (
                "usable positions of a run",
                f"IF({at['run_budget']}>0,MIN({at['positions']},"
                f"INT(ROUND({at['run_budget']}/MAX({at['slot_budget']}*{slots},"
                f"1E-12),{GUARD}))),{at['positions']})",
            ),
            (
                "preparations of a sample",
                f"IF({at['prep_positions']}>0,"
                f"ROUNDUP({at['replicates']}*B5/MAX({at['prep_positions']},1),0),0)",
            ),
            (
                "reagent lots",
                f"IF({at['lot_months']}>0,"
                f"ROUNDUP({at['horizon_months']}/MAX({at['lot_months']},1),0),1)",
            ),
        ]
        for k, (name, formula) in enumerate(counts):
            value = formula if isinstance(formula, int) else f"={formula}"
            _row(page, 2 + k, name, value, formula=True)
        keys = ("failure", "samples_run", "results", "pools", "width", "preps", "lots")
        for k, key in enumerate(keys):
            at[key] = self._ref("Runs", f"B{2 + k}")
        self._groups(page, 11)

    def _pools(self) -> dict[int, list[SheetAssay]]:
        pools: dict[int, list[SheetAssay]] = {}
        for assay in self.sheet.assays:
            if assay.pool:
                pools.setdefault(assay.pool, []).append(assay)
        return dict(sorted(pools.items()))

    def _groups(self, page: "Worksheet", top: int) -> None:
        at = self.at
        _row(page, top - 1, "group of runs", "pools", "samples in a run", "runs",
             "controls", "fullest pool (slots)")  # fmt: skip
        pools = self._pools()
        everywhere = sum(a.slots for a in self.sheet.assays if not a.pool)
        numbers = list(pools)
        start = 0
        self.group_of: dict[int, int] = {}
        for k, size in enumerate(self.sheet.groups):
            row = top + k
            own = numbers[start : start + size]
            start += size
            self.group_of |= dict.fromkeys(own, row)
            fullest = max(sum(a.slots for a in pools[p]) for p in own) + everywhere
            c0, c1 = at["controls_per_run"], at["controls_per_pool"]
            days = at["deliveries"]
            part, more = (
                f"INT({at['samples_run']}/{days})",
                f"MOD({at['samples_run']},{days})",
            )
            runs = (
                f"={more}*ROUNDUP(({part}+1)/C{row},0)"
                f"+({days}-{more})*ROUNDUP({part}/C{row},0)"
            )
            _row(
                page, row, k + 1, size,
                f"=INT(({at['width']}-{c0}-{c1}*B{row})/({at['replicates']}*B{row}))",
                runs, f"=D{row}*({c0}+{c1}*B{row})", fullest, formula=True,
            )  # fmt: skip
        self.group_rows = (top, top + max(len(self.sheet.groups), 1) - 1)
        self._pool_prices(page, self.group_rows[1] + 3, everywhere)

    def _pool_prices(self, page: "Worksheet", top: int, everywhere: int) -> None:
        _row(page, top - 1, "pool", "slots", "runs of its group", "price of a position",
             "filled positions", "cost of positions")  # fmt: skip
        at = self.at
        row = top
        for pool, assays in self._pools().items():
            group = self.group_of[pool]
            slots = sum(a.slots for a in assays) + everywhere
            wells = f"{at['replicates']}*{at['samples_run']}"
            filled = f"={wells}+{at['controls_per_pool']}*C{row}"
            _row(page, row, pool, slots, f"=D{group}", f"={self._tier(f'B{row}')}",
                 filled, f"=D{row}*E{row}", formula=True)  # fmt: skip
            row += 1
        for group in range(
            self.group_rows[0], self.group_rows[0] + len(self.sheet.groups)
        ):
            price = self._tier(f"F{group}")
            filled = f"={at['controls_per_run']}*D{group}"
            _row(page, row, "controls of runs", None, f"=D{group}", f"={price}",
                 filled, f"=D{row}*E{row}", formula=True)  # fmt: skip
            row += 1
        self.pool_rows = (top, row - 1)

    def _tier(self, slots: str) -> str:
        tiers = self.sheet.position_tiers
        if len(tiers) == 1:
            return self.at[f"tier {tiers[0][0]}"]
        text = self.at[f"tier {tiers[-1][0]}"]
        for edge, _price in reversed(tiers[:-1]):
            text = f"IF({slots}<={edge},{self.at[f'tier {edge}']},{text})"
        return text

    def _assays(self) -> None:
        page, at = self.pages["Assays"], self.at
        _row(page, 1, "assay", "role", "pool", "development", "price of a reaction",
             "pack", "price of a pack", "tiers", "reactions in a lot", "lots",
             "reagents of a lot", "reagents", "chance to pass", "note")  # fmt: skip
        r, run, lots = at["replicates"], at["samples_run"], at["lots"]
        for k, assay in enumerate(self.sheet.assays):
            row = self.first + k
            if assay.pool:
                runs = self._ref("Runs", f"D{self.group_of[assay.pool]}")
                wells = f"{r}*{run}+{at['controls_per_pool']}*{runs}"
            else:
                low, high = self.group_rows
                sizes, runs = (self._span("Runs", c, low, high) for c in "BD")
                wells = (
                    f"{r}*{run}*{at['pools']}+{at['controls_per_pool']}"
                    f"*SUMPRODUCT({sizes},{runs})"
                )
            bought = self._ceil(f"(1+{at['overage']})*({wells})")
            tiers = "; ".join(f"{q}: {p}" for q, p in assay.tiers)
            _row(
                page, row, assay.name, assay.role, assay.pool or "all", assay.dev,
                assay.test, assay.pack, assay.pack_price, tiers or None,
                f"={self._ceil(bought + '/' + lots)}", f"={lots}",
                f"={_buy(assay, row)}", f"=J{row}*K{row}", 1 - assay.fail_rate,
                "" if _is_quoted(assay) else "no complete quote: counted as 0 here",
                formula=True,
            )  # fmt: skip

    def _cost(self) -> None:
        page, at = self.pages["Cost"], self.at
        code, digits = self.cost.currency, self.sheet.digits
        _row(page, 1, f"{self.sheet.name}: {self.cost.platform}", code, "as computed")
        formulas = self._line_formulas() if self.sheet.assays else {}
        row = 2
        for line in self.cost.lines:
            text = formulas.get(line.name)
            value: object = line.amount
            if text is not None:
                value = f"=ROUND(ROUND({text},{digits + 6}),{digits})"
            _row(page, row, LINE_WORDS.get(line.name, line.name), value, line.amount,
                 formula=True)  # fmt: skip
            row += 1
        _row(page, row, "total", f"=SUM(B2:B{row - 1})", self.cost.total, formula=True)
        total = f"B{row}"
        results = at["results"] if self.sheet.assays else str(float(self.cost.results))
        _row(page, row + 1, "per result", f"=ROUND({total}/{results},{digits})",
             self.cost.cost_per_result, formula=True)  # fmt: skip
        _row(page, row + 3, AS_COMPUTED)
        _row(page, row + 4, RESEARCH_USE)

    def _line_formulas(self) -> dict[str, str]:
        at = self.at
        first, last = self.first, self.last
        low, high = self.pool_rows
        runs = self._span("Runs", "D", *self.group_rows)
        return {
            "collection": f"{at['samples']}*{at['collection_cost']}",
            "setup": f"{at['setup']}+{at['pools']}*{at['pool_setup']}",
            "development": f"SUM({self._span('Assays', 'D', first, last)})",
            "runs": f"SUM({runs})*{at['run_cost']}",
            "samples": f"{at['samples_run']}*({at['sample_cost']}"
            f"+{at['preps']}*{at['prep_cost']})",
            "positions": f"(1+{at['overage']})"
            f"*SUM({self._span('Runs', 'F', low, high)})",
            "assays": f"SUM({self._span('Assays', 'L', first, last)})",
            "lots": f"({at['lots']}-1)*{at['lot_cost']}",
        }


def _is_quoted(assay: SheetAssay) -> bool:
    priced = assay.test is not None or assay.pack is not None or bool(assay.tiers)
    return priced and assay.dev is not None


def _buy(assay: SheetAssay, row: int) -> str:
    """Return the formula of what the reactions of one lot cost."""
    need = f"I{row}"
    if assay.tiers and assay.incremental:
        ends = [quantity - 1 for quantity, _ in assay.tiers[1:]]
        parts = [
            f"MAX(0,MIN({need},{end})-{start}+1)*{price}"
            for (start, price), end in zip(assay.tiers, ends, strict=False)
        ]
        start, price = assay.tiers[-1]
        return "+".join([*parts, f"MAX(0,{need}-{start}+1)*{price}"])
    if assay.tiers:
        options = [f"MAX({need},{quantity})*{price}" for quantity, price in assay.tiers]
        return f"MIN({','.join(options)})"
    if assay.pack is not None:
        return f"ROUNDUP({need}/F{row},0)*G{row}"
    return f"{need}*E{row}" if assay.test is not None else "0"


def _row(page: "Worksheet", row: int, *values: object, formula: bool = False) -> None:
    """Write one row; text of the data never becomes a formula."""
    for column, value in enumerate(values, start=1):
        if value is None:
            continue
        cell: Any = page.cell(row=row, column=column)
        cell.value = float(value) if isinstance(value, Decimal) else value
        own = formula and column > 1
        if (
            isinstance(value, str)
            and value[:1] in "=+-@"
            and not (own and value.startswith("="))
        ):
            cell.data_type = "s"
            cell.quotePrefix = True


def _look(page: "Worksheet") -> None:
    from openpyxl.styles import Font

    for cell in page[1]:
        cell.font = Font(bold=True)
    page.freeze_panes = "A2"
    for letter, width in (("A", 34), *((c, 18) for c in "BCDEFGHIJKLMN")):
        page.column_dimensions[letter].width = width
    for rows in page.iter_rows(min_row=2, min_col=2):
        for cell in rows:
            if isinstance(cell.value, float | str):
                cell.number_format = "#,##0.00##"
