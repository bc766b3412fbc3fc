"""What can be wrong with a search's arguments, a checkpoint or a run folder.

The command line turns these into one message and exit code 2; what is wrong with a case file
is told by `problems.CaseError`.
"""

from __future__ import annotations


class RunError(ValueError):
    """A search, a checkpoint or a run folder that cannot be used; the text says why."""


class RunExistsError(RunError, FileExistsError):
    """A folder already holds a run and may not be written over."""

    def __str__(self) -> str:
        return str(self.args[0])


class CheckpointError(RunError):
    """A checkpoint that is damaged, not ours, or of another case or seed."""
