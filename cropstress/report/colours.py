"""Colours that colour-blind readers and a grey printer can tell apart.

Five steps each, evenly spaced in CIE lightness (84, 67, 50, 34, 16; at least 15 apart also in simulated
dichromacy, which a test holds). Chosen here in CIE LCh, hue turning from step to step.
"""

from __future__ import annotations

#: Yellow ochre to dark brown: what heat costs.
LOSS = ("#E7D17E", "#D79730", "#BD5E1B", "#8E3014", "#461813")

#: Pale mauve to dark wine red: counts and sums of heat.
HEAT = ("#EFC5E8", "#DE89B7", "#BF5380", "#8D2A51", "#491228")

#: Pale to dark blue: dates and amounts that are neither good nor bad.
NEUTRAL = ("#ACDAD9", "#64AFBC", "#34819C", "#0D5578", "#112843")

#: Four causes in the order of `CAUSES`, apart in hue and in lightness (80, 64, 46, 26).
CAUSE = ("#EAC252", "#0AA8D1", "#BC462E", "#433176")

#: Hatching of the four causes, so that they stay apart where hue is lost.
CAUSE_HATCH = ("", "....", "////", "xxxx")

#: Lines of up to five curves, apart in lightness.
LINES = ("#112843", "#34819C", "#D79730", "#8E3014", "#BF5380")

NONE = "#FFFFFF"
NO_CROP = "#E9E9E9"
BLANK = "#FFFFFF"
INK = "#222222"
PALE_INK = "#8A8A8A"
