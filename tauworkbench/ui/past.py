"""What was chosen before, and what was taken back."""

from __future__ import annotations

from ..session.choices import Choices

__all__ = ["Past"]

_MOST = 200


class Past:
    """Choices to go back to and forth to; they are frozen, so that keeping them costs nothing."""

    def __init__(self) -> None:
        self._past: list[Choices] = []
        self._future: list[Choices] = []

    @property
    def has_past(self) -> bool:
        """Whether there is something to take back."""
        return bool(self._past)

    @property
    def has_future(self) -> bool:
        """Whether there is something to bring back."""
        return bool(self._future)

    def add(self, before: Choices) -> None:
        """Keep the choices that a change replaces; what had been taken back is gone."""
        self._past = [*self._past[1 - _MOST :], before]
        self._future = []

    def back(self, now: Choices) -> Choices:
        """Return the choices before; the present ones where there are none."""
        return _step(self._past, self._future, now)

    def forth(self, now: Choices) -> Choices:
        """Return the choices that were taken back; the present ones where there are none."""
        return _step(self._future, self._past, now)


def _step(source: list[Choices], other: list[Choices], now: Choices) -> Choices:
    if not source:
        return now
    other.append(now)
    return source.pop()
