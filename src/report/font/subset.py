"""Makes the two subset fonts again: python3 subset.py LATO_REGULAR.ttf LATO_BOLD.ttf (needs fonttools 4).

Keeps Latin, Greek, punctuation and the signs of the trade; drops shaping, kerning and hinting, which record.pdf does not
use; renames the result, because the licence reserves the original's name.
"""
import sys
from fontTools import subset
from fontTools.ttLib import TTFont

RANGES = [(0x20, 0x7E), (0xA0, 0x17F), (0x218, 0x21B), (0x384, 0x3CE), (0x2010, 0x2015), (0x2018, 0x201E)]
SINGLES = "ẞ•…‰′″‹›⁄€№™Ω∂∆∏∑−√∞∫≈≠≤≥□←↑→↓²³¹½¼¾"
KEPT = "Copyright (c) 2010-2014 by tyPoland Lukasz Dziedzic with Reserved Font Name \"Lato\". " \
       "Licensed under the SIL Open Font License, Version 1.1. Modified: subset and renamed."

for source, weight in zip(sys.argv[1:3], ("Regular", "Bold")):
    font = TTFont(source)
    options = subset.Options()
    options.layout_features, options.hinting, options.notdef_outline, options.glyph_names = [], False, True, False
    options.drop_tables += ["GSUB", "GPOS", "GDEF", "kern", "DSIG", "gasp", "FFTM"]
    options.name_IDs = []
    chooser = subset.Subsetter(options)
    points = {p for low, high in RANGES for p in range(low, high + 1)} | {ord(c) for c in SINGLES}
    chooser.populate(unicodes=points)
    chooser.subset(font)
    name = font["name"]
    name.names = []
    texts = {0: KEPT, 1: "Tubewright Sans", 2: weight, 3: f"Tubewright Sans {weight}, subset 1",
             4: f"Tubewright Sans {weight}", 5: "Version 1.0", 6: f"TubewrightSans-{weight}",
             13: "SIL Open Font License, Version 1.1", 14: "https://openfontlicense.org"}
    for number, text in texts.items():
        name.setName(text, number, 3, 1, 0x409)
    # A fixed date: the same input gives the same bytes.
    font["head"].modified = font["head"].created
    font.recalcTimestamp = False
    font.save(f"TubewrightSans-{weight}.ttf")
