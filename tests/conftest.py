"""Puts this folder on the path, for the modules that tests share, and leaves deep sweeps to `-m deep`."""

from __future__ import annotations

import pytest


def pytest_collection_modifyitems(config, items):
    if not config.getoption("-m"):
        skip = pytest.mark.skip(reason="a deep sweep: run with -m deep")
        for item in items:
            if "deep" in item.keywords:
                item.add_marker(skip)
