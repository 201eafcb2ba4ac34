"""What reading a file left in doubt, gathered with its places."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterable

from retune.errors import Finding, Place, Weight

SHOWN = 8
"""How often one finding is listed for one part; the rest is counted."""


class Log:
    """Findings in the order they were met; the same one many times in a part is counted."""

    def __init__(self, findings: Iterable[Finding] = ()) -> None:
        self._findings = list(findings)
        self._met: Counter[tuple[str | None, Weight, str]] = Counter()

    def add(self, weight: Weight, what: str, where: Place | None = None) -> None:
        """Note one finding."""
        where = where or Place()
        same = (where.part, weight, what)
        self._met[same] += 1
        if self._met[same] <= SHOWN:
            self._findings.append(Finding(weight, what, where))

    def findings(self) -> tuple[Finding, ...]:
        """All that was noted, with one line for each finding that was met too often to list."""
        more = (
            Finding(weight, f"{count - SHOWN} more in this part: {what}", Place(part=part))
            for (part, weight, what), count in self._met.items()
            if count > SHOWN
        )
        return (*self._findings, *more)
