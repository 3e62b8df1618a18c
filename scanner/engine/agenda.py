"""Which task is next."""

from __future__ import annotations

from collections import deque
from collections.abc import Container

from scanner.study import Plan


class Agenda:
    """Tasks of a plan that are not finished, in an order in which each finds what it needs.

    Parameters
    ----------
    plan
        The plan.
    finished
        Numbers of the tasks that have a receipt.
    """

    def __init__(self, plan: Plan, finished: Container[int]) -> None:
        self._ready: deque[int] = deque()
        self._lacking: dict[int, set[int]] = {}
        self._waited_for_by: dict[int, int] = {}
        for task in plan.tasks:
            if task.number in finished:
                continue
            lacking = {number for number in task.needs if number not in finished}
            if lacking:
                self._lacking[task.number] = lacking
                self._waited_for_by.update(dict.fromkeys(lacking, task.number))
            else:
                self._ready.append(task.number)

    def __bool__(self) -> bool:
        """Whether a task can be taken now."""
        return bool(self._ready)

    def take(self) -> int:
        """Take the next task; only where the agenda is true."""
        return self._ready.popleft()

    def give_back(self, number: int) -> None:
        """Put a task that was lost first in line."""
        self._ready.appendleft(number)

    def settle(self, number: int) -> None:
        """Note that a task is finished; a task that waited for it alone comes next."""
        waiting = self._waited_for_by.pop(number, None)
        if waiting is None:
            return
        self._lacking[waiting].discard(number)
        if not self._lacking[waiting]:
            del self._lacking[waiting]
            self._ready.appendleft(waiting)
