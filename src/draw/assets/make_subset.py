#!/usr/bin/env python3
"""Makes the font subset of the figures; run once, by hand, when the set of characters changes.

    apt-get download fonts-inter-variable && dpkg -x fonts-inter-variable_*.deb x
    pip install fonttools brotli
    python3 make_subset.py x/usr/share/fonts/truetype/inter-vf/Inter-roman.var.ttf

Writes, for each of two weights, a `.ttf` (read for its advance widths) and a `.woff2` (the same
glyphs, embedded in each SVG). Kerning and every other layout table are dropped on purpose: the
width of a string is then exactly the sum of its advance widths, in any viewer.
The family is renamed, so that an installed font of the original name never stands in for it.
"""
import sys
from pathlib import Path

from fontTools.subset import Options, Subsetter
from fontTools.ttLib import TTFont
from fontTools.varLib.instancer import instantiateVariableFont

CHARACTERS = (
    list(range(0x20, 0x7F))  # ASCII
    + list(range(0xA0, 0x100))  # Latin-1
    + [0x131, 0x141, 0x142, 0x152, 0x153, 0x160, 0x161, 0x178, 0x17D, 0x17E]
    + [c for c in range(0x391, 0x3CA) if c != 0x3A2]  # Greek capitals and small letters
    + [0x3D1, 0x3D5, 0x3F5]  # theta, phi, epsilon symbols
    + [0x2010, 0x2011, 0x2012, 0x2013, 0x2014, 0x2018, 0x2019, 0x201C, 0x201D, 0x2026, 0x2032]
    + [0x2070, *range(0x2074, 0x208F)]  # superscripts and subscripts
    + [0x2009, 0x202F, 0x2022, 0x2113, 0x2126, 0x2190, 0x2191, 0x2192, 0x2193]
    + [0x2202, 0x2206, 0x2211, 0x2212, 0x221A, 0x221E, 0x2248, 0x2260, 0x2264, 0x2265, 0xFFFD]
)

here = Path(__file__).parent
for name, weight in [("regular", 400), ("semibold", 600)]:
    font = TTFont(sys.argv[1], recalcTimestamp=False)
    axes = {a.axisTag: a.defaultValue for a in font["fvar"].axes}
    axes["wght"] = weight
    font = instantiateVariableFont(font, axes)
    missing = [c for c in CHARACTERS if c not in font.getBestCmap()]
    print(name, "not in the font:", [f"U+{c:04X}" for c in missing])
    options = Options()
    options.hinting = False
    options.layout_features = []
    options.notdef_outline = True
    options.glyph_names = False
    options.name_IDs = [0, 1, 2, 4, 6, 13, 14]
    options.drop_tables += ["STAT", "GDEF", "GSUB", "GPOS", "MVAR", "HVAR", "avar", "gasp", "DSIG"]
    subsetter = Subsetter(options)
    subsetter.populate(unicodes=CHARACTERS)
    subsetter.subset(font)
    for record in list(font["name"].names):
        text = {1: "Figure Sans", 2: "Regular", 4: f"Figure Sans {name}", 6: f"FigureSans-{name}"}
        if record.nameID in text:
            font["name"].setName(
                text[record.nameID], record.nameID, record.platformID, record.platEncID, record.langID
            )
    font.flavor = None
    font.save(here / f"sans-{name}.ttf")
    font.flavor = "woff2"
    font.save(here / f"sans-{name}.woff2")
