"""Shared by all tests: where skips are not allowed, a skip fails the run."""

from __future__ import annotations

import os

import pytest
from hypothesis import settings

# the same examples every time: a failure is a failure of the change at hand
settings.register_profile("same-every-time", derandomize=True, deadline=None)
settings.load_profile("same-every-time")


def pytest_sessionfinish(session: pytest.Session, exitstatus: int) -> None:
    reporter = session.config.pluginmanager.get_plugin("terminalreporter")
    if reporter is None or not os.environ.get("PATTERNGEN_NO_SKIP"):
        return
    skipped = reporter.stats.get("skipped", [])
    if skipped and exitstatus == 0:
        reporter.write_line(f"{len(skipped)} skipped where no skip is allowed", red=True)
        session.exitstatus = 1
