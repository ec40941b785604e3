"""All ways of counting a tide side by side: in hours, in metres, and in the alpha that each would need."""

from __future__ import annotations

from typing import Final, NamedTuple

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.patches import Patch

from tidescour.handoff.design_tables import row_of_largest_share
from tidescour.handoff.records import PlaceResult, RunResults
from tidescour.handoff.results_tables import final_depth_m
from tidescour.report.figures_scour import DEPTH_LABEL, label_height_in
from tidescour.report.style import (
    BLACK,
    GREEN,
    ORANGE,
    PURPLE,
    SKY,
    VERMILION,
    foot_key,
    heading,
    new_figure,
    place_title,
)
from tidescour.scour.records import RULES, Rule

_BAR: Final = 0.16
"""Height of a bar, where a place has 1."""


class _Panel(NamedTuple):
    """What one panel shows: its axis, and what is written behind a bar of it."""

    title: str
    label: str
    words: str


_PANELS: Final = (
    _Panel("hours of the stage with\nthe largest share", "effective duration [h]", "{:.1f} h"),
    _Panel("depth after\nthe last stage", DEPTH_LABEL, "{:.2f} m"),
    _Panel("alpha for the depth of the\nintegral, in the same stage", "disturbance factor alpha [-]", "{:.2f}"),
)

_RULE_LOOKS: Final[dict[Rule, tuple[str, str]]] = {
    "integral": (GREEN, ""),
    "flow-mean": (SKY, "///"),
    "cycle-mean": (ORANGE, "..."),
    "peak-held": (VERMILION, "\\\\\\"),
    "mean-held": (PURPLE, "xxx"),
}


def comparison_figure(results: RunResults) -> Figure:
    """Draw hours, depth and alpha of every place under all five rules; the one that drives is marked."""
    places = results.places
    labels = [place_title(place.place, 24) for place in places]
    figure = new_figure(1.1 + max(label_height_in(labels), 1.15) * len(places))
    heading(figure, f"{results.plan.site.name}: what the way of counting the tide does")
    driving = results.plan.scour.tide
    panels = figure.subplots(1, len(_PANELS), sharey=True)
    for column, (axes, panel) in enumerate(zip(panels, _PANELS, strict=True)):
        values = np.array([[_values(place, rule, driving)[column] for rule in RULES] for place in places])
        _draw_panel(axes, panel, values, driving)
    panels[0].set_yticks(range(len(labels)), labels)
    panels[0].set_ylim(len(places) - 0.45, -0.55)
    foot_key(figure, [_rule_patch(rule, rule == driving) for rule in RULES], columns=len(RULES))
    return figure


def _values(place: PlaceResult, rule: Rule, driving: Rule) -> tuple[float, float, float]:
    """Return hours in the row with the largest share, final depth, and alpha in that row; NaN where there is none."""
    row = row_of_largest_share(place, driving)
    if row is None:
        return 0.0, final_depth_m(place, rule), np.nan
    return row.duration.total_h(rule), final_depth_m(place, rule), row.equal_alpha[RULES.index(rule)]


def _draw_panel(axes: Axes, panel: _Panel, values: np.ndarray, driving: Rule) -> None:
    for position, of_place in enumerate(values):
        for offset, (rule, value) in enumerate(zip(RULES, of_place.tolist(), strict=True)):
            words = "none" if np.isnan(value) else panel.words.format(value)
            at = position + 1.1 * _BAR * (offset - 0.5 * (len(RULES) - 1))
            _draw_bar(axes, at, value, rule, rule == driving, words=words, height=_BAR)
    largest = float(np.nanmax(values, initial=0.0)) if np.any(np.isfinite(values)) else 0.0
    axes.set_xlim(0.0, 1.35 * largest or 1.0)
    axes.set_title(panel.title)
    axes.set_xlabel(panel.label)
    axes.grid(visible=False, axis="y")


def _draw_bar(
    axes: Axes, position: float, value: float, rule: Rule, drives: bool, *, words: str, height: float = 0.24
) -> None:
    """Draw one rule's value as a bar with its number behind it; the rule that drives has a heavy outline."""
    colour, hatch = _RULE_LOOKS[rule]
    axes.barh(
        position,
        np.nan_to_num(value),
        height=height,
        facecolor=colour,
        edgecolor=BLACK,
        hatch=hatch,
        linewidth=2.2 if drives else 0.5,
        zorder=3 if drives else 2,
    )
    axes.annotate(
        words,
        (np.nan_to_num(value), position),
        xytext=(5.0, 0.0),
        textcoords="offset points",
        va="center",
        fontweight="bold" if drives else "normal",
    )


def _rule_patch(rule: Rule, drives: bool) -> Patch:
    """Return how a rule stands in a key."""
    colour, hatch = _RULE_LOOKS[rule]
    label = f"{rule} (drives growth)" if drives else rule
    return Patch(facecolor=colour, edgecolor=BLACK, hatch=hatch, linewidth=2.2 if drives else 0.5, label=label)
