"""Reads the published values in `tests/published`."""

from __future__ import annotations

from pathlib import Path

import pandas as pd

FOLDER = Path(__file__).parent / "published"


def published(name: str) -> pd.DataFrame:
    """The table `name`.csv without its comment lines."""
    return pd.read_csv(FOLDER / f"{name}.csv", comment="#")
