"""Recursion that the source can't overflow: generators on an explicit stack.

A recursive function over the syntax tree is written as a generator that yields the calls it makes,
`left = yield self.build(node.left)`, and `run` drives it. Ten thousand nested operands or else-ifs are then
ten thousand entries of a list.
"""

from __future__ import annotations

from collections.abc import Generator
from typing import Any, TypeVar

T = TypeVar("T")
Task = Generator["Task[Any]", Any, T]


def run(task: Task[T]) -> T:
    """The value that the task returns."""
    stack: list[Task[Any]] = [task]
    value: Any = None
    while stack:
        try:
            called = stack[-1].send(value)
        except StopIteration as stop:
            stack.pop()
            value = stop.value
        else:
            stack.append(called)
            value = None
    result: T = value
    return result
