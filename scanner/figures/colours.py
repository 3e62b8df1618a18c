"""The colours of everything that is drawn, told apart by all kinds of colour vision; loads no library."""

from __future__ import annotations

# Eight colours for all kinds of colour vision: Wong, Nature Methods 8:441, 2011.
BLUE, ORANGE, GREEN, VERMILION, SKY, PURPLE, YELLOW = (
    "#0072B2", "#E69F00", "#009E73", "#D55E00", "#56B4E9", "#CC79A7", "#F0E442",
)  # fmt: skip
CYCLE = (BLUE, VERMILION, GREEN, PURPLE, ORANGE, SKY, "black", YELLOW)
GREY = "#8C8C8C"
VERDICT_COLOURS = {
    "regular_rotational": BLUE,
    "regular_librational": GREEN,
    "chaotic": VERMILION,
    "undecided": "black",
}
COLOUR_MAP = "viridis"

MISSING = {
    "not_convex": ("#E6E6E6", "#B4B4B4", "////"),
    "failed": ("#F6DED1", VERMILION, "xxxx"),
    "pending": ("white", "#C8C8C8", "...."),
}
"""Face, edge and hatch by which a table without numbers is marked, by its status."""
