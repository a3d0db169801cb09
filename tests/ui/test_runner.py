"""The only threads: cancelling, progress, and the way without them."""

from __future__ import annotations

import asyncio
import threading
import time

import pytest

from tauworkbench.errors import Cancelled
from tauworkbench.progress import step
from tauworkbench.ui.runner import Home, Runner


class Work:
    """Work that runs until it is let go, reporting."""

    def __init__(self, key, seconds=0.0, error=None):
        self.key, self._seconds, self._error = key, seconds, error
        self.stopped = False
        self.thread = None

    def run(self, watch):
        self.thread = threading.current_thread()
        end = time.monotonic() + self._seconds
        try:
            while time.monotonic() < end:
                step(watch, 1, 2, "counting")
                time.sleep(0.005)
        except Cancelled:
            self.stopped = True
            raise
        if self._error:
            raise self._error


class Heard:
    def __init__(self, threads=True):
        self.progress, self.ended, self.threads = [], [], []
        self.runner = Runner(self._progress, self._end, threads)

    def _progress(self, progress):
        self.progress.append(progress)
        self.threads.append(threading.current_thread())

    def _end(self, key, error):
        self.ended.append((key, error))
        self.threads.append(threading.current_thread())


async def until(condition):
    end = time.monotonic() + 10
    while not condition():
        assert time.monotonic() < end
        await asyncio.sleep(0.005)


def test_work_runs_in_a_thread_and_is_heard_on_the_loop():
    async def main():
        heard = Heard()
        work = Work("a", 0.3)
        heard.runner.start(work)
        assert heard.runner.key == "a"
        await until(lambda: heard.ended)
        assert heard.ended == [("a", None)]
        assert work.thread is not threading.main_thread()
        assert set(heard.threads) == {threading.main_thread()}
        assert heard.progress[0].share == 0.5
        assert len(heard.progress) < 6  # no more than the eye can follow

    asyncio.run(main())


def test_cancelled_work_stops_and_is_not_heard_of():
    async def main():
        heard = Heard()
        work = Work("a", 60)
        heard.runner.start(work)
        await until(lambda: work.thread)
        heard.runner.cancel()
        await until(lambda: work.stopped)
        await asyncio.sleep(0.05)
        assert heard.ended == []
        assert heard.runner.key is None

    asyncio.run(main())


def test_new_work_takes_the_place_of_the_old():
    async def main():
        heard = Heard()
        old = Work("old", 60)
        heard.runner.start(old)
        heard.runner.start(Work("new"))
        await until(lambda: heard.ended)
        assert heard.ended == [("new", None)]
        await until(lambda: old.stopped or old.thread is None)

    asyncio.run(main())


def test_same_work_is_not_started_twice():
    async def main():
        heard = Heard()
        heard.runner.start(Work("a", 0.1))
        again = Work("a")
        heard.runner.start(again)
        await until(lambda: heard.ended)
        assert again.thread is None

    asyncio.run(main())


@pytest.mark.parametrize("in_loop", [True, False])
def test_without_threads_it_runs_in_place(in_loop, monkeypatch):
    def refuse(self):
        raise RuntimeError("can't start new thread")

    async def main():
        heard = Heard()
        heard.runner.start(Work("a"))
        assert heard.ended == [("a", None)]

    if in_loop:
        # The loop's own executor isn't used, so refusing every thread is safe.
        monkeypatch.setattr(threading.Thread, "start", refuse)
        asyncio.run(main())
    else:
        heard = Heard()
        heard.runner.start(Work("a"))
        assert heard.ended == [("a", None)]


def test_error_is_handed_over():
    heard = Heard(threads=False)
    error = RuntimeError("broken")
    heard.runner.start(Work("a", error=error))
    assert heard.ended == [("a", error)]


def test_later_waits_until_the_hand_rests():
    async def main():
        heard, called = Heard(), []
        for k in range(5):
            heard.runner.later("x", 0.05, lambda k=k: called.append(k))
            await asyncio.sleep(0.01)
        await until(lambda: called)
        await asyncio.sleep(0.1)
        assert called == [4]
        heard.runner.later("x", 0.05, lambda: called.append("closed"))
        heard.runner.close()
        await asyncio.sleep(0.1)
        assert called == [4]

    asyncio.run(main())


def test_what_comes_in_another_thread_is_done_on_the_pages_own():
    async def main():
        home, seen = Home(), []
        assert home.here
        home.run(lambda: seen.append(threading.current_thread()))
        other = threading.Thread(
            target=lambda: home.run(lambda: seen.append(threading.current_thread()))
        )
        other.start()
        other.join()
        assert len(seen) == 1
        await until(lambda: len(seen) == 2)
        assert set(seen) == {threading.main_thread()}

    asyncio.run(main())
