"""What ``--verbose`` tells of each file, beside the report."""

from overlapse.lint.engine import FileAudit
from overlapse.lint.reports.lines import one_line


def told(audit: FileAudit, seconds: float) -> str:
    """One line: what the file was read as and why, its label, its settings, the time it took.

    seconds: time between the audit of the file before and this one.
    """
    if audit.problem:
        return one_line(audit.problem)
    facts = []
    if audit.passed_over:
        facts.append("passed over, no layout recognised")
    elif audit.layout:
        # The reason is not kept where the file was judged in another process or at another time.
        reason = f" ({audit.document.reason})" if audit.document is not None else ""
        facts.append(f"layout {audit.layout}{reason}")
    if audit.label:
        facts.append(f"label {audit.label} from {audit.label_from}")
    if audit.settings.origin is not None:
        facts.append(f"settings of {audit.settings.origin}")
    count = len(audit.findings)
    facts.append(f"{count} finding{'' if count == 1 else 's'}")
    facts.append(f"{1e3 * seconds:.0f} ms")
    return one_line(f"{audit.path}: {'; '.join(facts)}")
