"""The invented study, and its report drawn once for all tests."""

from __future__ import annotations

import importlib.util
from pathlib import Path
from types import ModuleType

import pytest

from oddsmodel.report.document import render_report


@pytest.fixture(scope="session")
def sample() -> ModuleType:
    spec = importlib.util.spec_from_file_location("report_sample", Path(__file__).with_name("sample.py"))
    assert spec is not None
    assert spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    return module


@pytest.fixture(scope="session")
def page(sample: ModuleType) -> str:
    return render_report(sample.disclosed())
