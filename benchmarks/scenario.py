"""A scenario: found by path or name, read, validated, resolved to a job. The one way in for commands and scripts."""

from __future__ import annotations

import tomllib
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from pydantic import ValidationError

from benchmarks.classifier import Classifier
from benchmarks.design_warnings import design_warnings
from benchmarks.errors import BadInputError
from benchmarks.plugin_file import blaming_user_code
from benchmarks.scenario_document import resolved_document, scenario_digest
from benchmarks.scenario_job import resolve
from benchmarks.scenario_keys import complaint
from benchmarks.scenario_schema import ScenarioFile
from benchmarks.shipped_scenarios import find_scenario
from programming.job import Job

MOST_BYTES = 2**22


@dataclass(frozen=True)
class Scenario:
    """A scenario ready to run.

    job: the experiment as numbers. sources: device value -> where it comes from. score: what rates the programmed
    array, None for most. warnings: what a designer would want to know. document: everything resolved, as plain data.
    digest: names the experiment. user_code: files of the user's that the job runs.
    """

    path: Path
    title: str
    dies: int
    job: Job
    sources: Mapping[str, str]
    score: Classifier | None
    warnings: Sequence[str]
    document: Mapping[str, Any]
    digest: str
    user_code: Sequence[Path]


def load_scenario(reference: str, allow_code: bool = False, seed: int | None = None, dies: int | None = None) -> Scenario:
    """The scenario of a path, or of the name of one that ships.

    allow_code: run Python files that the scenario names. seed, dies: take the place of those in the file.
    Raises BadInputError: one line with file, key, rule and value.
    """
    path = find_scenario(reference)
    table = read_table(path)
    for key, value in (("seed", seed), ("dies", dies)):
        if value is not None:
            table[key] = value
    try:
        file = ScenarioFile.model_validate(table)
        resolved = resolve(file, path.parent, allow_code)
        plugins = [plugin for plugin in (resolved.device.plugin, resolved.strategy_plugin) if plugin is not None]
        with blaming_user_code([plugin.path for plugin in plugins]):
            warnings = design_warnings(resolved.job)
    except ValidationError as error:
        raise BadInputError(f"{path}: {complaint(error)}") from error
    except BadInputError as error:
        raise BadInputError(f"{path}: {error}") from error
    document = resolved_document(resolved, file.dies)
    return Scenario(
        path=path,
        title=file.title or path.stem,
        dies=file.dies,
        job=resolved.job,
        sources=resolved.device.sources,
        score=resolved.targets.classifier,
        warnings=warnings,
        document=document,
        digest=scenario_digest(document, resolved),
        user_code=tuple(plugin.path for plugin in plugins),
    )


def read_table(path: Path) -> dict[str, Any]:
    """The TOML file as nested dictionaries. Raises BadInputError if it cannot be read or is not TOML."""
    try:
        with path.open("rb") as file:
            content = file.read(MOST_BYTES + 1)
    except (OSError, ValueError) as error:
        reason = error.strerror if isinstance(error, OSError) else str(error)
        raise BadInputError(f"{path}: cannot be read: {reason}") from error
    if len(content) > MOST_BYTES:
        raise BadInputError(f"{path}: is larger than 4 MiB, which no scenario is")
    try:
        return tomllib.loads(content.decode("utf-8"))
    except UnicodeDecodeError as error:
        line = content[: error.start].count(b"\n") + 1
        raise BadInputError(f"{path}: is not UTF-8 text (line {line})") from error
    except tomllib.TOMLDecodeError as error:
        raise BadInputError(f"{path}: is not valid TOML: {error}") from error
    except (RecursionError, ValueError) as error:  # brackets nested too deep; numbers of too many digits
        reason = "nested too deep" if isinstance(error, RecursionError) else str(error)
        raise BadInputError(f"{path}: is not a scenario: {reason}") from error
