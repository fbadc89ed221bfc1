"""What all tests share: a headless canvas, and no silent skips in the full check."""

import os

import matplotlib as mpl

mpl.use("Agg")


def pytest_sessionfinish(session, exitstatus):
    reporter = session.config.pluginmanager.get_plugin("terminalreporter")
    skipped = reporter.stats.get("skipped", []) if reporter else []
    if skipped and os.environ.get("GLEY_NO_SKIPS") and exitstatus == 0:
        session.exitstatus = 1
        reporter.write_line(f"{len(skipped)} skipped test(s): in the full check a skip is a failure", red=True)
