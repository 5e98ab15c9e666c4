"""The spreadsheet's formulas against the priced panel, computed by another program."""

import io
from decimal import Decimal

import formulas
import openpyxl
import pytest

from panelkit.report import price_workbook
from panelkit.workflow import PriceRequest, PriceSource, price_panels

PROGRAMME = """[programme]
currency = "{currency}"
samples = 333
horizon_months = 18
deliveries = 4
repeat_rate = 0.04
repeat_mode = "{mode}"
collection_cost = 1.25
[platform.p]
positions = 96
plex = {plex}
replicates = 2
controls_per_pool = 3
controls_per_run = 2
groups = {groups}
refs_scope = "{scope}"
setup = 2000
pool_setup = 150.50
run_cost = 35.10
position_cost = {position}
sample_cost = 18.37
prep_positions = 5
prep_cost = 6.01
overage = 0.10
lot_months = 7
lot_cost = 250
{budget}
"""
PRICES = """marker,platform,role,status,dev,test,pack,pack_price,tiers,fail_rate
A,p,marker,ok,350,0.1875,,,,0.005
B,p,marker,ok,350,,500,99.95,,
C,p,marker,ok,350,,,,1:2.00;500:1.60;1000:1.30,0.01
D,p,marker,ok,350,,,,incremental;1:2.00;500:1.60;1000:1.30,
E,p,marker,ok,350,0.22,,,,
r1,p,reference,ok,150,0.18,,,,
r2,p,reference,ok,150,,700,50,,
"""
CASES = {
    "one by one": {"groups": '"each"'},
    "spread": {"groups": "2", "mode": "until"},
    "best spread, no repeats": {"mode": "none", "currency": "JPY"},
    "pools and tiers": {
        "plex": 3, "scope": "pool", "position": "[[2, 0.40], [3, 0.55]]", "groups": "2",
    },
    "run budget": {
        "plex": 4, "groups": "1", "budget": "run_budget = 300\nslot_budget = 1.5",
        "currency": "BHD",
    },
}  # fmt: skip


@pytest.fixture
def answer(tmp_path):
    def price(changes, *markers):
        keys = {
            "currency": "EUR", "mode": "once", "plex": 1, "groups": '"auto"',
            "scope": "panel", "position": "0.42", "budget": "",
        }  # fmt: skip
        file, listed = tmp_path / "programme.toml", tmp_path / "prices.csv"
        file.write_text(PROGRAMME.format(**(keys | changes)))
        listed.write_text(PRICES)
        source = PriceSource(file=file, prices=listed)
        return price_panels(PriceRequest(markers=markers, source=source))

    return price


def computed(content, path):
    """Return the values of all cells, by another program."""
    path.write_bytes(content)
    model = formulas.ExcelModel().loads(str(path)).finish()
    found = {}
    for key, value in model.calculate().items():
        name = str(key).replace("'", "").rpartition("]")[2]
        if ":" not in name:
            found[name] = value.value[0, 0]
    return found


@pytest.mark.parametrize("name", CASES)
def test_formulas_come_to_the_computed_total(answer, tmp_path, name):
    given = answer(CASES[name], "A", "B", "C", "D", "E")
    scenario = given.scenarios[0]
    content = price_workbook((scenario.sheet,))
    cells = computed(content, tmp_path / "cost.xlsx")
    page = openpyxl.load_workbook(io.BytesIO(content))["Cost"]
    names = [page.cell(row=row, column=1).value for row in range(2, 12)]
    last = 2 + names.index("total")
    for row in range(2, last + 2):
        assert str(page.cell(row=row, column=2).value).startswith("="), names[row - 2]
        expected = page.cell(row=row, column=3).value
        assert cells[f"COST!B{row}"] == pytest.approx(expected, abs=1e-9), names[
            row - 2
        ]
    assert Decimal(str(round(float(cells[f"COST!B{last}"]), 3))) == scenario.cost.total


def test_formulas_are_live(answer, tmp_path):
    """Another number of samples, typed into the sheet, gives its own total."""
    given = answer({"groups": "1"}, "A", "C")
    content = price_workbook((given.scenarios[0].sheet,))
    book = openpyxl.load_workbook(io.BytesIO(content))
    inputs = book["Inputs"]
    place = {inputs.cell(row=r, column=1).value: r for r in range(2, 40)}
    inputs.cell(row=place["samples"], column=2).value = 1200
    inputs.cell(row=place["run_cost"], column=2).value = 50
    changed = io.BytesIO()
    book.save(changed)
    cells = computed(changed.getvalue(), tmp_path / "changed.xlsx")
    source = PriceSource(
        file=tmp_path / "programme.toml",
        prices=tmp_path / "prices.csv",
        settings=(("samples", "1200"), ("run_cost", "50")),
    )
    there = price_panels(PriceRequest(markers=("A", "C"), source=source))
    totals = {round(float(v), 2) for k, v in cells.items() if k.startswith("COST!B")
              and not isinstance(v, str)}  # fmt: skip
    assert float(there.scenarios[0].cost.total) in totals


def test_names_never_become_formulas(answer, tmp_path):
    given = answer({}, "A")
    sheet = given.scenarios[0].sheet
    assays = openpyxl.load_workbook(io.BytesIO(price_workbook((sheet,))))["Assays"]
    assert assays["A2"].data_type == "s"
