"""Every public name says what it is, what comes out and what it refuses."""

import ast
import importlib
import inspect
import pkgutil
import textwrap

import pytest

import panelkit

PACKAGES = sorted(
    module.name for module in pkgutil.iter_modules(panelkit.__path__) if module.ispkg
)


SILENT = ("costing.Procedure.select",)


def public_names():
    for package in ("errors", *PACKAGES):
        module = importlib.import_module(f"panelkit.{package}")
        for name in getattr(module, "__all__", ()):
            yield f"{package}.{name}", getattr(module, name)


def public_functions():
    """Public functions, and the public methods that public classes write themselves."""
    for name, thing in public_names():
        if inspect.isfunction(thing):
            yield name, inspect.unwrap(thing)
        if inspect.isclass(thing):
            for key, value in vars(thing).items():
                function = getattr(value, "__func__", value)
                if inspect.isfunction(function) and not key.startswith("_"):
                    yield f"{name}.{key}", inspect.unwrap(function)


def own_nodes(function):
    """The nodes of a function's body, those of functions inside it left out."""
    tree = ast.parse(textwrap.dedent(inspect.getsource(function))).body[0]
    waiting = list(tree.body)
    while waiting:
        node = waiting.pop()
        yield node
        if not isinstance(node, ast.FunctionDef | ast.Lambda | ast.ClassDef):
            waiting.extend(ast.iter_child_nodes(node))


def gives_something(function):
    return any(
        isinstance(node, ast.Yield)
        or (
            isinstance(node, ast.Return)
            and not (node.value is None or ast.unparse(node.value) == "None")
        )
        for node in own_nodes(function)
    )


def raised(function):
    return {
        node.exc.func.id
        for node in own_nodes(function)
        if isinstance(node, ast.Raise)
        and isinstance(node.exc, ast.Call)
        and isinstance(node.exc.func, ast.Name)
        and not node.exc.func.id.startswith("_")
    }


def section(function, name):
    text = inspect.getdoc(function) or ""
    return text.partition(f"\n{name}\n{'-' * len(name)}\n")[2].partition("\n\n")[0]


@pytest.mark.parametrize("package", PACKAGES)
def test_a_package_says_what_it_is_and_what_it_hands_out(package):
    module = importlib.import_module(f"panelkit.{package}")
    assert module.__doc__
    names = list(getattr(module, "__all__", ()))
    assert len(names) == len(set(names))
    assert all(hasattr(module, name) for name in names)


def test_every_public_thing_has_a_docstring():
    things = {
        name: thing
        for name, thing in public_names()
        if inspect.isclass(thing) or inspect.isfunction(thing)
    }
    assert len(things) > 80
    # a dataclass without one is given its signature, which is no description
    made_up = {
        name
        for name, thing in things.items()
        if inspect.isclass(thing)
        and (thing.__doc__ or "").startswith(f"{thing.__name__}(")
    }
    assert made_up == set()
    assert [name for name, thing in things.items() if not thing.__doc__] == []
    assert [name for name, made in public_functions() if not made.__doc__] == []


def says_what_it_gives(function):
    """Whether a section Returns says it or, without Parameters, the first line."""
    if section(function, "Returns") or section(function, "Yields"):
        return True
    first = (function.__doc__ or "").startswith("Return ")
    return first and not section(function, "Parameters")


def test_every_public_function_says_what_it_gives():
    wrong = [
        name
        for name, function in public_functions()
        if name not in SILENT
        and gives_something(function)
        and not says_what_it_gives(function)
    ]
    assert wrong == []


@pytest.mark.parametrize("name", SILENT)
def test_public_functions_that_do_not_say_what_they_give(name):
    assert says_what_it_gives(dict(public_functions())[name])


def test_every_public_function_says_what_it_raises():
    wrong = [
        f"{name}: {kind}"
        for name, function in public_functions()
        for kind in sorted(raised(function))
        if kind not in section(function, "Raises")
    ]
    assert wrong == []


def test_every_parameter_is_described():
    """A section Parameters that forgets one is worse than none."""
    wrong = []
    for name, function in public_functions():
        described = section(function, "Parameters")
        if not described:
            continue
        heads = {
            word.strip().lstrip("*")
            for line in described.splitlines()
            if line and not line.startswith(" ")
            for word in line.partition(" : ")[0].split(",")
        }
        taken = [
            key
            for key, parameter in inspect.signature(function).parameters.items()
            if key not in ("self", "cls")
        ]
        wrong += [f"{name}: {key}" for key in taken if key not in heads]
    assert wrong == []
