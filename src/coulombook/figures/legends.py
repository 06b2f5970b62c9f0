"""Legends that never cover data: below the axes on a sheet of our own, beside them on a reader's."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

from coulombook.figures.sheet import grow, shown, text_width_mm

if TYPE_CHECKING:
    from matplotlib.axes import Axes

_SIZE = 6.5
_LINE_MM = 3.4
_HANDLE_MM = 7.0  # of a handle with its distances


def legend(axes: Axes, handles: Sequence[Any], names: Sequence[str], *, own: bool) -> None:
    """A legend of these handles; ``own`` says that the sheet was made for these axes alone."""
    if not handles:
        return
    labels = [shown(one) for one in names]
    if own:
        figure = axes.figure.get_figure(root=True)
        room = figure.get_figwidth() * 25.4 - 2.0
        widest = max(text_width_mm(one, _SIZE) for one in labels) + _HANDLE_MM
        columns = max(1, min(len(labels), int(room / widest)))
        lines = math.ceil(len(labels) / columns)
        columns = math.ceil(len(labels) / lines)  # as even as it goes
        grow(axes, lines * _LINE_MM + 1.0)
        made = figure.legend(handles, labels, loc="outside lower center", ncols=columns)
    else:
        made = axes.legend(handles, labels, loc="upper left", bbox_to_anchor=(1.01, 1.0))
    for text in made.get_texts():
        text.set_parse_math(False)
