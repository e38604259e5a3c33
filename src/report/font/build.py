"""Makes the two font files of this folder: see README.md for the sources and versions."""

import os
import tempfile
import sys

from fontTools import merge, subset
from fontTools.ttLib import TTFont

FOLDER = "/usr/share/fonts/truetype/noto/"
TEXT = (
    "U+0020-007E,U+00A0-00FF,U+0131,U+0391-03A1,U+03A3-03A9,U+03B1-03C9,U+2010-2015,"
    "U+2018-201A,U+201C-201E,U+2020,U+2022,U+2026,U+2030,U+2032,U+2033,U+2070,U+2071,"
    "U+2074-208E,U+2090-209C"
)
# Noto Sans has no mathematical signs; Noto Sans Math is drawn to go with it.
SIGNS = "U+2190-2193,U+2202,U+2206,U+2211,U+2212,U+221A,U+221E,U+2248,U+2260,U+2264,U+2265"
FAMILY = "Underwind Sans"


def cut(path, unicodes):
    options = subset.Options()
    options.layout_features = []
    options.hinting = False
    options.name_IDs = [0, 1, 2, 3, 4, 5, 6, 13, 14]
    font = subset.load_font(path, options)
    worker = subset.Subsetter(options)
    worker.populate(unicodes=subset.parse_unicodes(unicodes))
    worker.subset(font)
    for table in ("GDEF", "GPOS", "GSUB", "gasp", "MATH", "STAT", "prep"):
        if table in font:
            del font[table]
    return font


def rename(font, style):
    names = font["name"]
    for record in list(names.names):
        new = {
            1: FAMILY,
            2: style,
            3: f"{FAMILY} {style}; from Noto Sans and Noto Sans Math",
            4: f"{FAMILY} {style}",
            6: f"{FAMILY.replace(' ', '')}-{style}",
        }.get(record.nameID)
        if new:
            names.setName(new, record.nameID, record.platformID, record.platEncID, record.langID)


for style in ("Regular", "Bold"):
    parts = []
    for number, (name, codes) in enumerate(((f"NotoSans-{style}.ttf", TEXT), ("NotoSansMath-Regular.ttf", SIGNS))):
        part = os.path.join(tempfile.gettempdir(), f"part{number}.ttf")
        cut(FOLDER + name, codes).save(part)
        parts.append(part)
    font = merge.Merger().merge(parts)
    rename(font, style)
    # The same bytes every time: the merger and the writer stamp the clock.
    font["head"].created = font["head"].modified = TTFont(f"{FOLDER}NotoSans-{style}.ttf")["head"].created
    font.recalcTimestamp = False
    font.save(f"{style.lower()}.ttf")
    font.flavor = "woff2"
    font.save(f"{style.lower()}.woff2")
    sys.stdout.write(f"{style}: {len(font.getBestCmap())} characters\n")
