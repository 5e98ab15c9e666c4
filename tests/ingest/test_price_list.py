"""Reading a price list: what is kept exactly, what is refused and where."""

from datetime import date
from decimal import Decimal

import pytest

from panelkit.errors import InputDataError, UsageError
from panelkit.ingest.price_list import read_price_list
from panelkit.records.prices import PRICE_COLUMNS

HEADER = ",".join(PRICE_COLUMNS)


@pytest.fixture
def write(tmp_path):
    def write_text(text):
        path = tmp_path / "prices.csv"
        path.write_text(text, encoding="utf-8")
        return path

    return write_text


LIST = """\
marker,platform,role,status,dev,test,pack,pack_price,tiers,slots,class,fail_rate,quote_date
m2,pcr,,ok,350,0.0375,,,,,,,2025-01-15
m1,pcr,marker,,,,96,180.50,,2,polar,0.005,2025-01-15

*,pcr,marker,unknown,400,0.50,,,,,,,2024-01-15
ref,pcr,reference,ok,150,0,,,,,,,2024-01-14
m1,ms,marker,no,,,,,1:2.00;500:1.60,,,,
"""


def test_cells_are_exact(write):
    prices = read_price_list(write(LIST))
    first, second, *_, last = prices.rows
    assert first.test == Decimal("0.0375")
    assert (first.role, first.status, first.slots) == ("marker", "ok", 1)
    assert first.quote_date == date(2025, 1, 15)
    assert (second.pack, second.pack_price) == (96, Decimal("180.50"))
    assert (second.slots, second.pool_class) == (2, "polar")
    assert second.fail_rate == Decimal("0.005")
    assert second.status == "unknown"
    assert second.is_missing_quote  # no dev
    assert last.tiers == ((1, Decimal("2.00")), (500, Decimal("1.60")))
    assert prices.platforms == ("pcr", "ms")


def test_assays_of_a_panel(write):
    prices = read_price_list(write(LIST))
    assays = prices.for_panel(["m1", "m9", "m2"], "pcr")
    # File order, then markers at the price for any marker, then references.
    assert [assay.marker for assay in assays] == ["m2", "m1", "m9", "ref"]
    assert (assays[2].dev, assays[2].test) == (400, Decimal("0.50"))
    (without,) = prices.for_panel(["m9"], "ms")
    assert without.is_missing_quote
    assert without.platform == "ms"
    assert [row.marker for row in prices.quotes("pcr")] == ["m2", "m1", "*", "ref"]


@pytest.mark.parametrize(
    ("markers", "platform", "code"),
    [
        (["m1"], "pcrr", "platform-unknown"),
        (["m1", "m1"], "pcr", "marker-repeated"),
        (["ref"], "pcr", "marker-is-reference"),
    ],
)
def test_panels_that_cannot_be_meant(write, markers, platform, code):
    prices = read_price_list(write(LIST))
    with pytest.raises(UsageError) as caught:
        prices.for_panel(markers, platform)
    assert (caught.value.code, caught.value.exit_code) == (code, 2)


def test_frame_reads_back(write, tmp_path):
    prices = read_price_list(write(LIST))
    path = tmp_path / "again.csv"
    prices.to_frame().to_csv(path, index=False)
    again = read_price_list(path)
    assert [row.as_row() for row in again.rows] == [row.as_row() for row in prices.rows]


def test_old_quotes_beside_the_newest_of_the_file(write):
    # Not beside today: a run must not depend on the day of running. One year to
    # the day is not old (the row for any marker), one day more is (ref).
    findings = read_price_list(write(LIST)).findings
    assert [(item.code, item.severity) for item in findings] == [
        ("quote-old", "warning")
    ]
    assert "ref" in findings[0].message
    assert findings[0].message.startswith("1 quotes")


def test_leap_day_has_a_day_a_year_before(write):
    text = "marker,platform,quote_date\na,p,2024-02-29\nb,p,2023-02-28\nc,p,2023-02-27"
    (found,) = read_price_list(write(text)).findings
    assert found.message.endswith(": c")


def test_tiers_that_do_not_fall_in_price(write):
    text = 'marker,platform,tiers\na,p,1:2;500:2\nb,p,"1:2;500:1"\n'
    (found,) = read_price_list(write(text)).findings
    assert found.code == "tier-price-not-falling"
    assert "line 2" in found.where


def test_byte_order_mark_and_quoted_cells(write):
    prices = read_price_list(write('\ufeffmarker,platform,note\n a ,p,"x, y"\n'))
    assert (prices.rows[0].marker, prices.rows[0].note) == ("a", "x, y")


@pytest.mark.parametrize(
    ("column", "cell", "code"),
    [
        ("marker", "", "marker-empty"),
        ("platform", "", "platform-empty"),
        ("role", "ref", "choice-unknown"),
        ("status", "yes", "choice-unknown"),
        ("dev", "-1", "amount-negative"),
        ("dev", "350 EUR", "number-unreadable"),
        ("test", "inf", "number-implausible"),
        ("test", "1e99999", "number-implausible"),
        ("slots", "0", "count-refused"),
        ("slots", "1.5", "count-refused"),
        ("fail_rate", "1", "rate-too-large"),
        ("fail_rate", "-0.1", "amount-negative"),
        ("concordance", "1.1", "correlation-too-large"),
        ("pack_price", "", "pack-incomplete"),
        ("tiers", "500:2;100:1", "tiers-not-rising"),
        ("tiers", "1:2;1:1", "tiers-not-rising"),
        ("tiers", "1=2", "tiers-unreadable"),
        ("tiers", "0:2", "count-refused"),
        ("tiers", "1:-2", "amount-negative"),
        ("tiers", "incremental", "tiers-not-rising"),
        ("tiers", "incremental;5:1", "tiers-start-late"),
        ("tiers", "1:2", "pack-with-tiers"),
        ("quote_date", "15.01.2025", "date-refused"),
    ],
)
def test_cells_that_are_refused(write, column, cell, code):
    packed = code in ("pack-incomplete", "pack-with-tiers")
    row = dict.fromkeys(PRICE_COLUMNS, "")
    row |= {"marker": "m1", "platform": "pcr"}
    row |= {"pack": "10", "pack_price": "5"} if packed else {}
    row |= {column: cell}
    empty = "," * (len(PRICE_COLUMNS) - 2)
    path = write(f"{HEADER}\nm0,pcr{empty}\n{','.join(row.values())}\n")
    with pytest.raises(InputDataError) as caught:
        read_price_list(path)
    assert (caught.value.code, caught.value.exit_code) == (code, 3)
    assert caught.value.where == f"{path}, line 3, column '{column}'"


@pytest.mark.parametrize(
    ("text", "code", "part"),
    [
        ("", "column-missing", "marker"),
        ("marker;platform\n", "column-missing", "line 1"),
        ("marker,test\na,1\n", "column-missing", "platform"),
        ("marker,platform,marker\n", "column-repeated", "'marker'"),
        ("marker,platform,fail_rat\n", "column-unknown", "'fail_rate' is meant"),
        ("marker,platform\n", "price-list-empty", "header"),
        ("marker,platform,dev\na,p,1,50\n", "cells-miscounted", "line 2"),
        ('marker,platform\na,"p\n', "csv-unreadable", "line 2"),
        ("marker,platform\na,p\nb,p\na,p\n", "price-repeated", "first on line 2"),
        ("marker,platform,role\n*,p,reference\n", "reference-unnamed", "line 2"),
    ],
)
def test_files_that_are_refused(write, text, code, part):
    with pytest.raises(InputDataError) as caught:
        read_price_list(write(text))
    assert caught.value.code == code
    assert part in str(caught.value)


def test_a_missing_file_is_refused(tmp_path):
    with pytest.raises(InputDataError) as caught:
        read_price_list(tmp_path / "none.csv")
    assert caught.value.code == "file-unreadable"
