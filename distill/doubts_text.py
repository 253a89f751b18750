"""What the main job prints on where the case is not right."""

from __future__ import annotations

from thumbwright.distill.columns import columns
from thumbwright.distill.findings import Findings

SHORT = (("wrong_given_plus", 3), ("wrong_given_minus", 3), ("mean_step", 1), ("risk", 4))
"""Figures that are printed, with their digits."""


def doubts_text(findings: Findings) -> list[str]:
    """Lines: rule, full calculation and nobody looked at, where the case is not right."""
    if not findings.doubts:
        return [*findings.not_doubted]
    head = ("where the case is not right", "wrong if plus", "wrong if minus", "mean step", "risk")
    rows: list[tuple[str, ...]] = [(*head, "")]
    for one in findings.doubts:
        cells = []
        for name, digits in SHORT:
            found = [getattr(way, name) for way in (one.rule, one.exact, one.alone)]
            known = [f"{number:.{digits}f}" for number in found if number is not None]
            cells.append(" / ".join(known))
        remark = "better to look at nobody" if one.harms else ""
        rows.append((one.says, *cells, remark if one.is_exact else f"{remark} *".strip()))
    name = next(iter(findings.forms))
    said = f"(in each cell: {name} / full calculation under the wrong assumption / nobody looked at"
    if any(not one.is_exact for one in findings.doubts):
        said += "; * rests on the off-model convention and is not exact"
    return ["", *columns(rows, right=range(1, 5)), f"{said})", *findings.not_doubted]
