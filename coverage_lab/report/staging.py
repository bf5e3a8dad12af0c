"""A set of files that appears whole or not at all."""

import secrets
import shutil
from collections.abc import Iterable, Iterator
from contextlib import contextmanager
from pathlib import Path


@contextmanager
def staged(folder: Path, obsolete: Iterable[str] = ()) -> Iterator[Path]:
    """A fresh directory whose files are moved into `folder` when the block ends well, and vanish when it does not.

    obsolete: files of `folder`, relative to it, that go away unless the new set holds them.

    A new folder appears by one rename. In an existing one every file is replaced atomically, and the old state is put
    back when that is interrupted; files of other names stay untouched.
    """
    target = folder.resolve()
    made = _make_parents(target)
    stage = (target if target.is_dir() else target.parent) / f".{target.name}-{secrets.token_hex(6)}.partial"
    try:
        stage.mkdir()
        yield stage
        if target.is_dir():
            _replace(stage, target, set(obsolete))
        else:
            stage.rename(target)
    except BaseException:
        shutil.rmtree(stage, ignore_errors=True)
        for parent in made:
            if parent.is_dir() and not any(parent.iterdir()):
                parent.rmdir()
        raise
    shutil.rmtree(stage, ignore_errors=True)


def _make_parents(target: Path) -> list[Path]:
    """Create what lies above the target; the directories created, deepest first."""
    missing = [parent for parent in target.parents if not parent.exists()]
    target.parent.mkdir(parents=True, exist_ok=True)
    return missing


def _files(folder: Path) -> list[Path]:
    """All files below the folder, relative to it, in a fixed order."""
    return sorted(path.relative_to(folder) for path in folder.rglob("*") if path.is_file())


def _replace(stage: Path, target: Path, obsolete: set[str]) -> None:
    """Move the staged files over those of the target, and put everything back when interrupted."""
    fresh = _files(stage)
    gone = [Path(name) for name in obsolete if Path(name) not in fresh and (target / name).is_file()]
    old = stage / ".replaced"
    kept = [name for name in (*fresh, *gone) if (target / name).exists()]
    for name in kept:
        (old / name).parent.mkdir(parents=True, exist_ok=True)
        shutil.copy2(target / name, old / name)
    try:
        for name in fresh:
            (target / name).parent.mkdir(parents=True, exist_ok=True)
            (stage / name).replace(target / name)
        for name in gone:
            (target / name).unlink()
    except BaseException:
        for name in kept:
            (old / name).replace(target / name)
        for name in set(fresh) - set(kept):
            (target / name).unlink(missing_ok=True)
        raise
