"""Shares, points and intervals in words, so that no figure contradicts the one beside it."""

from __future__ import annotations

from dataclasses import dataclass

MINUS = "−"
CERTAIN = 1e-9  # a share this close to none or all is none or all: the rest is rounding of sums


def share(part: float, decimals: int = 0) -> str:
    """A share, 0 to 1, in per cent; what is not quite none or all is said so."""
    if part <= CERTAIN:
        return "0%"
    if part >= 1 - CERTAIN:
        return "100%"
    least = 10.0**-decimals
    figure = 100 * part
    if figure < least:
        return f"under {_number(least, decimals)}%"
    if figure > 100 - least:
        return f"over {_number(100 - least, decimals)}%"
    return f"{_number(figure, decimals)}%"


def column_figure(part: float) -> str:
    """A share in a narrow column of per cent: 54, <1, >99."""
    return share(part).removesuffix("%").replace("under ", "<").replace("over ", ">")


def signed(points: float, decimals: int = 0) -> str:
    """Points with their sign, U+2212 for minus; 0 without one."""
    text = _number(abs(points), decimals)
    if float(text) == 0:
        return "0"
    return f"{MINUS if points < 0 else '+'}{text}"


def points(change: float, decimals: int = 0) -> str:
    """A difference of shares, in points: +9 points, −1 point."""
    text = signed(change, decimals)
    return f"{text} {'point' if text in ('+1', f'{MINUS}1') else 'points'}"


def span(low: float, high: float, decimals: int = 0) -> str:
    """An interval of shares, in per cent: 59% to 63%."""
    return f"{share(low, decimals)} to {share(high, decimals)}"


def signed_span(low: float, high: float, decimals: int = 0) -> str:
    """An interval of points: +1 to +17."""
    return f"{signed(low, decimals)} to {signed(high, decimals)}"


@dataclass(frozen=True)
class Between:
    """From one figure to another, with the interval of the change."""

    start: float
    end: float
    low: float
    high: float

    @property
    def moves(self) -> bool:
        """Whether the interval leaves 0 out."""
        return self.low > 0 or self.high < 0

    @property
    def still(self) -> bool:
        """Whether nothing changes, in this model and beyond doubt."""
        return self.known and self.start == self.end

    @property
    def known(self) -> bool:
        """Whether the change is a point, known without doubt in this model."""
        return self.low == self.high


@dataclass(frozen=True)
class Change(Between):
    """From one share to another, with the interval of the change: shares 0 to 1.

    The words agree with each other: when the change does not come out of the rounded ends, or whole figures cannot
    show the width of the interval or that it leaves 0 out, all get one decimal.
    """

    @property
    def decimals(self) -> int:
        ends = share(self.start), share(self.end)
        worded = any(end.startswith(("under", "over")) for end in ends)
        if not worded and round(_figure(ends[1]) - _figure(ends[0])) != float(_plain(self.end - self.start, 0)):
            return 1
        low, high = signed(100 * self.low), signed(100 * self.high)
        flat = not self.known and (low == high or (self.moves and "0" in (low, high)))
        return int(flat or (self.moves and ends[0] == ends[1]))

    @property
    def ends(self) -> tuple[str, str]:
        return share(self.start, self.decimals), share(self.end, self.decimals)

    @property
    def difference(self) -> str:
        """In points; at one decimal it is the difference of the rounded ends, so that a reader's sum agrees."""
        start, end = self.ends
        if self.decimals and not any(each.startswith(("under", "over")) for each in (start, end)):
            return points(_figure(end) - _figure(start), 1)
        return points(100 * (self.end - self.start), self.decimals)

    @property
    def interval(self) -> str:
        return signed_span(100 * self.low, 100 * self.high, self.decimals)


def counted(held: int, rows: int, small: int) -> str:
    """A count among others; neither it nor what it leaves is given away under the small-count limit."""
    if 0 < held < small:
        return f"under {small} of {rows:,}"
    if 0 < rows - held < small:
        return f"all but under {small} of {rows:,}"
    return f"{held:,} of {rows:,}"


def gives_away(part: int, whole: int, small: int) -> bool:
    """Whether a count tells a small one: its own, or that of those it leaves out of a known whole."""
    return 0 < part < small or 0 < whole - part < small


def matching_of(number: int, whole: int, small: int, told: bool = True) -> str:
    """The records that match, of all: 412 of 1,847 records. told: whether their number may be."""
    if not told and not gives_away(number, whole, small):
        return "number not shown"
    return f"{counted(number, whole, small)} records"


def records(number: int, small: int, whole: int = 0, told: bool = True) -> str:
    """A number of records: 412 records, 1 record, under 10 records; of a known whole all but under 10 records.

    told: whether the number may be, where it is not small itself.
    """
    if 0 < whole - number < small:
        return f"all but under {small} records"
    if not told and number >= small:
        return "number not shown"
    said = f"under {small}" if 0 < number < small else f"{number:,}"
    return f"{said} {'record' if number == 1 and small <= 1 else 'records'}"


def _figure(text: str) -> float:
    return float(text.removesuffix("%").split()[-1])


def _plain(change: float, decimals: int) -> str:
    return signed(100 * change, decimals).replace(MINUS, "-")


def _number(value: float, decimals: int) -> str:
    """Halves are rounded away from zero, as a reader rounds; the hair is for halves that binary numbers miss."""
    scale = 10**decimals
    whole = int(abs(value) * scale + 0.5 + 1e-9)
    return f"{whole / scale:,.{decimals}f}"
