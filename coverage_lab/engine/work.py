"""The simulated route's work: cells, blocks of draws, their streams, processes, and what an interrupted run keeps.

The only file that knows about processes. A block's stream depends on the seed and on what the block is, so neither the
number of workers, nor the order, nor the rest of the grid changes a digit.
"""

import hashlib
import time
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from pathlib import Path

import numpy as np
from joblib import Parallel, delayed

from coverage_lab.engine.kept import Kept
from coverage_lab.engine.tally import merged, simulated, tally
from coverage_lab.records import Columns, Counts, Design, Outcomes, Plan

BLOCK = 1 << 17  # draws per block: small enough to keep memory flat, large enough to hide a stream's 64 µs
POOL_WORTH = 3.0  # seconds of serial work below which a pool's start costs more than it saves

Progress = Callable[[str, float], None]


@dataclass(frozen=True)
class Cell:
    """One planned size with one settled truth."""

    n: int
    p: float


@dataclass(frozen=True)
class Block:
    """A numbered share of a cell's draws."""

    cell: Cell
    number: int
    size: int


def cells(plan: Plan) -> list[Cell]:
    """The plan's sizes times its grid of truths, settled, without duplicates, in the plan's order."""
    listed = [Cell(n, plan.design.settle(p, n)[0]) for n in plan.sizes for p in plan.simulation.grid]
    return list(dict.fromkeys(listed))


def blocks(cell: Cell, replicates: int) -> list[Block]:
    """The cell's draws, cut into blocks."""
    starts = range(0, replicates, BLOCK)
    return [Block(cell, k, min(BLOCK, replicates - start)) for k, start in enumerate(starts)]


def identity(design: Design, block: Block, seed: int) -> str:
    """What a block is, in words: equal words mean equal draws."""
    return f"{design!r} n={block.cell.n} p={block.cell.p.hex()} block={block.number} size={block.size} seed={seed}"


def stream(design: Design, block: Block, seed: int) -> np.random.Generator:
    """The block's own generator: a child of the seed whose spawn key is a hash of the block's identity."""
    digest = hashlib.blake2b(identity(design, block, seed).encode(), digest_size=16).digest()
    words = np.frombuffer(digest, dtype="<u4")
    return np.random.default_rng(np.random.SeedSequence(seed, spawn_key=tuple(int(word) for word in words)))


def draw_block(design: Design, block: Block, seed: int) -> tuple[Columns, Counts]:
    """Literal draws of one block, tallied."""
    columns = design.draw(block.cell.p, block.cell.n, block.size, stream(design, block, seed))
    return tally(columns)


def simulate(
    plan: Plan, listed: list[Cell], workers: int = 1, progress: Progress | None = None, keep: Path | None = None
) -> dict[Cell, Outcomes]:
    """The simulated outcomes of every cell.

    keep: a file for finished blocks, read first, so that an interrupted run goes on where it was; removed at the end.
    """
    todo = [block for cell in listed for block in blocks(cell, plan.simulation.replicates)]
    found: dict[Cell, list[tuple[Columns, Counts]]] = {cell: [] for cell in listed}
    for k, (block, counted) in enumerate(_run(plan.design, todo, plan.simulation.seed, workers, keep)):
        found[block.cell].append(counted)
        if progress is not None:
            progress("simulating", (k + 1) / len(todo))
    return {cell: simulated(*merged(shares)) for cell, shares in found.items()}


def _run(
    design: Design, todo: list[Block], seed: int, workers: int, keep: Path | None
) -> Iterator[tuple[Block, tuple[Columns, Counts]]]:
    """Every block with its tally: the first in this process, to time it; the rest in a pool when that pays."""
    started = time.perf_counter()
    first = draw_block(design, todo[0], seed)
    seconds = (time.perf_counter() - started) * (len(todo) - 1)
    yield todo[0], first
    if seconds < POOL_WORTH:
        for block in todo[1:]:
            yield block, draw_block(design, block, seed)
        return
    with Kept(keep) as kept:
        rest = []
        for block in todo[1:]:
            counted = kept.get(identity(design, block, seed))
            if counted is None:
                rest.append(block)
            else:
                yield block, counted
        for block, counted in _pool(design, rest, seed, workers):
            kept.put(identity(design, block, seed), counted)
            yield block, counted
        kept.remove()


def _pool(design: Design, todo: list[Block], seed: int, workers: int) -> Iterator[tuple[Block, tuple[Columns, Counts]]]:
    """Blocks in a process pool, as they finish; with one worker in this process."""
    if workers == 1:
        for block in todo:
            yield block, draw_block(design, block, seed)
        return
    pool = Parallel(n_jobs=workers, return_as="generator_unordered")
    yield from pool(delayed(_with_block)(design, block, seed) for block in todo)


def _with_block(design: Design, block: Block, seed: int) -> tuple[Block, tuple[Columns, Counts]]:
    """A block with its tally, since a pool returns them out of order."""
    return block, draw_block(design, block, seed)
