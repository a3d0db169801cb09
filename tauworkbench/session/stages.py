"""From choices to everything that a screen or a command shows, computing only what is missing.

`resolve` runs the cheap stages and hands back a `Pending` for a costly one that isn't known yet;
`complete` runs those too. Both use the one table of stages in `chain`, so the bench and the
command line can't disagree. An error is a result too: it is kept, and it stands beside the stage
in which it arose.
"""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from types import MappingProxyType
from typing import Any

from ..errors import EstimateError, InputError
from ..progress import SILENT, Watch
from .chain import STAGES
from .choices import Choices
from .keys import keys_of
from .memory import Memory, Outcome, Stage, stage_key

__all__ = ["STAGES", "Memory", "Pending", "Resolved", "Stage", "complete", "resolve"]


@dataclass(frozen=True, eq=False)
class Pending:
    """A costly stage that is known to be possible and hasn't run.

    Two are the same work when their ``key`` is the same; when the choices move on, `resolve`
    answers with another key, and what this one yields is of no more use.
    """

    stage: str
    key: str
    work: Stage
    choices: Choices
    inputs: Mapping[str, Any]
    memory: Memory

    def run(self, watch: Watch = SILENT) -> None:
        """Do the work and keep its outcome, so that the next `resolve` finds it.

        It may run in any thread. An `InputError` is kept, not raised.

        Raises
        ------
        Cancelled
            When the watch says so; nothing is kept then.
        """
        self.memory.keep(self.stage, self.key, _run(self.work, self.choices, self.inputs, watch))


@dataclass(frozen=True, eq=False)
class Resolved:
    """What the choices come to.

    Attributes
    ----------
    values : mapping of str to object
        By stage: ``log``, ``channels``, ``trace``, ``steps``, ``estimates``, ``result``.
    errors : mapping of str to InputError
        Only the stages that failed themselves; those that need them are simply absent.
    pending : tuple of Pending
        Costly work that would lead on.
    """

    values: Mapping[str, Any]
    errors: Mapping[str, InputError]
    pending: tuple[Pending, ...]

    def get(self, stage: str) -> Any:
        """Return a stage's value, or None where there is none (yet)."""
        return self.values.get(stage)

    def need(self, stage: str) -> Any:
        """Return a stage's value, or raise the error that stands before it.

        Raises
        ------
        InputError
            The first error on the way to that stage.
        """
        if stage in self.values:
            return self.values[stage]
        for error in self.errors.values():
            raise error
        raise KeyError(f"{stage} is pending")


def resolve(
    choices: Choices,
    memory: Memory,
    *,
    stages: Sequence[Stage] = STAGES,
) -> Resolved:
    """Run the cheap stages; a costly one that isn't known is handed back as `Pending`.

    Parameters
    ----------
    choices : Choices
        They may be incomplete: the stages that can't run say why in ``errors``.
    memory : Memory
        What earlier calls found.
    stages : sequence of Stage
        The table, each stage after those it needs.
    """
    return _walk(choices, memory, stages, None)


def complete(
    choices: Choices,
    watch: Watch = SILENT,
    memory: Memory | None = None,
    *,
    last: str | None = None,
    stages: Sequence[Stage] = STAGES,
) -> Resolved:
    """Run all stages, the costly ones too.

    Parameters
    ----------
    choices, memory, stages
        As for `resolve`.
    watch : Watch
        Shows progress and may cancel.
    last : str, optional
        Run only this stage and those it needs.

    Raises
    ------
    Cancelled
        When the watch says so.
    """
    wanted = stages if last is None else _leading_to(last, stages)
    return _walk(choices, memory or Memory(), wanted, watch)


def _walk(
    choices: Choices, memory: Memory, stages: Sequence[Stage], watch: Watch | None
) -> Resolved:
    # kept outcomes don't know under which name they were asked for
    bare = replace(choices, source="", title=choices.name)
    keys: dict[str, str] = {}
    values: dict[str, Any] = {}
    errors: dict[str, InputError] = {}
    pending: list[Pending] = []
    for stage in stages:
        if not all(name in values for name in stage.needs):
            continue
        key = keys[stage.name] = stage_key(stage, bare, keys)
        inputs = MappingProxyType({name: values[name] for name in stage.needs})
        outcome = memory.get(stage.name, key)
        if outcome is None and watch is None and stage.costly(bare):
            pending.append(Pending(stage.name, key, stage, bare, inputs, memory))
            continue
        if outcome is None:
            outcome = _run(stage, bare, inputs, watch or SILENT)
            memory.keep(stage.name, key, outcome)
        if outcome.error is None:
            values[stage.name] = outcome.value
        else:
            errors[stage.name] = _named(outcome.error, choices)
    return Resolved(MappingProxyType(values), MappingProxyType(errors), tuple(pending))


def _run(stage: Stage, choices: Choices, inputs: Mapping[str, Any], watch: Watch) -> Outcome:
    try:
        return Outcome(stage.function(choices, inputs, watch))
    except InputError as e:
        return Outcome(error=_placed(e, stage, choices))
    except MemoryError:
        how = "close other programs, or cut the log"
        return Outcome(error=InputError("[log] file", "the memory isn't enough for it", how))


def _placed(error: InputError, stage: Stage, choices: Choices) -> InputError:
    """Give an error from a lower room, which names an argument, its place in the run file."""
    where = error.where
    named = re.search(r"(?:^| )(\[[a-z]+\].*)", where)
    if named:
        return _moved(error, named[1])
    if any(where.startswith((str(path), path.name)) for path in stage.files(choices)):
        return error
    tables = list(dict.fromkeys(name.partition(".")[0] for name in stage.reads))
    argument = re.split(r"[^A-Za-z0-9_]", where, maxsplit=1)[0]
    for table in tables:
        if argument in keys_of(table):
            return _moved(error, f"[{table}] {where}")
    if where == "log" or not tables:
        return _moved(error, "[log] file")
    return _moved(error, f"[{tables[0]}]", f"{where}: {error.what}")


def _named(error: InputError, choices: Choices) -> InputError:
    """Put the run file's name before ``[table] key``."""
    if choices.source and error.where.startswith("["):
        return _moved(error, f"{choices.source} {error.where}")
    return error


def _moved(error: InputError, where: str, what: str | None = None) -> InputError:
    """Return the same error at another place."""
    if isinstance(error, EstimateError):
        return EstimateError(where, what or error.what, error.how, error.found)
    return InputError(where, what or error.what, error.how)


def _leading_to(last: str, stages: Sequence[Stage]) -> list[Stage]:
    by_name = {stage.name: stage for stage in stages}
    wanted = {last}
    for stage in reversed(stages):
        if stage.name in wanted:
            wanted.update(by_name[stage.name].needs)
    return [stage for stage in stages if stage.name in wanted]
