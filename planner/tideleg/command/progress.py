"""Progress on the terminal while a mission is marched; silent where the output is no terminal."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager

from tideleg.running import Progress


@contextmanager
def shown() -> Iterator[Progress]:
    """Give a callback that draws one bar a mission on the standard error, gone when the work is done."""
    from rich.console import Console
    from rich.progress import BarColumn, MofNCompleteColumn, TextColumn, TimeElapsedColumn
    from rich.progress import Progress as Bars

    console = Console(stderr=True)
    columns = (TextColumn("{task.description}"), BarColumn(), MofNCompleteColumn(), TextColumn("steps"))
    with Bars(*columns, TimeElapsedColumn(), console=console, transient=True, disable=not console.is_terminal) as bars:
        tasks: dict[str, object] = {}

        def update(mission: str, done: int, total: int) -> None:
            if mission not in tasks:
                tasks[mission] = bars.add_task(mission, total=total)
            bars.update(tasks[mission], completed=done, total=total)  # type: ignore[arg-type]

        yield update
