"""Prints how many published numbers the handbook suite reaches."""

from handbook.casebook import all_checks


def pytest_terminal_summary(terminalreporter):
    checks = list(all_checks())
    published = [each for each in checks if "published" in each.data]
    reached = [each for each in published if not each.left_out]
    terminalreporter.write_line(
        f"handbook: {len(reached)} of {len(published)} published numbers checked, {len(published) - len(reached)} left out "
        f"with the reason, {len(checks) - len(published)} own figures, {sum(bool(e.defect) for e in checks)} known defects"
    )
