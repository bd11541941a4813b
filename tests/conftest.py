"""Tables that tests hand in as property `table` are printed at the end of a run, also by parallel ones."""

from __future__ import annotations

import hypothesis
import pytest

# no test is timed: on a busy machine any example may take long
hypothesis.settings.register_profile("untimed", deadline=None)
hypothesis.settings.load_profile("untimed")


def pytest_terminal_summary(terminalreporter: pytest.TerminalReporter) -> None:
    tables = {
        str(value)
        for reports in terminalreporter.stats.values()
        for report in reports
        for name, value in getattr(report, "user_properties", ())
        if name == "table"
    }
    for table in sorted(tables):
        terminalreporter.write_line(table)
