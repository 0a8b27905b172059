"""What the README says can be done, done: its commands are those of CI, its scenario is valid."""

import re
from pathlib import Path

from benchmarks.scenario import load_scenario
from benchmarks.scenario_keys import Section
from benchmarks.scenario_schema import ScenarioFile, SchemeFractions

ROOT = Path(__file__).parent.parent
README = (ROOT / "README.md").read_text(encoding="utf-8")


def test_ci_runs_the_two_commands_of_the_readme():
    commands = [line.strip() for line in README.splitlines() if line.startswith("    ") and "&&" in line]
    assert len(commands) == 2
    ci = (ROOT / ".ci" / "run").read_text(encoding="utf-8").splitlines()
    for command in commands:
        assert command in ci


def test_the_scenario_of_the_readme_is_valid(tmp_path):
    text = re.search(r"```toml\n(.*?)```", README, re.DOTALL)
    assert text is not None
    path = tmp_path / "my.toml"
    path.write_text(text[1], encoding="utf-8")
    scenario = load_scenario(str(path))
    assert scenario.dies == 32
    assert scenario.job.bias.name == "V/3"
    assert scenario.job.cell.values["v_on"] == -1.1


def test_files_named_in_the_guides_exist():
    for guide in ("README.md", "DEVELOPERS.md"):
        text = (ROOT / guide).read_text(encoding="utf-8")
        for name in re.findall(r"`((?:[\w.]+/)+[\w.]*)`", text):
            if not name.startswith(("demo-result", "tables", "figures")) and name not in ("outside/", "twins/"):
                assert (ROOT / name).exists() or name.endswith(("my_cell.py", "author_year.py")), f"{guide}: {name}"


def documented_keys() -> dict[str, set[str]]:
    """Section -> keys of docs/scenario.md; "" for the top level."""
    sections: dict[str, set[str]] = {}
    keys: set[str] = set()
    for line in (ROOT / "docs" / "scenario.md").read_text(encoding="utf-8").splitlines():
        if line.startswith("## "):
            keys = set()
            for name in re.findall(r"\[([\w.]+)\]", line) or [""]:
                sections[name] = keys
        elif line.startswith("| `"):
            keys.update(re.findall(r"`(\w+)`", line.split("|")[1]))
    return sections


def schema_keys(section: type[Section] = ScenarioFile, name: str = "") -> dict[str, set[str]]:
    """The same from the schema: subsections are keys whose type is a Section that has a heading of its own."""
    keys: dict[str, set[str]] = {name: set()}
    for key, field in section.model_fields.items():
        own_heading = isinstance(field.annotation, type) and issubclass(field.annotation, Section)
        if own_heading and field.annotation is not SchemeFractions:
            keys |= schema_keys(field.annotation, f"{name}.{key}".strip("."))
        else:
            keys[name].add(key)
    return keys


def test_every_key_is_documented_and_every_documented_key_exists():
    assert documented_keys() == schema_keys()
