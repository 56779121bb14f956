"""README and DEVELOPERS say what is there: commands, settings, modules, pictures."""

import re
from pathlib import Path

import pytest

from webapp import cli, config
from webapp.dataset.recipes import BY_TOOL

ROOT = Path(__file__).resolve().parent.parent
README = (ROOT / "README.md").read_text(encoding="utf-8")
DEVELOPERS = (ROOT / "DEVELOPERS.md").read_text(encoding="utf-8")
TEXTS = [*ROOT.glob("*.md"), *(ROOT / "demo_survey").glob("*.md"), *(ROOT / "tests").rglob("*.md")]


@pytest.mark.parametrize("command", sorted(cli.main.commands))
def test_readme_tells_every_command(command):
    assert f"bankside {command}" in README


def test_readme_tells_every_setting_with_its_default():
    told = set(re.findall(r"BANKSIDE_[A-Z_]+", README)) - {"BANKSIDE_NO_SKIP"}
    source = (ROOT / "webapp" / "config.py").read_text(encoding="utf-8")
    known = set(re.findall(r'"(BANKSIDE_[A-Z_]+)"', source)) | {"BANKSIDE_OFFICE_PASSWORD"}
    assert told == known
    defaults = config.read_config({})
    assert f"`{defaults.port}`" in README
    assert f"`{defaults.threads}`" in README


def test_readme_opens_with_the_job_in_one_paragraph():
    first = README.split("\n\n")[1]
    assert first.startswith("Below a discharge")
    assert "sag" in first


@pytest.mark.parametrize(("tool", "lines"), BY_TOOL)
def test_readme_opens_the_dataset_as_the_dataset_itself_says(tool, lines):
    assert "\n".join(lines) in README


@pytest.mark.parametrize("folder", ["calc", "webapp"])
def test_developers_map_names_every_module(folder):
    names = {path.stem for path in (ROOT / folder).glob("*.py")} - {"__init__", "checks", "errors"}
    features = {path.parent.name for path in (ROOT / folder).glob("*/views.py")}
    families = {name.split("_")[0] for name in re.findall(r"\b([a-z]+)_?\*", DEVELOPERS)}
    missing = {
        name
        for name in names | features
        if not re.search(rf"\b{name}\b", DEVELOPERS) and not any(name.startswith(family) for family in families)
    }
    assert missing == set()


@pytest.mark.parametrize("path", TEXTS, ids=lambda path: str(path.relative_to(ROOT)))
def test_every_file_that_a_document_points_to_exists(path):
    links = re.findall(r"\]\(([^)#:]+)\)", path.read_text(encoding="utf-8"))
    assert [link for link in links if not (path.parent / link).exists()] == []


def test_bench_readme_tells_every_script():
    told = (ROOT / "tests" / "bench" / "README.md").read_text(encoding="utf-8")
    scripts = [
        path.stem for path in (ROOT / "tests" / "bench").glob("*.py") if "def main(" in path.read_text(encoding="utf-8")
    ]
    assert [name for name in scripts if f"tests.bench.{name}" not in told and f"bench/{name}.py" not in told] == []
