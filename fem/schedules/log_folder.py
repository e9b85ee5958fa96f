"""Where the logs of a docket are found: beside it, or in its zip; never outside, and never more than a bounded size."""

from pathlib import Path, PurePosixPath

from fem.errors import DocketError, shown
from fem.quantities.strict import unknown
from fem.schedules.logs import Samples, Sheet, Wanted, read_samples, read_sheet

MAX_BYTES = 64_000_000
"""Largest log: a year at one row every ten seconds fits; a slip (the wrong file) does not stall the machine."""


class LogFolder:
    """Where a docket's logs are found: a folder, or the members of a zip. Each file is read once."""

    def __init__(self, folder: Path | None = None, members: dict[str, bytes] | None = None) -> None:
        self.folder, self._members = folder, members
        self._sheets: dict[str, Sheet] = {}

    def read(self, name: str) -> bytes:
        """Return the bytes of a log.

        Raises
        ------
        DocketError
            If the name leads out of the docket's folder, or there is no such file, or it is too large.
        """
        path = PurePosixPath(name.replace("\\", "/"))
        if path.is_absolute() or ".." in path.parts or ":" in name or not path.parts:
            allowed = "a path relative to the docket's folder, inside it"
            raise DocketError.single("log", shown(name), allowed, "copy the log beside the docket")
        if self._members is not None:
            if str(path) not in self._members:
                allowed, hint = unknown("a file of the zip:", str(path), self._members)
                raise DocketError.single("log", shown(name), allowed, hint)
            return self._members[str(path)]
        file = (self.folder or Path()) / path
        try:
            size = file.stat().st_size
            if size > MAX_BYTES:
                hint = "thin the log or cut it into the part that matters"
                raise DocketError.single("log", f"{shown(name)} of {size} bytes", f"at most {MAX_BYTES} bytes", hint)
            return file.read_bytes()
        except OSError as error:
            beside = sorted(p.name for p in file.parent.glob("*.csv")) if file.parent.is_dir() else []
            allowed, hint = unknown("a readable file:", path.name, beside)
            raise DocketError.single("log", f"{shown(name)} ({error.strerror})", allowed, hint) from error

    def sheet(self, name: str) -> Sheet:
        """Return the cells of a log.

        Raises
        ------
        DocketError
            If it can't be read as a table.
        """
        if name not in self._sheets:
            self._sheets[name] = read_sheet(self.read(name), name)
        return self._sheets[name]

    def samples(self, name: str, wanted: Wanted) -> Samples:
        """Return one column of a log against time.

        Raises
        ------
        DocketError
            With every fault of the log, each with its line number.
        """
        return read_samples(self.sheet(name), wanted)

    def __eq__(self, other: object) -> bool:
        """Return True for any other one: where the logs lie moves no number, what they hold does."""
        return isinstance(other, LogFolder)

    def __hash__(self) -> int:
        """Return a hash that agrees with equality."""
        return hash(LogFolder)
