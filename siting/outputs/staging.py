"""The results folder: written beside its place and put there whole, or not at all."""

import glob
import json
import os
import re
import shutil
import socket
import tempfile
from pathlib import Path
from types import TracebackType

from siting.errors import OutputError
from siting.outputs.run_record import MARK, RUN_RECORD

PARTIAL = ".partial"


class StagedFolder:
    """
    A folder that appears whole or not at all: `with StagedFolder(target) as folder: ...`.

    Inside, `folder` is an empty temporary folder beside `target`; at the end it takes the place of `target` by
    renaming. An exception or an interrupt removes it and leaves `target` as it was. With `overwrite`, a folder that
    holds a run record of ours is replaced; anything else is never touched. A run killed while the old folder had
    already stepped aside is mended by the next run, which puts it back first.

    Raises
    ------
    OutputError
        On entering, where `target` exists and may not be replaced, or its parent cannot be written to.
    """

    def __init__(self, target: Path, *, overwrite: bool = False) -> None:
        self.target = target.absolute()
        self.overwrite = overwrite
        self._staged: Path | None = None

    @property
    def _aside(self) -> Path:
        return self.target.with_name(f".{self.target.name}.before")

    def __enter__(self) -> Path:
        self._mend()
        self._check()
        try:
            self.target.parent.mkdir(parents=True, exist_ok=True)
            name = tempfile.mkdtemp(prefix=f"{self._mark}{os.getpid()}.", suffix=PARTIAL, dir=self.target.parent)
        except OSError as error:
            msg = f"{self.target.name} cannot be written: {error.strerror}; choose another folder with --out"
            raise OutputError(msg) from error
        self._staged = Path(name)
        self._staged.chmod(0o755)  # mkdtemp's folder is private to the user; results are shared
        return self._staged

    def __exit__(self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None) -> None:
        staged = self._staged
        if staged is None:
            return
        try:
            if kind is None:
                self._put_in_place(staged)
        finally:
            if staged.exists():
                shutil.rmtree(staged, ignore_errors=True)
            self._staged = None

    @property
    def _mark(self) -> str:
        """How temporary folders of this target begin that were made on this machine."""
        return f".{self.target.name}.{re.sub(r'[^A-Za-z0-9-]', '-', socket.gethostname())}."

    def _mend(self) -> None:
        """Finish or undo what a killed run began to put in place, and take away what it left half written."""
        for left in self.target.parent.glob(f"{glob.escape(self._mark)}*{PARTIAL}"):
            number = left.name.removeprefix(self._mark).partition(".")[0]
            if number.isdecimal() and not _runs(int(number)):
                shutil.rmtree(left, ignore_errors=True)
        if not is_ours(self._aside):
            return
        if self.target.exists():
            _remove(self._aside)
        else:
            self._aside.rename(self.target)

    def _check(self) -> None:
        name = self.target.name
        if not self.target.exists() and not self.target.is_symlink():
            return
        if self.target.is_dir() and not any(self.target.iterdir()):
            return
        if not is_ours(self.target):
            msg = f"{name} exists and holds no run record of ours, so it is left alone; choose another folder with --out"
            raise OutputError(msg)
        if not self.overwrite:
            msg = f"{name} holds results already; give --overwrite to replace them, or choose another folder"
            raise OutputError(msg)

    def _put_in_place(self, staged: Path) -> None:
        self._check()  # somebody may have written there meanwhile
        try:
            if not is_ours(self.target):
                if self.target.exists():
                    self.target.rmdir()  # an empty folder
                staged.rename(self.target)
                return
            self.target.rename(self._aside)
            try:
                staged.rename(self.target)
            except BaseException:
                self._aside.rename(self.target)
                raise
        except OSError as error:
            msg = f"{self.target.name} cannot be put in place: {error.strerror}; is it open in another program?"
            raise OutputError(msg) from error
        _remove(self._aside)


def _runs(process: int) -> bool:
    """Tell whether a process of this machine is alive."""
    try:
        os.kill(process, 0)
    except ProcessLookupError:
        return False
    except OSError:
        return True
    return True


def is_ours(folder: Path) -> bool:
    """Tell whether a folder (no link) holds a run record that this library wrote."""
    if folder.is_symlink() or not folder.is_dir():
        return False
    try:
        record = json.loads((folder / RUN_RECORD).read_text(encoding="utf-8"))
    except (OSError, ValueError):
        return False
    return isinstance(record, dict) and MARK in record


def _remove(folder: Path) -> None:
    """Remove a folder of ours, the run record last: half removed, it still says whose it is."""
    for path in folder.iterdir():
        if path.name == RUN_RECORD:
            continue
        if path.is_dir() and not path.is_symlink():
            shutil.rmtree(path)
        else:
            path.unlink()
    (folder / RUN_RECORD).unlink()
    folder.rmdir()
