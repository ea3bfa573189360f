"""How each column comes about, in words."""

from __future__ import annotations

from collections.abc import Sequence

from app.wording.amounts import listing


def story(comes_from: Sequence[str], leads_to: Sequence[str], goes_with: Sequence[str]) -> str:
    """One sentence for one column. goes_with: links whose direction nobody settled."""
    parts = []
    if comes_from:
        parts.append(f"comes from {listing(comes_from)}")
    if leads_to:
        parts.append(f"leads to {listing(leads_to)}")
    if goes_with:
        parts.append(f"goes with {listing(goes_with)}")
    return f"{'; '.join(parts)}." if parts else "stands alone: no link of this model touches it."


def strength(points: float) -> str:
    """A change in a share, 0 to 1, in points."""
    if 0 < points < 0.005:
        return "under 1 point"
    rounded = round(100 * points)
    return "1 point" if rounded == 1 else f"{rounded} points"
