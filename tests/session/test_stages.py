"""Stages: what runs again when a choice changes, and what doesn't."""

from __future__ import annotations

from collections import Counter
from dataclasses import replace
from pathlib import Path

import pytest

from tauworkbench.errors import Cancelled, EstimateError, InputError
from tauworkbench.session.choices import Choices, ChosenLog, ChosenTest
from tauworkbench.session.memory import Memory, Stage
from tauworkbench.session.stages import complete, resolve


def table(calls: Counter[str]) -> tuple[Stage, ...]:
    """A chain of a file, a cheap middle, and a costly end that reads the window."""

    def counted(name, work):
        def function(choices, inputs, watch):
            calls[name] += 1
            watch.report(0, 1, name)
            if watch.cancelled():
                raise Cancelled(name)
            return work(choices, inputs)

        return function

    def middle(choices, inputs):
        if choices.log.signal == "none":
            raise EstimateError(
                "[log] signal", "there is no such column", "give another", {"n": 1.0}
            )
        return inputs["text"] + str(choices.log.signal)

    return (
        Stage("text", (), ("log.file",),
              counted("text", lambda c, i: c.path(c.log.file).read_text()),
              files=lambda c: (c.path(c.log.file),)),
        Stage("middle", ("text",), ("log.signal",), counted("middle", middle)),
        Stage("end", ("middle",), ("test.window_s",),
              counted("end", lambda c, i: (i["middle"], c.test.window_s)), costly=lambda _: True),
        Stage("words", ("text",), ("test.note",), counted("words", lambda c, i: c.test.note)),
    )  # fmt: skip


@pytest.fixture
def choices(tmp_path):
    (tmp_path / "log.csv").write_text("text ")
    return Choices(log=ChosenLog("log.csv", signal="x"), folder=tmp_path, source="run.toml")


@pytest.fixture
def calls():
    return Counter()


class Stopping:
    def report(self, done, total, words):
        pass

    def cancelled(self):
        return True


def test_resolve_hands_back_the_costly_stage_and_its_work_is_found_next_time(choices, calls):
    memory, stages = Memory(), table(calls)
    first = resolve(choices, memory, stages=stages)
    assert first.get("middle") == "text x"
    assert [p.stage for p in first.pending] == ["end"]
    first.pending[0].run()
    second = resolve(choices, memory, stages=stages)
    assert second.get("end") == ("text x", None)
    assert not second.pending
    assert calls == {"text": 1, "middle": 1, "end": 1, "words": 1}


@pytest.mark.parametrize(
    ("change", "again"),
    [
        (lambda c: replace(c, test=ChosenTest(window_s=(1.0, 2.0))), {"end"}),
        (lambda c: replace(c, test=ChosenTest(note="n")), {"words"}),
        (lambda c: replace(c, test=ChosenTest(sensor="s")), set()),
        (lambda c: replace(c, source="other.toml"), set()),
        (lambda c: replace(c, log=replace(c.log, signal="y")), {"middle", "end"}),
    ],
)
def test_only_what_depends_on_a_choice_runs_again(choices, calls, change, again):
    memory, stages = Memory(), table(calls)
    complete(choices, memory=memory, stages=stages)
    calls.clear()
    complete(change(choices), memory=memory, stages=stages)
    assert set(calls) == again
    complete(choices, memory=memory, stages=stages)
    assert sum(calls.values()) == len(again)


def test_a_changed_file_is_read_again(choices, calls, tmp_path):
    memory, stages = Memory(), table(calls)
    complete(choices, memory=memory, stages=stages)
    (tmp_path / "log.csv").write_text("longer text ")
    found = complete(choices, memory=memory, stages=stages)
    assert found.get("middle") == "longer text x"
    assert calls["end"] == 2


def test_an_error_stands_beside_its_stage_and_what_needs_it_is_absent(choices, calls):
    memory, stages = Memory(), table(calls)
    broken = replace(choices, log=replace(choices.log, signal="none"))
    for _ in range(2):
        found = resolve(broken, memory, stages=stages)
        assert list(found.errors) == ["middle"]
        assert found.errors["middle"].where == "run.toml [log] signal"
        assert set(found.values) == {"text", "words"}
    assert calls["middle"] == 1
    with pytest.raises(EstimateError) as e:
        found.need("end")
    assert e.value.found == {"n": 1.0}
    assert e.value.where == "run.toml [log] signal"


def test_the_same_error_carries_the_name_under_which_it_was_asked_for(choices, calls):
    memory, stages = Memory(), table(calls)
    broken = replace(choices, log=replace(choices.log, signal="none"))
    resolve(broken, memory, stages=stages)
    found = resolve(replace(broken, source=""), memory, stages=stages)
    assert found.errors["middle"].where == "[log] signal"


def test_a_cancelled_stage_leaves_nothing_and_runs_again(choices, calls):
    memory, stages = Memory(), table(calls)
    pending = resolve(choices, memory, stages=stages).pending[0]
    with pytest.raises(Cancelled):
        pending.run(Stopping())
    assert resolve(choices, memory, stages=stages).pending[0].key == pending.key
    pending.run()
    assert calls["end"] == 2


def test_pending_work_of_other_choices_has_another_key(choices, calls):
    memory, stages = Memory(), table(calls)
    one = resolve(choices, memory, stages=stages).pending[0]
    moved = replace(choices, test=ChosenTest(window_s=(1.0, 2.0)))
    two = resolve(moved, memory, stages=stages).pending[0]
    one.run()
    assert one.key != two.key
    assert resolve(moved, memory, stages=stages).pending[0].key == two.key


def test_only_the_last_few_outcomes_are_kept(choices, calls):
    memory, stages = Memory(most=2), table(calls)
    for signal in "abca":
        now = replace(choices, log=replace(choices.log, signal=signal))
        resolve(now, memory, stages=stages)
    assert calls["middle"] == 4
    assert calls["text"] == 1


def test_complete_up_to_a_stage_runs_only_what_leads_to_it(choices, calls):
    complete(choices, last="middle", stages=table(calls))
    assert set(calls) == {"text", "middle"}


def test_a_name_that_says_nothing_of_a_key_is_put_at_the_stages_table(choices):
    def wrong(choices, inputs, watch):
        raise InputError("window_s", "starts after it ends", "turn it round")

    stages = (Stage("one", (), ("log.file", "test"), wrong),)
    found = resolve(choices, Memory(), stages=stages)
    assert found.errors["one"].where == "run.toml [test] window_s"


def test_a_missing_file_has_a_key_too(tmp_path, calls):
    choices = Choices(log=ChosenLog("none.csv"), folder=Path(tmp_path))
    stages = (
        Stage("one", (), ("log.file",), lambda c, i, w: 1, files=lambda c: (c.path("none.csv"),)),
    )
    assert resolve(choices, Memory(), stages=stages).get("one") == 1
