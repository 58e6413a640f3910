#!/usr/bin/python3
"""Writes letters.bin, the outlines that PNG and PDF figures draw their texts with, from DejaVu Sans
(Debian's fonts-dejavu-core 2.37; needs python3-fonttools). Run it in this folder.

The file is a zlib stream of varints (as in encoding/binary): units per em, number of letters; of each
letter its code point, its advance, its number of contours; of each contour its number of points and the
points: a signed x difference to the point before, a signed y difference, and 1 when the point is on the
curve, else 0 for the control point of a quadratic curve (TrueType's way)."""
import zlib

from fontTools.ttLib import TTFont

TEXT = (
    "".join(map(chr, range(0x20, 0x7F))) + "".join(map(chr, range(0xA0, 0x180)))
    + "ΑΒΓΔΕΖΗΘΙΚΛΜΝΞΟΠΡΣΤΥΦΧΨΩαβγδεζηθικλμνξοπρςστυφχψωϕϑ"
    + "₀₁₂₃₄₅₆₇₈₉⁰⁴⁵⁶⁷⁸⁹⁻⁺ᵀ−–—‘’“”„…·•√∞≈≠≤≥∫∂∑∏←→↑↓↔□"
    + "АБВГДЕЖЗИЙКЛМНОПРСТУФХЦЧШЩЪЫЬЭЮЯабвгдежзийклмнопрстуфхцчшщъыьэюяЁёІіЇїЄєҐґ"
)


def varint(n):
    out = bytearray()
    while n >= 0x80:
        out.append(n & 0x7F | 0x80)
        n >>= 7
    out.append(n)
    return bytes(out)


def signed(n):
    return varint(n << 1 if n >= 0 else (-n << 1) - 1)


font = TTFont("/usr/share/fonts/truetype/dejavu/DejaVuSans.ttf")
names, table, advances = font.getBestCmap(), font["glyf"], font["hmtx"]
letters = sorted({ord(c) for c in TEXT} & names.keys())
out = varint(font["head"].unitsPerEm) + varint(len(letters))
for code in letters:
    name = names[code]
    points, ends, on = table[name].getCoordinates(table)[:3]
    out += varint(code) + varint(advances[name][0]) + varint(len(ends))
    first = 0
    x = y = 0
    for end in ends:
        out += varint(end + 1 - first)
        for k in range(first, end + 1):
            px, py = points[k]
            out += signed(px - x) + signed(py - y) + varint(on[k] & 1)
            x, y = px, py
        first = end + 1
open("letters.bin", "wb").write(zlib.compress(bytes(out), 9))
print(len(letters), "letters,", len(out), "bytes")
