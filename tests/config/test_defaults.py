"""One default, four places that show it: values, sections, study file, signatures."""

import inspect
import re
import tomllib
from dataclasses import asdict, fields
from decimal import Decimal
from itertools import pairwise

import pytest

from panelkit import fit_paths, read_cohort
from panelkit.config import (
    ACCURACY,
    CHOICE,
    COHORT,
    DESIGN,
    ENGINE,
    PANELS,
    PLATFORM,
    PREPARATION,
    PROGRAMME,
    SEED,
    SHORTLIST,
    TEMPLATE_SECTIONS,
    PlatformSection,
    read_study,
    study_text,
)
from panelkit.costing import Procedure
from panelkit.preparation import Recipe
from panelkit.stability import ShortlistRules

HOMES = {
    "cohort": COHORT,
    "design": DESIGN,
    "preparation": PREPARATION,
    "shortlist": SHORTLIST,
    "panels": PANELS,
    "accuracy": ACCURACY,
    "programme": PROGRAMME,
}
SECTIONS = {**TEMPLATE_SECTIONS, "platform": PlatformSection}
KEY_LINE = re.compile(r"^(?:# )?(\w+) =(?:    # none unless given|(?: (.+))?)$")


def section_defaults(section):
    return {
        key: made.get_default(call_default_factory=True)
        for key, made in SECTIONS[section].model_fields.items()
        if not made.is_required()
    }


@pytest.mark.parametrize("section", [*HOMES, "platform"])
def test_sections_take_their_defaults_from_one_home(section):
    home = asdict(HOMES.get(section, PLATFORM))
    shown = section_defaults(section)
    assert set(home) <= set(shown)
    assert {key: shown[key] for key in home} == home


@pytest.mark.parametrize("section", [*HOMES, "platform"])
def test_a_default_of_a_section_has_a_home(section):
    """Only nothing and emptiness may be written in a section itself."""
    home = asdict(HOMES.get(section, PLATFORM))
    elsewhere = {
        key: value
        for key, value in section_defaults(section).items()
        if key not in home and value not in (None, "", (), {})
    }
    assert elsewhere == {}


def test_the_rule_has_one_home(study):
    assert study().choice.rule == CHOICE.rule
    assert study().seed == SEED


def test_defaults_are_accepted_where_they_are_defaults():
    """Pydantic does not check defaults: one out of bounds would pass in silence."""
    for name, kind in SECTIONS.items():
        values = {
            key: value
            for key, value in section_defaults(name).items()
            if value is not None and value != {}
        }
        least = {
            "cohort": {"expression": "e.csv"},
            "programme": {"currency": "EUR", "samples": 10},
            "platform": {"positions": 96},
        }.get(name, {})
        listed = {k: list(v) if isinstance(v, tuple) else v for k, v in values.items()}
        section = kind.model_validate({**listed, **least})
        assert {key: getattr(section, key) for key in values} == values


def key_lines():
    """Return the lines of the commented study file that hold a key, by section."""
    section, found = "", {}
    for line in study_text({}, None, SEED).splitlines():
        if head := re.match(r"^(?:# )?\[(\w+)\]$", line):
            section = head.group(1)
        elif (key := KEY_LINE.match(line)) and section:
            found.setdefault(section, []).append((key.group(1), key.group(2)))
    return found


def test_every_key_stands_in_the_study_file_once():
    shown = {name: [key for key, _value in keys] for name, keys in key_lines().items()}
    assert shown == {
        name: list(kind.model_fields) for name, kind in TEMPLATE_SECTIONS.items()
    }


def test_the_commented_lines_are_toml_and_the_defaults(tmp_path):
    """Each `# key = value` without its mark, the rest of the file as it stands."""
    lines = []
    for line in study_text({}, None, SEED).splitlines():
        key = KEY_LINE.match(line)
        if key and not key.group(2):
            continue  # needed, or nothing unless given
        lines.append(line.removeprefix("# ") if key else line)
    text = "\n".join(lines).replace("# [programme]", "[programme]")
    tables = tomllib.loads(text, parse_float=Decimal)
    assert tables.pop("seed") == SEED
    assert set(tables) == set(TEMPLATE_SECTIONS)
    for name, table in tables.items():
        expected = {
            key: list(value) if isinstance(value, tuple) else value
            for key, value in section_defaults(name).items()
            if value is not None
        }
        assert {k: number(v) for k, v in table.items()} == {
            key: number(value) for key, value in expected.items()
        }


def number(value):
    """Return numbers as they are written: the file says 0 where the section has 0.0."""
    numeric = isinstance(value, int | float | Decimal) and not isinstance(value, bool)
    return Decimal(str(value)) if numeric else value


def test_uncommented_it_reads_as_the_defaults(tmp_path):
    text = study_text({"cohort": {"expression": "e.csv"}})
    bare, full = tmp_path / "bare.toml", tmp_path / "full.toml"
    bare.write_text('[cohort]\nexpression = "e.csv"\n')
    programme = text.index("# [programme]")
    full.write_text(
        re.sub(r"^# (\w+ = (?!   #).+)$", r"\1", text[:programme], flags=re.MULTILINE)
    )
    assert full.read_text().count("\nfolds = 5\n") == 1
    assert read_study(full).effective() == read_study(bare).effective()


def test_every_key_is_explained():
    """A key without a word in its section's docstring has none in the study file."""
    text = study_text({})
    lines = text.splitlines()
    unexplained = [
        line
        for before, line in pairwise(lines)
        if KEY_LINE.match(line) and not before.startswith("#   ")
    ]
    assert unexplained == []


def default_of(function, name):
    return inspect.signature(function).parameters[name].default


def test_signatures_take_the_same_defaults():
    assert default_of(fit_paths, "n_penalties") == ENGINE.n_penalties
    assert default_of(fit_paths, "tol") == ENGINE.tol
    assert default_of(read_cohort, "orientation") == COHORT.orientation
    assert default_of(read_cohort, "max_bad_cells") == COHORT.max_bad_cells
    assert default_of(read_cohort, "design") == DESIGN.kind
    assert default_of(Procedure, "ridge_penalties") == ENGINE.ridge_penalties
    for key in ("log2_offset", "max_missing_share"):
        assert default_of(Recipe, key) == getattr(PREPARATION, key)


def test_shortlist_rules_are_the_section():
    """Each rule with its default; the section adds what draws and forces."""
    shown = section_defaults("shortlist")
    rules = {each.name: each.default for each in fields(ShortlistRules)}
    assert set(shown) - set(rules) == {
        "subsamples",
        "always",
        "never",
        "candidates_on",
        "precision",
        "shuffles",
        "stratify_by_site",
    }
    assert rules == {key: shown[key] for key in rules}


def test_pooled_defaults_are_of_plain_types():
    """A signature that shows an object would show its address."""
    for home in (*HOMES.values(), CHOICE, ENGINE, PLATFORM):
        for value in asdict(home).values():
            assert isinstance(value, bool | int | float | str | tuple | Decimal)
