"""The structure that DEVELOPERS.md describes, as tests: who may import whom, and how large a piece may be."""

import ast
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parent.parent
CALC = sorted((ROOT / "calc").glob("*.py"))
WEBAPP = sorted(path for path in (ROOT / "webapp").rglob("*.py") if "migrations" not in path.parts)
FEATURES = sorted(path.name for path in (ROOT / "webapp").iterdir() if (path / "views.py").exists())
KINDS = ("views", "forms", "queries")


def imports_of(path):
    """Return every module a file imports, also inside functions."""
    found = set()
    for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
        if isinstance(node, ast.Import):
            found |= {alias.name for alias in node.names}
        elif isinstance(node, ast.ImportFrom):
            found |= {node.module} | {f"{node.module}.{alias.name}" for alias in node.names}
    return found


def tops_of(path):
    return {name.split(".")[0] for name in imports_of(path)}


def name_of(path):
    return str(path.relative_to(ROOT))


@pytest.mark.parametrize("path", CALC, ids=name_of)
def test_calc_knows_numbers_only(path):
    plain = {"dataclasses", "math", "functools", "itertools", "collections", "typing", "enum", "statistics"}
    assert tops_of(path) - plain - {"calc", "numpy", "scipy"} == set()


@pytest.mark.parametrize("path", CALC, ids=name_of)
def test_calc_reads_no_clock_file_or_environment(path):
    calls = {
        node.func.id if isinstance(node.func, ast.Name) else node.func.attr
        for node in ast.walk(ast.parse(path.read_text(encoding="utf-8")))
        if isinstance(node, ast.Call) and isinstance(node.func, (ast.Name, ast.Attribute))
    }
    assert calls & {"open", "now", "today", "getenv", "print", "input", "default_rng_from_entropy"} == set()


@pytest.mark.parametrize("path", [path for path in WEBAPP if path.stem == "views"], ids=name_of)
def test_views_do_http_only(path):
    imported = imports_of(path)
    assert not {name for name in imported if name.split(".")[0] in {"sqlalchemy", "calc", "numpy", "scipy", "pandas"}}
    assert "webapp.models" not in imported


INNER = [path for path in WEBAPP if path.parent.name in FEATURES and path.stem not in {"views", "access"}]


@pytest.mark.parametrize("path", INNER, ids=name_of)
def test_the_rest_of_a_feature_knows_no_http(path):
    assert tops_of(path) & {"flask", "flask_login", "flask_wtf", "werkzeug"} <= (
        {"werkzeug"} if path.parent.name == "people" else set()
    )


@pytest.mark.parametrize("path", [path for path in WEBAPP if path.stem in KINDS], ids=name_of)
def test_only_services_call_calc(path):
    assert "calc" not in tops_of(path)


@pytest.mark.parametrize("path", [path for path in WEBAPP if path.stem == "queries"], ids=name_of)
def test_queries_only_read(path):
    source = path.read_text(encoding="utf-8")
    assert not [word for word in (".add(", ".commit(", ".delete(", ".flush(", "insert(", "update(") if word in source]


@pytest.mark.parametrize("path", [path for path in WEBAPP if path.parent.name in FEATURES], ids=name_of)
def test_a_feature_uses_no_views_or_forms_of_another(path):
    own = f"webapp.{path.parent.name}."
    others = {name for name in imports_of(path) if name.startswith("webapp.") and not name.startswith(own)}
    assert not [name for name in others if name.split(".")[2:3] in (["views"], ["forms"])]


@pytest.mark.parametrize("path", [*CALC, *WEBAPP], ids=name_of)
def test_nothing_imports_the_tests(path):
    assert "tests" not in tops_of(path)


@pytest.mark.parametrize("path", [*CALC, *WEBAPP], ids=name_of)
def test_modules_stay_small(path):
    assert len(path.read_text(encoding="utf-8").splitlines()) <= 400


@pytest.mark.parametrize("path", [*CALC, *WEBAPP], ids=name_of)
def test_functions_stay_small(path):
    long = []
    for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
        if isinstance(node, ast.FunctionDef):
            first = node.body[1] if ast.get_docstring(node) and len(node.body) > 1 else node.body[0]
            if node.end_lineno - first.lineno + 1 > 40:
                long.append(node.name)
    assert long == []


@pytest.mark.parametrize("path", sorted((ROOT / "templates").rglob("*.*")), ids=name_of)
def test_templates_stay_small_and_say_what_they_need(path):
    text = path.read_text(encoding="utf-8")
    assert len(text.splitlines()) <= 100
    assert text.startswith("{#")
    assert "|safe" not in text.replace(" ", "")


@pytest.mark.parametrize("path", sorted((ROOT / "static").glob("*.js")), ids=name_of)
def test_scripts_stay_small(path):
    assert len(path.read_text(encoding="utf-8").splitlines()) <= 100
