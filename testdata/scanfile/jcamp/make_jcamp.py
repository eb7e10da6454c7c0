"""Writes the JCAMP-DX files of this folder and truth.json, with nothing but the
digit tables of the standard. Run here: python3 make_jcamp.py

The spectrum is invented: 41 emissions, an integer ordinate each, with runs of
equal values, negative ones, a step of four digits and a flat end.
"""

import json
import math

EM = [300 + 2.5 * i for i in range(41)]
Y = [round(5000 * math.exp(-((x - 345) / 18) ** 2)) - 12 for x in EM]
Y[0:4] = [-7, -7, -7, 0]
Y[38:41] = [-12, -12, -12]
FACTOR = 0.25

SQZ = "@ABCDEFGHI", "@abcdefghi"
DIF = "%JKLMNOPQR", "%jklmnopqr"
DUP = " STUVWXYZs"


def coded(v, table):
    text = str(abs(v))
    return table[v < 0][int(text[0])] + text[1:]


def lines(encode, checks):
    """Cuts Y into lines of at most ten ordinates, each after its abscissa."""
    out, i = [], 0
    while i < len(Y):
        part = Y[i:i + 10]
        start = i - 1 if checks and i else i
        body = encode(([Y[i - 1]] if checks and i else []) + part)
        out.append(f"{EM[start]:g}{body}")
        i += 10
    if checks:
        out.append(f"{EM[-1]:g}{coded(Y[-1], SQZ)}")
    return out


def affn(part):
    return "".join(f" {v}" for v in part)


def pac(part):
    return "".join(f"{v:+d}" for v in part)


def sqz(part):
    return "".join(coded(v, SQZ) for v in part)


def dif(part, dup=False):
    items = [coded(part[0], SQZ)] + [coded(b - a, DIF) for a, b in zip(part, part[1:])]
    if not dup:
        return "".join(items)
    out, i = "", 0
    while i < len(items):
        n = 1
        while i + n < len(items) and items[i + n] == items[i] and i > 0:
            n += 1
        out += items[i] + (coded(n, (DUP, DUP)) if n > 1 else "")
        i += n
    return out


def block(ex, table, label="XYDATA", form="(X++(Y..Y))", extra=()):
    return ["##TITLE= invented spectrum", "##JCAMP-DX= 5.01 $$ written by make_jcamp.py", "##DATA TYPE= FLUORESCENCE SPECTRUM",
            "##ORIGIN= invented", "##OWNER= public", *extra, f"##$EXCITATION WAVELENGTH= {ex} nm", "##XUNITS= NANOMETERS",
            "##YUNITS= ARBITRARY UNITS", "##XFACTOR= 1", f"##YFACTOR= {FACTOR}", f"##FIRSTX= {EM[0]:g}", f"##LASTX= {EM[-1]:g}",
            "##DELTAX= 2.5", f"##NPOINTS= {len(Y)}", f"##FIRSTY= {Y[0] * FACTOR}", f"##{label}= {form}", *table, "##END="]


def write(name, text):
    with open(name, "w", newline="") as f:
        f.write("\r\n".join(text) + "\r\n")


tables = {"affn": lines(affn, False), "pac": lines(pac, False), "sqz": lines(sqz, False), "dif": lines(dif, True),
          "difdup": lines(lambda p: dif(p, True), True)}
for name, table in tables.items():
    write(name + ".dx", block(240, table))
pairs = [f"{x:g}, {y}" for x, y in zip(EM, Y)]
write("xypoints.dx", block(240, ["; ".join(pairs[i:i + 4]) for i in range(0, len(pairs), 4)], "XYPOINTS", "(XY..XY)"))
compound = ["##TITLE= two spectra", "##JCAMP-DX= 5.01", "##DATA TYPE= LINK", "##BLOCKS= 2", "##ORIGIN= invented", "##OWNER= public"]
compound += block(240, tables["difdup"], extra=["##BLOCK_ID= 1"]) + block(250, tables["sqz"], extra=["##BLOCK_ID= 2"]) + ["##END="]
write("compound.dx", compound)
with open("truth.json", "w") as f:
    json.dump({"em_nm": EM, "f": [y * FACTOR for y in Y]}, f)
    f.write("\n")
