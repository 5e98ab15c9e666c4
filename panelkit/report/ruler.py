"""The headline as a ruler: the figure and its interval between guess and perfect."""

import math

from markupsafe import Markup

__all__ = ["ruler"]

WIDTH, HEIGHT = 320, 46
LEFT, RIGHT, LINE = 10, 310, 20
LOWEST = -1.0  # a figure far below guessing is drawn at the edge


def ruler(metric: float, low: float, high: float, no_skill: float) -> Markup:
    """Return a small drawing of an accuracy.

    Parameters
    ----------
    metric, low, high : float
        The figure with its interval, NaN where there is none; 1 is perfect.
    no_skill : float
        Where the scale starts, unless something lies below.

    Returns
    -------
    Markup
        An ``svg`` element for the page; empty without a figure.
    """
    if not math.isfinite(metric):
        return Markup("")
    ends = [end for end in (metric, low, high) if math.isfinite(end)]
    start = no_skill
    if min(ends) < no_skill:
        start = min(0.0, math.floor(10 * min(ends)) / 10) if no_skill <= 0.0 else 0.0
    start = max(start, LOWEST)

    def place(value: float) -> str:
        share = (min(max(value, start), 1.0) - start) / (1.0 - start)
        return f"{LEFT + share * (RIGHT - LEFT):.1f}"

    parts = [
        f'<line x1="{LEFT}" x2="{RIGHT}" y1="{LINE}" y2="{LINE}" class="scale"/>',
    ]
    for step in range(round(start * 10), 11):
        at = place(step / 10)
        tall = 6 if step in (0, 5, 10) else 3
        parts.append(
            f'<line x1="{at}" x2="{at}" y1="{LINE - tall}" y2="{LINE + tall}" '
            'class="scale"/>'
        )
    for value, label, anchor in _labels(start, no_skill):
        parts.append(
            f'<text x="{place(value)}" y="{HEIGHT - 4}" text-anchor="{anchor}">'
            f"{label}</text>"
        )
    if math.isfinite(low) and math.isfinite(high):
        parts.append(
            f'<line x1="{place(low)}" x2="{place(high)}" y1="{LINE}" y2="{LINE}" '
            'class="band"/>'
        )
    parts.append(
        f'<path d="M{place(metric)} {LINE - 11}l6 11l-6 11l-6 -11Z" class="point"/>'
    )
    return Markup(
        f'<svg class="ruler" viewBox="0 0 {WIDTH} {HEIGHT}" aria-hidden="true">'
        f"{''.join(parts)}</svg>"
    )


def _labels(start: float, no_skill: float) -> tuple[tuple[float, str, str], ...]:
    perfect = (1.0, "1 perfect", "end")
    guess = f"{no_skill:g} guessing"
    if start == no_skill:
        return (no_skill, guess, "start"), perfect
    return (start, f"{start:g}", "start"), (no_skill, guess, "middle"), perfect
