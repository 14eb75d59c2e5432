"""Make the two subset weights beside this script from the published font files.

    pip install fonttools==4.68.0 fontpkg-alegreya-sans==2.4
    python subset.py            # run in this folder

Keeps the letters of European languages (Latin, Greek, Cyrillic), figures, punctuation, units and
operators; drops layout features, hints, and every character that draws nothing of its own or
draws over its neighbour (controls, joiners, combining marks), so that the program reports those.
Default figures become the tabular lining ones, so that columns of numbers line up.
"""

from importlib.resources import files

from fontTools.subset import Options, Subsetter
from fontTools.ttLib import TTFont

KEEP = [
    (0x0020, 0x007E), (0x00A0, 0x00AC), (0x00AE, 0x024F), (0x0259, 0x0259),
    (0x0384, 0x03FF), (0x0400, 0x052F), (0x1E00, 0x1EFF),
    (0x2010, 0x2027), (0x2030, 0x205E), (0x2070, 0x209C), (0x20A0, 0x20BF),
    (0x2100, 0x214F), (0x2153, 0x215E), (0x2190, 0x2199), (0x2200, 0x22FF), (0x25A0, 0x25FF),
]
DROP = set(range(0x2028, 0x2030)) | {0x00AD, 0x034F} | set(range(0x0483, 0x048A))


def figures(font):
    """From the default figure glyphs to tabular lining ones, by the font's own features."""
    gsub = font["GSUB"].table
    mapping = {}
    for tag in ("lnum", "tnum"):
        lookups = {
            index
            for record in gsub.FeatureList.FeatureRecord
            if record.FeatureTag == tag
            for index in record.Feature.LookupListIndex
        }
        for index in sorted(lookups):
            for table in gsub.LookupList.Lookup[index].SubTable:
                table = getattr(table, "ExtSubTable", table)
                for glyph, other in getattr(table, "mapping", {}).items():
                    if isinstance(other, str):
                        mapping.setdefault(tag, {})[glyph] = other
    return lambda glyph: mapping["tnum"].get(
        mapping["lnum"].get(glyph, glyph), mapping["lnum"].get(glyph, glyph)
    )


def main():
    folder = files("fontpkg_alegreya_sans") / "files"
    for weight in ("Regular", "Bold"):
        font = TTFont(folder / f"AlegreyaSans-{weight}.ttf", recalcTimestamp=False)
        to_figure = figures(font)
        for table in font["cmap"].tables:
            for code in range(ord("0"), ord("9") + 1):
                if code in table.cmap:
                    table.cmap[code] = to_figure(table.cmap[code])
        options = Options()
        options.hinting = False
        options.layout_features = []
        options.name_IDs = [0, 1, 2, 4, 6, 13, 14]
        options.notdef_outline = True
        options.drop_tables += ["GSUB", "GPOS", "GDEF", "DSIG", "STAT", "gasp", "MATH"]
        subsetter = Subsetter(options)
        wanted = {c for low, high in KEEP for c in range(low, high + 1)} - DROP
        widths = font["hmtx"].metrics
        cmap = font.getBestCmap()
        subsetter.populate(unicodes={c for c in wanted if c in cmap and widths[cmap[c]][0] > 0})
        subsetter.subset(font)
        font.save(f"AlegreyaSans-{weight}.subset.ttf")
        cmap = font.getBestCmap()
        print(weight, len(cmap), {font["hmtx"].metrics[cmap[c]][0] for c in range(48, 58)})


main()
