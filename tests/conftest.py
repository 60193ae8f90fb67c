from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path

import numpy as np
import pytest

CASES = Path(__file__).parent.parent / "cases"


@pytest.fixture(autouse=True)
def _numbers_that_go_wrong_say_so() -> Iterator[None]:
    with np.errstate(all="raise", under="ignore"):
        yield


@pytest.fixture(scope="session")
def cases() -> Path:
    return CASES
