"""What the tests of this folder share."""

from __future__ import annotations

from collections.abc import Iterator

import pytest

from tests.faults.children import Children, children


@pytest.fixture(scope="session")
def evenload(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Children]:
    """The command line in processes of their own."""
    with children(tmp_path_factory.mktemp("said")) as found:
        yield found
