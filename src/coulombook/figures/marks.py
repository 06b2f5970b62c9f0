"""How things are told apart: ids of marks, and the colour, hatch and marker of each product and catalyst.

Colours are of the palette of Okabe & Ito (2008), which colour-blind readers tell apart, with a grey; hatches and
markers tell the same without any colour.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from hashlib import sha256
from itertools import product as every
from urllib.parse import quote

Marker = str | tuple[int, int, int]

GREY, BLACK = "#BBBBBB", "#222222"
BLUE, SKY, GREEN, YELLOW = "#0072B2", "#56B4E9", "#009E73", "#F0E442"
ORANGE, VERMILION, PURPLE = "#E69F00", "#D55E00", "#CC79A7"
_COLOURS = (BLUE, ORANGE, GREEN, PURPLE, SKY, VERMILION, YELLOW)
# lines alone: a dotted tile is a quarter of a megabyte of circles in an SVG
_LEAN = ("////", "\\\\\\\\", "xxxx", "----", "||||", "++++")
_HATCHES = (*_LEAN, *(one[:2] for one in _LEAN), "//--", "\\\\||", "//||", "\\\\--")


@dataclass(frozen=True, slots=True)
class Style:
    """What a product or a catalyst is drawn with."""

    colour: str
    hatch: str
    marker: Marker


# products that days have, each with a hatch of its own, neighbours in a stack with colours far apart
_PRODUCTS = {
    "hydrogen": Style(GREY, "", "o"),
    "carbon monoxide": Style(VERMILION, "////", "s"),
    "methane": Style(ORANGE, "----", "^"),
    "formate": Style(YELLOW, "\\\\\\\\", "D"),
    "methanol": Style(ORANGE, "||", (5, 0, 0)),
    "ethylene": Style(BLUE, "xx", "v"),
    "ethane": Style(PURPLE, "--", "<"),
    "ethanol": Style(SKY, "||||", "P"),
    "acetate": Style(GREEN, "//", "X"),
    "acetaldehyde": Style(PURPLE, "\\\\", ">"),
    "n-propanol": Style(GREEN, "++++", "h"),
    "allyl alcohol": Style(SKY, "xxxx", (4, 1, 0)),
    "propionaldehyde": Style(VERMILION, "++", (5, 1, 0)),
    "acetone": Style(YELLOW, "//--", "d"),
    "propylene": Style(BLUE, "\\\\||", (3, 1, 0)),
}
_HELD = {(one.colour, one.hatch) for one in _PRODUCTS.values()}
# the bare grey is hydrogen's alone; hatches outside, so that neighbours in the list differ in colour
_FREE = tuple((colour, hatch) for hatch, colour in every(_HATCHES, _COLOURS) if (colour, hatch) not in _HELD)
# polygons, stars and crosses by number of corners, shape and turn
_MARKERS: tuple[Marker, ...] = tuple(
    (corners, shape, turn) for turn in (0, 30, 45) for corners in (3, 4, 5, 6, 7) for shape in (0, 1)
)
_RARE = (
    "acetylene", "propane", "propyne", "butane", "1-butene", "formaldehyde", "isopropanol", "propionate",
    "ethylene glycol", "glyoxal", "glycolaldehyde", "hydroxyacetone", "methylglyoxal", "glycolate", "glyoxylate",
    "lactate", "oxalate", "n-butanol", "butyraldehyde",
)  # fmt: skip
_PRODUCTS |= {name: Style(*_FREE[place], _MARKERS[place]) for place, name in enumerate(_RARE)}
_LEFT = _FREE[len(_RARE) :]
_CATALYSTS = tuple(
    Style(colour, hatch, marker)
    for colour, hatch, marker in zip(
        (BLUE, VERMILION, GREEN, PURPLE, ORANGE, SKY, BLACK),
        ("", "////", "++++", "xxxx", "\\\\\\\\", "----", "||||"),
        ("o", "s", "^", "D", "v", "P", "X"),
        strict=True,
    )
)


def style_of_product(name: str) -> Style:
    """The one style of a product, whatever the day; one that no table knows gets its own by its name.

    >>> style_of_product("ethylene").colour, style_of_product("new") == style_of_product("new")
    ('#0072B2', True)
    """
    known = _PRODUCTS.get(name)
    if known is not None:
        return known
    # of the name alone, so that other products of the day do not change it
    drawn = int.from_bytes(sha256(name.encode("utf-8", "surrogatepass")).digest()[:8], "big")
    colour, hatch = _LEFT[drawn % len(_LEFT)]
    return Style(colour, hatch, _MARKERS[drawn // len(_LEFT) % len(_MARKERS)])


def styles_of_catalysts(names: Sequence[str]) -> dict[str, Style]:
    """A style for each catalyst of a book, by its place there; colours and markers turn at different paces."""
    found = {}
    for place, name in enumerate(dict.fromkeys(names)):
        turn, at = divmod(place, len(_CATALYSTS))
        marker = _CATALYSTS[(at + turn) % len(_CATALYSTS)].marker
        found[name] = Style(_CATALYSTS[at].colour, _CATALYSTS[at].hatch, marker)
    return found


def mark_id(*parts: str) -> str:
    """The id of a mark: its parts with colons between, everything but letters, digits and ``_.-~`` per cent encoded.

    >>> mark_id("fe", "copper mesh", "-1.36", "hydrogen")
    'fe:copper%20mesh:-1.36:hydrogen'
    """
    return ":".join(quote(part, safe="", errors="surrogatepass") for part in parts)
