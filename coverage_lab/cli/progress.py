"""Progress on stderr, and only to a terminal."""

import sys
from collections.abc import Callable, Iterator
from contextlib import contextmanager

from coverage_lab.cli.options import watched

Report = Callable[[str, float], None]


@contextmanager
def progress(quiet: bool) -> Iterator[Report | None]:
    """A function to be told what is being done and the share that is done; None where nobody is watching."""
    if quiet or not watched(sys.stderr):
        yield None
        return
    from rich.console import Console
    from rich.progress import Progress, TaskID

    with Progress(console=Console(stderr=True), transient=True) as bar:
        tasks: dict[str, TaskID] = {}

        def report(label: str, share: float) -> None:
            if label not in tasks:
                tasks[label] = bar.add_task(label, total=1.0)
            bar.update(tasks[label], completed=share)

        yield report
