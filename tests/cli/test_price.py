"""`panelkit price`: the README's own commands, wrong files, screens and files."""

import json
import re
import shlex
from pathlib import Path

import pytest

from panelkit.cli.app import main

REPOSITORY = Path(__file__).parents[2]
README = (REPOSITORY / "README.md").read_text(encoding="utf-8")
SECTION = README.partition("## Ten planner questions")[2].partition("\n## ")[0]
COMMANDS = re.findall(r"```sh\n(panelkit price .*)\n```", SECTION)
FOUR = ["8", "--family", "rt-qpcr", "--samples", "500", "--currency", "EUR",
        "--reaction", "0.60"]  # fmt: skip


@pytest.fixture
def price(capsys, monkeypatch):
    """Run `panelkit price` in process; return exit code, output and errors."""
    monkeypatch.chdir(REPOSITORY)

    def run(*arguments):
        with pytest.raises(SystemExit) as left:
            main(["price", *map(str, arguments)])
        out, err = capsys.readouterr()
        return left.value.code, out, err

    return run


@pytest.fixture
def asked(price):
    """Return the JSON of a question of the README, by its number."""

    def run(number, *more):
        words = shlex.split(COMMANDS[number])[2:]
        code, out, err = price(*words, *more, "--json")
        assert (code, err) == (0, "")
        return json.loads(out)

    return run


def test_the_readme_asks_ten_questions():
    assert len(COMMANDS) == 11
    assert [n for n in range(1, 11) if f"**{n}. " not in SECTION] == []


def test_four_inputs_are_enough(asked):
    # By hand: rt-qpcr spreads 11 assays over plates of 384; 520 runs in duplicate,
    # 2 controls on each of 3 plates: ceil(1.1 x 1,046) = 1,151 reactions at 0.60
    answer = asked(0)
    cost = answer["scenarios"]["A"]["platforms"]["rt-qpcr"]
    assert cost["runs"] == 33
    assert cost["total"] == f"{11 * 1151 * 0.60:.2f}"
    sources = {a["key"]: a["source"] for a in answer["scenarios"]["A"]["assumptions"]}
    assert sources["rt-qpcr.positions"] == "preset of rt-qpcr"
    assert sources["currency"] == "given"
    assert sources["deliveries"] == "default"
    assert sources["development of a marker"] == "assumed"
    assert sources["reference assays"] == "usual for rt-qpcr"


def test_question_1_fewer_markers(asked):
    saved = asked(1)["saved"]
    assert (saved["per_year"], saved["total"]) == ("14956.80", "16356.80")
    assert (saved["samples"], saved["runs"]) == ("0.00", "2100.00")


def test_question_2_next_step_down(asked):
    scenario = asked(2)["scenarios"]["A"]
    down = scenario["step_down"]
    assert (down["remove"], down["saving"]) == (2, "7732.00")
    assert down["saves"] == "1 pool, 8 runs"
    assert scenario["stairs"][12]["marginal"] == "6296.00"
    assert {each["saving"] for each in scenario["drivers"]} == {"1436.00"}


def test_question_3_break_even(asked):
    found = asked(3)["break_even"]
    assert (found["first"], found["stays_from"]) == (541, 613)
    changes = [(each["samples"], each["cheaper"]) for each in found["crossings"]]
    assert changes == [(541, "B"), (571, "A"), (577, "B"), (609, "A"), (613, "B")]


def test_question_4_missing_quote(asked):
    answer = asked(4)
    assert answer["ranking"].startswith("Needs a quote")
    (question,) = answer["missing_quotes"]
    assert (question["marker"], question["break_even_price"]) == ("m07", "0.340000")
    cost = answer["scenarios"]["A"]["platforms"]["qpcr"]
    assert (cost["total"], cost["total_high"]) == ("4488.87", "5050.95")


def test_question_5_spares(asked):
    spares = asked(5)["spares"]
    assert set(spares["spares"]) == {"s01", "s02", "s05"}
    assert (spares["order"], spares["enough"], spares["proved"]) == (11, True, True)
    assert round(spares["reached_without"], 6) == round(0.85**8, 6)
    assert (spares["spend"], spares["spend_one_by_one"]) == ("6850.00", "5661.98")


def test_question_6_cheapest_platform(asked):
    scenario = asked(6)["scenarios"]["A"]
    assert scenario["cheapest"] == "sixplex"
    # EX6's formulas at 700 samples
    totals = {name: cost["total"] for name, cost in scenario["platforms"].items()}
    assert totals == {
        "elisa": f"{1800 + 660 * 20 + 2800}.00",
        "sixplex": f"{6000 + 420 * 19 + 2800}.00",
    }
    assert list(scenario["split"]["parts"]) == ["sixplex"]
    assert scenario["split"]["proved"]


def test_question_7_kits(asked):
    cost = asked(7)["scenarios"]["A"]["platforms"]["blocks"]
    assert cost["total"] == "6500.00"
    assert [kit["kit"] for kit in cost["kits"]] == ["K2", "K3"]
    assert cost["proved"]


def test_question_8_deliveries(asked):
    found = asked(8)["variations"]
    assert [(v["value"], v["runs"], v["total"]) for v in found] == [
        ("1", 87, "51391.40"), ("4", 88, "51461.06"), ("12", 96, "52028.13"),
        ("52", 104, "52590.33"),
    ]  # fmt: skip
    assert [round(100 * v["fill"], 1) for v in found] == [98.1, 97.2, 90.2, 84.4]


def test_question_9_growing_volume(asked):
    found = {v["value"]: v["cost_per_result"] for v in asked(9)["variations"]}
    assert found["2000"] == "46.50"
    assert found["200"] == "70.17"
    assert list(found.values()) == sorted(found.values(), key=float, reverse=True)


def test_question_10_payback(asked):
    assert asked(10)["payback"] == {"change_cost": "9000", "months": 8}


@pytest.mark.parametrize("number", range(11))
def test_figures_of_the_readme_are_on_the_screen(price, number):
    """What the README says in words is what the command shows."""
    said = SECTION.split("```sh")[number].rpartition("**")[2]
    code, out, _err = price(*shlex.split(COMMANDS[number])[2:])
    assert code == 0
    assert "For research and planning only" in out
    shown = [f for f in re.findall(r"\d[\d,]*\.\d\d", said) if number]
    derived = {"1,198.93"}  # 52,590.33 less 51,391.40
    missing = [figure for figure in shown if figure not in out]
    assert set(missing) <= derived


# --- what is refused ------------------------------------------------------------

PROGRAMME = """[programme]
currency = "EUR"
samples = 100
[platform.p]
positions = 96
"""
PRICES = "marker,platform,status,dev,test\nA,p,ok,1,1\nB,p,ok,1,1\n"


@pytest.mark.parametrize(
    ("programme", "prices", "code", "exit_code"),
    [
        (PROGRAMME.replace("EUR", "EURO"), PRICES, "currency-unknown", 2),
        (PROGRAMME.replace("100", "'many'"), PRICES, "amount-unreadable", 2),
        (PROGRAMME.replace("100", "-1"), PRICES, "value-refused", 2),
        (PROGRAMME + "replicates = 97\n", PRICES, "controls-leave-no-room", 2),
        (PROGRAMME + "controls_per_pool = 96\n", PRICES, "controls-leave-no-room", 2),
        (PROGRAMME + "run_price = 3\n", PRICES, "key-unknown", 2),
        (PROGRAMME + "run_cost = 'x'\n", PRICES, "amount-unreadable", 2),
        (PROGRAMME + "[[kit]]\nid = 'K'\n", PRICES, "key-missing", 2),
        ("[programme\n", PRICES, "toml-unreadable", 2),
        (PROGRAMME + "position_cost = [[5, 1], [2, 2]]\n", PRICES,
         "position-tiers-not-rising", 2),
        (PROGRAMME + "plex = 2\nposition_cost = [[1, 1]]\n", PRICES,
         "position-tiers-too-short", 2),
        (PROGRAMME, PRICES + "A,p,ok,2,2\n", "price-repeated", 3),
        (PROGRAMME, PRICES + "C,p,ok,-1,2\n", "amount-negative", 3),
        (PROGRAMME, PRICES + "C,p,ok,one,2\n", "number-unreadable", 3),
        (PROGRAMME, PRICES + 'C,p,ok,"1,50",2\n', "number-unreadable", 3),
        (PROGRAMME, PRICES + "C,p,maybe,1,2\n", "choice-unknown", 3),
        (PROGRAMME, PRICES + "C,p,ok,1\n", "cells-miscounted", 3),
        (PROGRAMME, PRICES.replace("dev", "price"), "column-unknown", 3),
        (PROGRAMME, "marker,platform,tiers\nA,p,500:1;1:2\n", "tiers-not-rising", 3),
        (PROGRAMME, "marker,platform\n", "price-list-empty", 3),
        (PROGRAMME, PRICES.replace("A,p,ok", "A,p,no"), "marker-cannot-be-assayed", 5),
        (PROGRAMME + "max_positions_per_sample = 1\n", PRICES,
         "sample-volume-exceeded", 5),
        (PROGRAMME, PRICES.replace("B,p,ok,1,1", "B,p,ok,1,"), "quotes-too-few", 3),
        (PROGRAMME, PRICES.replace(",p,", ",q,"), "platform-without-prices", 2),
    ],
)  # fmt: skip
def test_wrong_files_get_one_sentence(
    price, tmp_path, programme, prices, code, exit_code
):
    file, listed = tmp_path / "programme.toml", tmp_path / "prices.csv"
    file.write_text(programme)
    listed.write_text(prices)
    left, out, err = price("A", "B", "--from", file, "--prices", listed)
    assert (left, out) == (exit_code, "")
    assert f"({code})" in err
    assert len(err.strip().splitlines()) == 1
    assert "Traceback" not in err


def files(tmp_path, programme=PROGRAMME, prices=PRICES):
    file, listed = tmp_path / "programme.toml", tmp_path / "prices.csv"
    file.write_text(programme)
    listed.write_text(prices)
    return "--from", file, "--prices", listed


@pytest.mark.parametrize(
    ("arguments", "code", "exit_code"),
    [
        (["X", "Y"], "marker-not-sold", 2),
        (["A", "A"], "marker-repeated", 2),
        (["99"], "markers-too-few", 2),
        (["none.txt"], "marker-file-missing", 2),
        (["A", "--platform", "q"], "platform-unknown", 2),
        (["A", "--set", "colour=blue"], "setting-unknown", 2),
        (["A", "--set", "samples"], "setting-unreadable", 2),
        (["A", "--set", "samples=none"], "amount-unreadable", 2),
        (["A", "--break-even", "9"], "break-even-alone", 2),
        (["A", "--change-cost", "9"], "payback-alone", 2),
        (["A", "--against", "B", "--change-cost", "-1"], "amount-negative", 3),
        (["A", "--family", "elisa"], "price-inputs-contradict", 2),
        (["A", "--against", "B", "--against-set", "currency=USD"],
         "currencies-mixed", 2),
        (["A", "--land", "9", "--spares", "B"], "spares-refused", 2),
    ],
)  # fmt: skip
def test_wrong_questions_get_one_sentence(price, tmp_path, arguments, code, exit_code):
    left, out, err = price(*arguments, *files(tmp_path))
    assert (left, out) == (exit_code, "")
    assert f"({code})" in err
    assert len(err.strip().splitlines()) == 1


@pytest.mark.parametrize("missing", [1, 3, 5, 7])
def test_each_of_the_four_inputs_is_asked_for(price, missing):
    left, _out, err = price(*FOUR[:missing], *FOUR[missing + 2 :])
    assert left == 2
    assert f"missing {FOUR[missing]}" in err


def test_a_price_list_is_asked_for(price, tmp_path):
    left, _out, err = price("A", *files(tmp_path)[:2])
    assert (left, "price-list-missing" in err) == (2, True)


def test_markers_come_from_files(price, tmp_path):
    plain, table = tmp_path / "list.txt", tmp_path / "list.csv"
    plain.write_text("# my panel\nA\nB\n")
    table.write_text("rank,marker\n1,B\n2,A\n")
    for path, expected in ((plain, ["A", "B"]), (table, ["B", "A"])):
        code, out, _err = price(path, *files(tmp_path), "--json")
        assert code == 0
        assert json.loads(out)["scenarios"]["A"]["markers"] == expected
    table.write_text("rank,name\n1,B\n")
    left, _out, err = price(table, *files(tmp_path))
    assert (left, "marker-column-missing" in err) == (3, True)
    plain.write_text("\n")
    assert price(plain, *files(tmp_path))[0] == 3


def test_a_study_file_is_priced(price):
    code, out, err = price("QM00001,QM00002", "--from", "configs/quillmere.toml",
                           "--json")  # fmt: skip
    assert (code, err) == (0, "")
    answer = json.loads(out)
    assert set(answer["scenarios"]["A"]["platforms"]) == {"wells", "beads"}
    assert answer["samples"] == 1000


def test_conflicts_are_read(price, tmp_path):
    pairs = tmp_path / "conflicts.csv"
    pairs.write_text("marker_a,marker_b,scope\nA,B,panel\n")
    left, _out, err = price("A", "B", *files(tmp_path), "--conflicts", pairs)
    assert (left, "markers-exclude-each-other" in err) == (5, True)
    pairs.write_text("marker_a,marker_b\nA,B\nA,Z\n")
    given = files(tmp_path, PROGRAMME + "plex = 2\n")
    code, out, _err = price("A", "B", *given, "--conflicts", pairs, "--json")
    answer = json.loads(out)
    assert code == 0
    assert answer["scenarios"]["A"]["platforms"]["p"]["pools"] == 2
    assert "conflict-marker-unknown" in {f["code"] for f in answer["findings"]}


def test_files_are_written(price, tmp_path):
    out = tmp_path / "answer"
    code, shown, _err = price(*FOUR, "--out", out)
    assert code == 0
    names = {path.name for path in out.iterdir()}
    assert names == {"cost.xlsx", "price.json", "cost_lines.svg", "cost_lines.csv",
                     "cost_by_size_a.svg", "cost_by_size_a.csv", "cost_drivers_a.svg",
                     "cost_drivers_a.csv"}  # fmt: skip
    assert all(name in shown for name in names)
    first = {path.name: path.read_bytes() for path in out.iterdir()}
    price(*FOUR, "--out", out)
    again = {path.name: path.read_bytes() for path in out.iterdir()}
    first.pop("cost.xlsx"), again.pop("cost.xlsx")  # it holds the time of writing
    assert first == again


def test_kits_of_unknown_markers_are_noticed(price, tmp_path):
    kit = "[[kit]]\nid = 'K'\nmarkers = ['A', 'Z']\nunit_price = 9\n"
    kit += "tests_per_unit = 9\n"
    code, out, _err = price("A", *files(tmp_path, PROGRAMME + kit), "--json")
    assert code == 0
    found = {f["code"]: f["severity"] for f in json.loads(out)["findings"]}
    assert found["kit-marker-unknown"] == "warning"


def test_names_of_markers_never_become_markup_or_formulas(price, tmp_path):
    prices = 'marker,platform,status,dev,test\n"[bold]x",p,ok,1,1\n=1+1,p,ok,1,1\n'
    out = tmp_path / "answer"
    code, shown, _err = price("[bold]x", "=1+1", *files(tmp_path, prices=prices),
                              "--out", out)  # fmt: skip
    assert code == 0
    assert "[bold]x" in shown
    assert "'=1+1" in (out / "cost_drivers_a.csv").read_text()


def test_intervals_through_the_same_quotes_are_compared_at_common_values(price):
    """Both panels lack the same quote: the cheaper one is known all the same."""
    words = ["--from", "configs/planner/quotes.toml", "--prices",
             "configs/planner/prices.csv", "--json"]  # fmt: skip
    _code, out, _err = price("m01", "m02", "m07", "--against", "m03,m04,m07", *words)
    answer = json.loads(out)
    costs = [answer["scenarios"][s]["platforms"]["qpcr"] for s in "AB"]
    assert float(costs[0]["total_high"]) > float(costs[1]["total"])  # they overlap
    assert answer["ranking"].startswith("A is cheaper at the lowest")
    assert {q["break_even_price"] for q in answer["missing_quotes"]} == {None}


def test_a_far_away_panel_needs_no_quote(price):
    words = ["--from", "configs/planner/quotes.toml", "--prices",
             "configs/planner/prices.csv", "--json"]  # fmt: skip
    _code, out, _err = price("m07", "--against", "m01,m02,m03,m04,m05,m06", *words)
    answer = json.loads(out)
    assert answer["ranking"].startswith("A is cheaper, whatever the missing quotes")
    (question,) = answer["missing_quotes"]
    assert "any plausible price" in question["verdict"]
