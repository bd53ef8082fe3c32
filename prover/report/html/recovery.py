"""How long power-up states take to become good, as a plot: half-cycles to the right, states upward.

The scale of states is logarithmic, since a few slow ones among a million quick ones are what is looked for.
"""

from __future__ import annotations

from collections.abc import Sequence
from math import log10

from prover.report import words
from prover.report.html.markup import Markup, element, joined, number

WIDTH, HEIGHT = 560, 170
"""Pixels of the plot without its scales."""

LEFT, TOP, BELOW = 64, 20, 44
MOST_BARS = 56
BROADEST = 26
"""Pixels of a half-cycle at most."""

Pairs = Sequence[tuple[int, int]]
"""Half-cycles, and how many states need them."""


def summary(recovery: Pairs, total: int) -> str:
    """The plot in words. `total` are all power-up states, those that never become good among them."""
    at_once = sum(count for needed, count in recovery if needed == 0)
    told = [f"Of {words.plural(total, 'power-up state')}, {at_once} {_are(at_once)} good from the start"]
    good = sum(count for _, count in recovery)
    if recovery and recovery[-1][0] > 0:
        needed, count = recovery[-1]
        if _median(recovery) > 0:
            median = words.plural(_median(recovery), "half-cycle")
            told.append(f"half of those that become good need at most {median}")
        need = f"need{'s' * (count == 1)} {words.plural(needed, 'half-cycle')}"
        told.append(f"the slowest {need} ({words.plural(count, 'state')})")
    if good < total:
        told.append(f"{total - good} never become{'s' * (total - good == 1)} good")
    return "; ".join(told) + "."


def _are(count: int) -> str:
    return "is" if count == 1 else "are"


def _median(recovery: Pairs) -> int:
    half = (sum(count for _, count in recovery) + 1) // 2
    for needed, count in recovery:
        half -= count
        if half <= 0:
            return needed
    return 0


def bars(recovery: Pairs) -> list[tuple[int, int, int]]:
    """First and last half-cycle of each bar, and the states in it: one a half-cycle while there is room."""
    worst = recovery[-1][0]
    size = -(-(worst + 1) // MOST_BARS)
    counts: dict[int, int] = {}
    for needed, count in recovery:
        counts[needed // size] = counts.get(needed // size, 0) + count
    return [(size * place, size * (place + 1) - 1, count) for place, count in sorted(counts.items())]


def plot(recovery: Pairs, total: int, within: int | None, key: str) -> Markup:
    """The plot; `within` is the limit that the user claims, in half-cycles."""
    shown = bars(recovery)
    size = shown[0][1] - shown[0][0] + 1
    end = shown[-1][1] + 1
    if within is not None and end <= within <= 2 * end:
        end = within + 1
    scale = min(WIDTH / end, BROADEST)
    width = end * scale
    decades = len(str(max(count for _, _, count in shown)))
    rise = HEIGHT / (log10(max(count for _, _, count in shown)) + 1.15)
    parts: list[Markup] = []
    for power in range(decades + 1):
        y = TOP + HEIGHT - power * rise
        # One state stands a decade above none, for the logarithm of none is nowhere.
        parts.append(element("path", d=f"M{LEFT} {number(y)}h{number(width)}", class_="grid"))
        label = "0" if power == 0 else words.digits(10 ** (power - 1))
        parts.append(element("text", label, x=LEFT - 8, y=y + 4, class_="scale end"))
    for first, last, count in shown:
        height = rise * (log10(count) + 1) if count else 0
        x, across = LEFT + first * scale, max(1.5, (last + 1 - first) * scale - 1)
        told = f"{first}" if size == 1 else f"{first} to {last}"
        bar = element(
            "rect",
            element("title", f"{told} half-cycles: {words.plural(count, 'state')}"),
            x=x,
            y=TOP + HEIGHT - height,
            width=across,
            height=height,
            class_="bar",
        )
        parts.append(bar)
    parts += _scale(end, scale)
    if within is not None and within < end:
        place = number(LEFT + (within + 1) * scale)
        parts.append(element("path", d=f"M{place} {TOP - 6}V{TOP + HEIGHT + 4}", class_="limit"))
        parts.append(
            element(
                "text", f"limit {within}", x=LEFT + (within + 1) * scale - 5, y=TOP + 4, class_="scale end"
            )
        )
    told = summary(recovery, total)
    below = "half-cycles until good" + (f", {size} a bar" if size > 1 else "")
    parts.append(element("text", below, x=LEFT, y=TOP + HEIGHT + 36, class_="scale start"))
    parts.append(element("text", "states, log scale", x=0, y=TOP - 8, class_="scale start"))
    picture = element(
        "svg",
        element("title", "States by the half-cycles that they need until they are good", id=f"{key}-title"),
        element("desc", told, id=f"{key}-desc"),
        joined(parts),
        role="img",
        class_="plot",
        width=LEFT + max(width, 180) + 16,
        height=TOP + HEIGHT + BELOW,
        viewBox=f"0 0 {number(LEFT + max(width, 180) + 16)} {TOP + HEIGHT + BELOW}",
        aria_labelledby=f"{key}-title",
        aria_describedby=f"{key}-desc",
    )
    return element("div", picture, class_="strip", tabindex=0, role="group", aria_label="Recovery time")


def _scale(end: int, scale: float) -> list[Markup]:
    """Marks below the plot at round numbers of half-cycles."""
    step = 1
    while end / step > 12:
        step = step * 5 // 2 if str(step).startswith("2") else step * 2
    parts = []
    for at in range(0, end, step):
        x = LEFT + (at + 0.5) * scale if scale > 4 else LEFT + at * scale
        parts.append(element("text", words.digits(at), x=x, y=TOP + HEIGHT + 16, class_="scale"))
    return parts
