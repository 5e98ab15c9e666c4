"""Every error says where, what, what is accepted and what next; no other is raised."""

import ast
import re

import pytest

from panelkit import errors

PARTS = {"code", "where", "what", "accepted", "next_step"}
KINDS = {name for name in errors.__all__ if name != "name_some"}
WORD_CODE = re.compile(r"(?:[a-z]+|log2)(?:-(?:[a-z]+|log2))*")  # log2 is a step's name
CODE_FROM_ELSEWHERE = {
    "workflow/cohort.py": "a run is refused under the code of its `stop` finding",
}
CODE_IN_A_VARIABLE = {"fits/arguments.py"}
CAUGHT_AS_AN_ANSWER = {
    ("costing/learning_curve.py", "FitError"): "a share of the people is too few to "
    "learn from: the curve starts later",
    ("costing/panel_prices.py", "InputDataError"): "a marker without a quote has no "
    "price of its own",
    ("costing/panel_prices.py", "UsageError"): "a reference is no panel",
    ("costing/panel_prices.py", "NoPanelError"): "one of several platforms cannot run "
    "the panel",
    ("costing/pricing.py", "NoPanelError"): "kits may run what single assays cannot",
    ("costing/pricing.py", "InputDataError"): "kits need no quote of single assays",
    ("fits/budget.py", "FitError"): "separable data: no solution without a penalty",
}
BUILTIN_RAISED = {
    ("__init__.py", "AttributeError"): "PEP 562: what a module's __getattr__ owes",
    ("stability/__init__.py", "AttributeError"): "PEP 562, as above",
    ("stability/sklearn_selector.py", "ValueError"): "scikit-learn's way of refusing "
    "input; its checks of estimators want no other",
    ("config/kits.py", "ValueError"): "pydantic's way of refusing inside a validator",
    ("config/study.py", "ValueError"): "pydantic's way of refusing inside a validator",
}


def called(node):
    """Return the name that a call calls, or None."""
    plain = isinstance(node, ast.Call) and isinstance(node.func, ast.Name)
    return node.func.id if plain else None


def nodes(sources, kind):
    for source in sources.values():
        for node in ast.walk(source.tree):
            if isinstance(node, kind):
                yield source, node


@pytest.fixture(scope="module")
def made(sources):
    """Every place where an error of ours is made, with its keywords."""
    return [
        (source, node, {each.arg: each.value for each in node.keywords})
        for source, node in nodes(sources, ast.Call)
        if called(node) in KINDS
    ]


def last_text(node):
    """Return the literal text at the end of a string or formatted string."""
    if isinstance(node, ast.JoinedStr):
        node = node.values[-1]
    return node.value if isinstance(node, ast.Constant) else ""


def first_text(node):
    if isinstance(node, ast.JoinedStr):
        node = node.values[0]
    return node.value if isinstance(node, ast.Constant) else ""


def test_every_error_gives_all_its_parts_by_name(made):
    assert len(made) > 100  # an empty walk would pass
    wrong = [
        f"{source.place}:{node.lineno}"
        for source, node, parts in made
        if node.args or set(parts) != PARTS
    ]
    assert wrong == []


def test_every_code_is_a_literal_of_words(made):
    loose = {
        source.place
        for source, _node, parts in made
        if not isinstance(parts["code"], ast.Constant)
    }
    assert loose - CODE_IN_A_VARIABLE == set(CODE_FROM_ELSEWHERE)
    wrong = [
        parts["code"].value
        for _source, _node, parts in made
        if isinstance(parts["code"], ast.Constant)
        and not WORD_CODE.fullmatch(parts["code"].value)
    ]
    assert wrong == []


@pytest.mark.parametrize("place", sorted(CODE_IN_A_VARIABLE))
def test_files_whose_codes_cannot_be_searched_for(made, place):
    codes = [parts["code"] for source, _, parts in made if source.place == place]
    assert all(isinstance(code, ast.Constant) for code in codes)


def test_parts_leave_the_stops_to_the_sentence(made):
    """The message adds ";", "." and "." itself: a part with its own would double it."""
    wrong = [
        f"{source.place}:{node.lineno}, {name}"
        for source, node, parts in made
        for name in sorted(PARTS - {"code"})
        if last_text(parts[name]).rstrip().endswith((".", ";", ":", "!"))
    ]
    assert wrong == []


def test_next_steps_begin_a_sentence(made):
    wrong = [
        f"{source.place}:{node.lineno}"
        for source, node, parts in made
        if (text := first_text(parts["next_step"])) and not text[0].isupper()
    ]
    assert wrong == []


def raised_kind(source, node):
    """Return the class that a raise statement raises, by name.

    A private function of the same file may make the error; then its return
    annotation says which.
    """
    name = called(node.exc) or ast.unparse(node.exc)
    for function in ast.walk(source.tree):
        if isinstance(function, ast.FunctionDef) and function.name == name:
            return ast.unparse(function.returns) if function.returns else name
    return name


def test_nothing_but_errors_of_ours_is_raised(sources):
    found = {
        (source.place, kind)
        for source, node in nodes(sources, ast.Raise)
        if node.exc is not None and (kind := raised_kind(source, node)) not in KINDS
    }
    assert found == set(BUILTIN_RAISED)


def test_no_handler_catches_everything(sources):
    """A bare except hides the cause; `Exception` hides bugs of ours."""
    wrong = [
        f"{source.place}:{node.lineno}"
        for source, node in nodes(sources, ast.ExceptHandler)
        if node.type is None
        or {"Exception", "BaseException"} & set(ast.unparse(node.type).split(", "))
    ]
    assert wrong == []


def test_only_the_command_line_catches_our_errors(sources):
    """Elsewhere an error may be caught where it is an answer, and only by its kind."""
    found = {
        (source.place, name)
        for source, node in nodes(sources, ast.ExceptHandler)
        for name in KINDS & set(re.findall(r"\w+", ast.unparse(node.type or node)))
    }
    assert ("cli/app.py", "PanelkitError") in found
    assert found - {("cli/app.py", "PanelkitError")} <= set(CAUGHT_AS_AN_ANSWER)


def test_only_the_command_line_prints(sources):
    """Standard streams, print and warnings: a library that talks cannot be piped."""
    wrong = []
    for source in sources.values():
        if source.package == "cli":
            continue
        for node in ast.walk(source.tree):
            text = ast.unparse(node) if isinstance(node, ast.Attribute) else ""
            if called(node) == "print" or text in (
                "sys.stdout",
                "sys.stderr",
                "warnings.warn",
                "click.echo",
            ):
                wrong.append(f"{source.place}:{node.lineno}")
    assert wrong == []
