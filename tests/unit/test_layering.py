"""The architecture of design.md and the budgets of style.md, read off the source with `ast`.

Each rule is a function from a package (module name -> source) to the list of what breaks it; the real package must
give none, and a package made to break the rule must give the breach, so that no rule is blind.
"""

import ast
from collections.abc import Callable, Iterator, Mapping
from functools import cache
from pathlib import Path

import pytest

import planar

LINES = (
    {"errors", "units"},
    {"library", "network"},
    {"stackup"},
    {"brief"},
    {"lines", "copper"},
    {"field"},
    {"design"},
    {"handoff", "report"},
    {"pipeline"},
    {"cli", "__main__"},
)
"""The layers of design.md, lowest first."""
BESIDE = {("units", "errors"), ("__main__", "cli")}
"""The two imports along a line: units raises the tree's own error, and __main__ is only a way into cli."""
ONLY_IN = {
    "pint": ("units",),
    "shapely": ("copper", "field", "handoff"),
    "click": ("cli",),
    "pydantic": ("brief",),
    "pydantic_core": ("brief",),
}
IMPORTS_LATE = {
    ("units", "pint"),
    ("design", "dask.distributed"),
    ("design", "distributed.scheduler"),
    ("pipeline", "pyarrow"),
    ("pipeline", "pyarrow.parquet"),
}
"""(part, module) imported inside a function outside cli: slow to load and seldom needed, or not always installed."""

Package = Mapping[str, str]
Rule = Callable[[Package], list[str]]
Function = ast.FunctionDef | ast.AsyncFunctionDef


def real_package() -> Package:
    """Every module of planar by dotted name."""
    root = Path(planar.__file__).parent
    found = {}
    for path in sorted(root.rglob("*.py")):
        parts = ("planar", *path.relative_to(root).with_suffix("").parts)
        found[".".join(part for part in parts if part != "__init__")] = path.read_text(encoding="utf-8")
    return found


@cache
def parsed(text: str) -> ast.Module:
    """The tree of a module, the same one for all rules: they only read it, and parsing is most of their time."""
    return ast.parse(text)


def part(module: str) -> str:
    """The folder or file right under planar that `module` belongs to."""
    return [*module.split("."), ""][1]


def imported(source: ast.AST, package: Package) -> Iterator[tuple[ast.stmt, str]]:
    """Each import statement with the module it reaches: `from planar import cli` reaches planar.cli."""
    for node in ast.walk(source):
        if isinstance(node, ast.Import):
            yield from ((node, alias.name) for alias in node.names)
        elif isinstance(node, ast.ImportFrom):
            above = "." * node.level + (node.module or "")
            for alias in node.names:
                inner = f"{above}.{alias.name}"
                yield node, inner if inner in package else above


def own_imports(package: Package) -> Iterator[tuple[str, str]]:
    """(module, imported module) inside planar, each once."""
    pairs = {(name, to) for name, text in package.items() for _, to in imported(parsed(text), package)}
    yield from sorted((name, to) for name, to in pairs if to == "planar" or to.startswith("planar."))


def functions(package: Package) -> Iterator[tuple[str, Function]]:
    """Every function and method with where it stands."""
    for name, text in package.items():
        for node in ast.walk(parsed(text)):
            if isinstance(node, Function):
                yield f"{name}:{node.lineno} {node.name}", node


def line_of(name: str) -> int | None:
    """Number of the line of design.md that `name` stands on."""
    return next((i for i, names in enumerate(LINES) if name in names), None)


def unplaced(package: Package) -> list[str]:
    return sorted({part(name) for name in package if part(name) and line_of(part(name)) is None})


def upward(package: Package) -> list[str]:
    breaches = []
    for name, to in own_imports(package):
        here, there = part(name), part(to)
        if here == there or not there:  # inside one part, or the version in planar itself
            continue
        low, high = line_of(there), line_of(here)
        if not here or low is None or high is None or low > high or (low == high and (here, there) not in BESIDE):
            breaches.append(f"{name} imports {to}")
    return breaches


def relative(package: Package) -> list[str]:
    return [
        f"{name}:{node.lineno}"
        for name, text in package.items()
        for node, to in imported(parsed(text), package)
        if to.startswith(".")
    ]


def cycles(package: Package) -> list[str]:
    """Modules that import themselves by way of others: what is left when leaves are taken away again and again."""
    graph: dict[str, set[str]] = {name: set() for name in package}
    for name, to in own_imports(package):
        if to in graph and to != "planar":
            graph[name].add(to)
    while leaves := {name for name, targets in graph.items() if not targets & graph.keys()}:
        graph = {name: targets for name, targets in graph.items() if name not in leaves}
    return sorted(graph)


def late_imports(package: Package) -> list[str]:
    breaches = set()
    for where, function in functions(package):
        here = part(where.split(":")[0])
        for node, to in imported(function, package):
            if here != "cli" and (here, to) not in IMPORTS_LATE:
                breaches.add(f"{where.split(':')[0]}:{node.lineno} imports {to} late")
    return sorted(breaches)


def strays(package: Package) -> list[str]:
    return [
        f"{name} imports {to}"
        for name, text in package.items()
        for _, to in imported(parsed(text), package)
        if part(name) not in ONLY_IN.get(to.split(".")[0], (part(name),))
    ]


def long_modules(package: Package) -> list[str]:
    return [name for name, text in package.items() if len(text.splitlines()) > 400]


def long_functions(package: Package) -> list[str]:
    return [where for where, f in functions(package) if f.end_lineno and f.end_lineno - f.lineno + 1 > 80]


def many_parameters(package: Package) -> list[str]:
    breaches = []
    for where, function in functions(package):
        arguments = function.args
        named = [a.arg for a in (*arguments.posonlyargs, *arguments.args, *arguments.kwonlyargs)]
        own = named[1:] if named[:1] in (["self"], ["cls"]) else named
        if not is_command(function) and len(own) > 6:
            breaches.append(where)
        if arguments.kwarg is not None and part(where.split(":")[0]) != "cli":  # click hands over keywords
            breaches.append(f"{where} takes **{arguments.kwarg.arg}")
    return breaches


def is_command(function: Function) -> bool:
    """Whether click calls the function: its parameters are the command's options."""
    calls = [d.func for d in function.decorator_list if isinstance(d, ast.Call)]
    return any(isinstance(call, ast.Attribute) and call.attr in {"command", "group"} for call in calls)


def wide_classes(package: Package) -> list[str]:
    """Classes of more than 12 public methods; a property reads like a field and counts as one."""
    breaches = []
    for name, text in package.items():
        for node in ast.walk(parsed(text)):
            if isinstance(node, ast.ClassDef):
                methods = [f for f in node.body if isinstance(f, Function) and not f.name.startswith("_")]
                public = [f for f in methods if not decorated(f, {"property", "cached_property"})]
                breaches += [f"{name}.{node.name}: {len(public)}"] if len(public) > 12 else []
    return breaches


def undocumented(package: Package) -> list[str]:
    """Public modules, classes, functions and methods without a docstring; an empty file has nothing to say."""
    breaches = []
    for name, text in package.items():
        tree = parsed(text)
        if tree.body and not ast.get_docstring(tree):
            breaches.append(name)
        for owner in (tree, *(n for n in tree.body if isinstance(n, ast.ClassDef) and not n.name.startswith("_"))):
            for node in owner.body:
                if not isinstance(node, Function | ast.ClassDef) or node.name.startswith("_"):
                    continue
                if not ast.get_docstring(node) and not decorated(node, {"overload"}):
                    breaches.append(f"{name}:{node.lineno} {node.name}")
    return breaches


def decorated(node: Function | ast.ClassDef, names: set[str]) -> bool:
    return any(isinstance(d, ast.Name) and d.id in names for d in node.decorator_list)


MANY = "a, b, c, d, e, f, g"
METHODS = "\n".join(f"    def m{i}(self): pass" for i in range(13))
BREACHES: list[tuple[Rule, Package]] = [
    (unplaced, {"planar.plots": ""}),
    (upward, {"planar.library.store": "from planar.stackup import build"}),
    (upward, {"planar.lines.line": "import planar.copper.arc"}),
    (upward, {"planar.copper.arc": "def f():\n    from planar import cli", "planar.cli": ""}),
    (upward, {"planar.errors": "from planar.units import show"}),
    (upward, {"planar": "from planar.units import show"}),
    (relative, {"planar.copper.arc": "from . import path"}),
    (cycles, {"planar.copper.arc": "import planar.copper.path", "planar.copper.path": "import planar.copper.arc"}),
    (cycles, {"planar.copper": "from planar.copper.arc import x", "planar.copper.arc": "from planar.copper import y"}),
    (late_imports, {"planar.copper.arc": "def f():\n    import math"}),
    (strays, {"planar.lines.line": "from shapely.geometry import Point"}),
    (strays, {"planar.stackup": "import pydantic"}),
    (long_modules, {"planar.design.design": "x = 1\n" * 401}),
    (long_functions, {"planar.design.design": "def f():\n" + "    x = 1\n" * 80}),
    (many_parameters, {"planar.design.design": f"def f({MANY}): pass"}),
    (many_parameters, {"planar.design.design": "def f(**options): pass"}),
    (wide_classes, {"planar.design.design": f"class A:\n{METHODS}"}),
    (undocumented, {"planar.design.design": '"""Idea."""\ndef f(): pass'}),
    (undocumented, {"planar.design.design": '"""Idea."""\nclass A:\n    """A."""\n    def f(self): pass'}),
    (undocumented, {"planar.design.design": "x = 1"}),
]
RULES = list(dict.fromkeys(rule for rule, _ in BREACHES))


@pytest.mark.parametrize("rule", RULES, ids=lambda rule: rule.__name__)
def test_planar_keeps_the_rule(rule: Rule) -> None:
    assert rule(real_package()) == []


@pytest.mark.parametrize(("rule", "package"), BREACHES, ids=lambda value: getattr(value, "__name__", None))
def test_rule_sees_a_breach(rule: Rule, package: Package) -> None:
    assert rule(package) != []


def test_whole_package_is_read() -> None:
    """The modules design.md puts at the two ends of the package are among those read."""
    package = real_package()
    assert {"planar.errors", "planar.units", "planar.cli", "planar.__main__", "planar.pipeline"} <= package.keys()
    assert ("planar.cli.options", "planar.errors") in set(own_imports(package))
