"""How a long search is run: by whom, who is told how far it is, and whether it was stopped."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from concurrent.futures import BrokenExecutor, CancelledError, Executor
from dataclasses import dataclass
from typing import Protocol, TypeAlias, TypeVar

Report: TypeAlias = Callable[[int, int], None]
"""Is told (tasks done, tasks in all)."""

T = TypeVar("T", covariant=True)
R = TypeVar("R")


class Runnable(Protocol[T]):
    """A task that can run here or in another process, and has a name."""

    @property
    def name(self) -> str:
        """What the task is called when it fails."""

    def run(self) -> T:
        """Do the work."""


@dataclass(slots=True)
class Effort:
    """An executor (None runs in this process), who is told of progress, and whether work was stopped."""

    executor: Executor | None = None
    report: Report | None = None
    stopped: bool = False

    def results(self, tasks: Sequence[Runnable[T]]) -> list[T]:
        """Return the results of tasks in their order; of those that were done, when stopped.

        The answer does not depend on the executor. A task whose worker dies is run again here. An
        interrupt ends the work: ``stopped`` is set, and what is done is returned.
        """
        done: list[T] = []
        try:
            for result in self._each(tasks):
                done.append(result)
                if self.report is not None:
                    self.report(len(done), len(tasks))
        except KeyboardInterrupt:
            self.stopped = True
        return done

    def unless_stopped(self, work: Callable[[], R], otherwise: R) -> R:
        """Return what some work gives; ``otherwise`` when it is interrupted, or was before."""
        if self.stopped:
            return otherwise
        try:
            return work()
        except KeyboardInterrupt:
            self.stopped = True
            return otherwise

    def _each(self, tasks: Sequence[Runnable[T]]) -> Iterator[T]:
        if self.executor is None:
            yield from (task.run() for task in tasks)
            return
        futures = [self.executor.submit(_run, task) for task in tasks]
        try:
            for future, task in zip(futures, tasks, strict=True):
                try:
                    yield future.result()
                except (BrokenExecutor, CancelledError, OSError):
                    yield task.run()
        finally:
            for future in futures:
                future.cancel()


def _run(task: Runnable[T]) -> T:
    return task.run()
