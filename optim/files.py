"""Files that appear whole or not at all.

Written beside their place under another name first, then moved into it in one go.
"""

from __future__ import annotations

import json
import os
import tempfile
from collections.abc import Iterator, Mapping
from contextlib import contextmanager
from pathlib import Path
from typing import IO, Any


@contextmanager
def written_whole(path: Path, mode: str = "w") -> Iterator[IO[Any]]:
    """A stream whose content replaces `path` once it is closed without a fault.

    Text is UTF-8 with its line ends left as they are.
    """
    path.parent.mkdir(parents=True, exist_ok=True)
    text: dict[str, Any] = {} if "b" in mode else {"encoding": "utf-8", "newline": ""}
    handle, name = tempfile.mkstemp(prefix=f".{path.name}.", dir=path.parent)
    try:
        with os.fdopen(handle, mode, **text) as stream:
            yield stream
        os.chmod(name, 0o644 & ~_umask())
        os.replace(name, path)
    except BaseException:
        Path(name).unlink(missing_ok=True)
        raise


def write_json(path: Path, account: Mapping[str, Any]) -> None:
    """Plain data as a JSON file, whole or not at all; a figure that is not finite is a fault."""
    with written_whole(path) as stream:
        json.dump(account, stream, indent=2, ensure_ascii=False, allow_nan=False)
        stream.write("\n")


def _umask() -> int:
    mask = os.umask(0)
    os.umask(mask)
    return mask
