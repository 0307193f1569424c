"""For all tests: loads the profile of the tests over random inputs before any of them states its settings.

A runner in the background hands down ignored interrupts, which programs keep; tests that stop a program from the
keyboard would wait for ever.
"""

from __future__ import annotations

import contextlib
import signal

from tests import profiles

__all__ = ["profiles"]

with contextlib.suppress(ValueError):  # only the main thread may
    signal.signal(signal.SIGINT, signal.default_int_handler)
