"""What a health check finds, a finding for each part of an installation."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass


@dataclass(frozen=True)
class Finding:
    """One part: what it is, whether it is in order, what was found there, and the cure in one sentence ("" if none)."""

    what: str
    ok: bool
    found: str
    cure: str = ""


def finding_lines(findings: Sequence[Finding]) -> list[str]:
    """A line for each finding, and one for its cure; troubles first."""
    lines = []
    for finding in sorted(findings, key=lambda finding: finding.ok):
        lines.append(f"{'In order' if finding.ok else 'Not in order'}: {finding.what}. {finding.found}")
        if finding.cure:
            lines.append(f"    To do: {finding.cure}")
    return lines
