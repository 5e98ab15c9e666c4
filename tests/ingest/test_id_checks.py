"""Ids that spreadsheets and typists spoil.

What is checked is common practice; the kinds of spoilt gene names are those of Zeeberg
et al. 2004, BMC Bioinformatics 5:80, and Ziemann et al. 2016, Genome Biology 17:177.
"""

import pytest

from panelkit.ingest.id_checks import check_ids

GENES = ["TP53", "BRCA1", "MARCH1", "SEPT2", "DEC1", "OCT4", "ABL1", "7SK", "1-8D"]


def found(samples, features, code):
    return [item for item in check_ids(samples, features) if item.code == code]


def test_clean_ids_have_no_finding():
    assert check_ids(["S1", "S2", "10"], GENES) == []


@pytest.mark.parametrize(
    "name",
    ["1-Mar", "2-Sep", "Sep-02", "DEC-1", "1-Mar-2021", "2021-03-01", "03/01/2021",
     "1.Mar", "44256", "2021-03-01 00:00:00"],
)  # fmt: skip
def test_dates_among_gene_names(name):
    # serial numbers count as dates only where few ids are numbers
    [finding] = found(["S1"], [*GENES, *"ABCDEFGHIJKL", name], "feature-names-dates")
    assert finding.severity == "warning"
    assert finding.message.endswith(f"spreadsheet made of a name: {name!r}")
    assert "SEPT2" in finding.next_step


def test_numbers_that_are_the_ids_are_no_dates():
    assert not found(
        ["S1"], [str(n) for n in range(44000, 44300)], "feature-names-dates"
    )


def test_ids_turned_into_powers_of_ten():
    [finding] = found(["S1"], [*GENES, "2.31E+19"], "feature-names-powers")
    assert "'2.31E+19'" in finding.message


@pytest.mark.parametrize("pair", [("p1", "P1"), ("a b", "ab"), ("007", "7")])
def test_ids_that_differ_by_case_blanks_or_zeros(pair):
    [finding] = found(pair, ["G"], "ids-nearly-equal")
    assert finding.where == "sample ids"
    assert "2 ids differ" in finding.message


@pytest.mark.parametrize("name", [" S1", "S1 ", "S1\u00a0", "S\u200b1"])
def test_blanks_around_ids_and_marks_that_cannot_be_seen(name):
    [finding] = found([name, "S2"], ["G"], "ids-with-blanks")
    assert finding.severity == "warning"


def test_blanks_inside_and_leading_zeros_are_information():
    [inner] = found(["S 1"], ["G"], "ids-with-inner-blanks")
    [zeros] = found(["0012", "13", "0"], ["G"], "ids-with-leading-zeros")
    assert inner.severity == zeros.severity == "info"
    assert zeros.message.startswith("1 id is a number that begins with a zero")


def test_at_most_five_ids_are_named():
    [finding] = found([f"0{n}" for n in range(10, 52)], ["G"], "ids-with-leading-zeros")
    assert finding.message.endswith("'014' and 37 more")
