"""What the README says can be done, done: its commands are those of CI, its scenario is valid."""

import re
from pathlib import Path

from benchmarks.scenario import load_scenario

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
