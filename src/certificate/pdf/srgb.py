"""Make srgb.icc beside this script: a small sRGB display profile (ICC version 2) from public numbers.

    python srgb.py              # standard library only

Primaries, white point and transfer curve: IEC 61966-2-1. Adaptation to the profile connection
space's D50 white: linear Bradford, as ICC.1 describes. The profile is released under CC0.
"""

import struct

D50 = (0.9642, 1.0, 0.8249)
D65 = (0.3127, 0.3290)
PRIMARIES = ((0.64, 0.33), (0.30, 0.60), (0.15, 0.06))
BRADFORD = ((0.8951, 0.2664, -0.1614), (-0.7502, 1.7135, 0.0367), (0.0389, -0.0685, 1.0296))


def xyz(x, y):
    return (x / y, 1.0, (1 - x - y) / y)


def apply(m, v):
    return tuple(sum(a * b for a, b in zip(row, v)) for row in m)


def product(a, b):
    return tuple(tuple(sum(a[i][k] * b[k][j] for k in range(3)) for j in range(3)) for i in range(3))


def inverse(m):
    (a, b, c), (d, e, f), (g, h, i) = m
    det = a * (e * i - f * h) - b * (d * i - f * g) + c * (d * h - e * g)
    rows = (
        (e * i - f * h, c * h - b * i, b * f - c * e),
        (f * g - d * i, a * i - c * g, c * d - a * f),
        (d * h - e * g, b * g - a * h, a * e - b * d),
    )
    return tuple(tuple(x / det for x in row) for row in rows)


def colorants():
    columns = [xyz(*p) for p in PRIMARIES]
    matrix = tuple(tuple(c[r] for c in columns) for r in range(3))
    white = xyz(*D65)
    scale = apply(inverse(matrix), white)
    matrix = tuple(tuple(matrix[r][c] * scale[c] for c in range(3)) for r in range(3))
    cone = [a / b for a, b in zip(apply(BRADFORD, D50), apply(BRADFORD, white))]
    diagonal = tuple(tuple(cone[i] if i == j else 0.0 for j in range(3)) for i in range(3))
    adapt = product(inverse(BRADFORD), product(diagonal, BRADFORD))
    matrix = product(adapt, matrix)
    return [tuple(matrix[r][c] for r in range(3)) for c in range(3)]


def fixed(v):
    return struct.pack(">i", round(v * 65536))


def transfer(v):
    return v / 12.92 if v <= 0.04045 else ((v + 0.055) / 1.055) ** 2.4


def main():
    point = lambda v: b"XYZ \0\0\0\0" + b"".join(fixed(x) for x in v)
    name = b"sRGB (IEC 61966-2-1)\0"
    desc = b"desc\0\0\0\0" + struct.pack(">I", len(name)) + name + bytes(8) + bytes(3 + 67)
    curve = [round(transfer(i / 255) * 65535) for i in range(256)]
    trc = b"curv\0\0\0\0" + struct.pack(">I", 256) + struct.pack(">256H", *curve)
    red, green, blue = colorants()
    data = [
        (b"desc", desc), (b"cprt", b"text\0\0\0\0CC0 1.0, no rights reserved\0"), (b"wtpt", point(D50)),
        (b"rXYZ", point(red)), (b"gXYZ", point(green)), (b"bXYZ", point(blue)),
        (b"rTRC", trc), (b"gTRC", trc), (b"bTRC", trc),
    ]
    offset = 128 + 4 + 12 * len(data)
    table, body, seen = b"", b"", {}
    for tag, content in data:
        if content not in seen:
            seen[content] = offset + len(body)
            body += content + bytes(-len(content) % 4)
        table += tag + struct.pack(">II", seen[content], len(content))
    size = offset + len(body)
    header = struct.pack(
        ">I4sI4s4s4s6H4s4sI4sIQI", size, b"\0\0\0\0", 0x02100000, b"mntr", b"RGB ", b"XYZ ",
        2026, 1, 1, 0, 0, 0, b"acsp", b"\0\0\0\0", 0, b"\0\0\0\0", 0, 0, 0,
    ) + b"".join(fixed(x) for x in D50)
    header += bytes(128 - len(header))
    with open("srgb.icc", "wb") as out:
        out.write(header + struct.pack(">I", len(data)) + table + body)
    print(size, [tuple(round(x, 5) for x in c) for c in (red, green, blue)])


main()
