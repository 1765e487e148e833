"""Tables of numbers as Python and NumPy write and read them.

    write FILE SEED                         a table of random numbers in many forms; prints each double as read back by Python
    read FILE DELIMITER DECIMAL FIRST_LINE  prints every cell as NumPy understands it

Doubles are printed by float.hex(), one row a line.
"""
import random
import struct
import sys

import numpy


def any_double(generator):
    """A finite double of any magnitude, or one of everyday size."""
    if generator.random() < 0.5:
        return generator.uniform(-20, 20) * 10.0 ** generator.randint(-12, 3)
    while True:
        value = struct.unpack("<d", struct.pack("<Q", generator.getrandbits(64)))[0]
        # Beyond 1e37 instruments mean "over range".
        if abs(value) < 1e37:
            return value


def write(path, seed):
    generator = random.Random(seed)
    forms = [repr, "{:.18e}".format, "{:.6g}".format, "{:+.9E}".format, "{:.3f}".format, "{:.17g}".format]
    with open(path, "w", encoding="utf-8") as table:
        table.write("A [V],B [V],C [V]\n")
        for _ in range(2000):
            cells = [generator.choice(forms)(any_double(generator)) for _ in range(3)]
            cells = ["0.5" if len(cell) > 300 else cell for cell in cells]
            table.write(",".join(cells) + "\n")
            print(*(float(cell).hex() for cell in cells))


def read(path, delimiter, decimal, first_line):
    with open(path, encoding="latin-1") as lines:
        rows = [line.strip().rstrip(";").split(None if delimiter == " " else delimiter) for line in lines.readlines()[first_line - 1:]]
    cells = numpy.array([[cell.replace(decimal, ".") for cell in row] for row in rows if row]).astype(float)
    for row in cells:
        print(*(float(cell).hex() for cell in row))


if sys.argv[1] == "write":
    write(sys.argv[2], int(sys.argv[3]))
else:
    read(sys.argv[2], sys.argv[3].replace("\\t", "\t"), sys.argv[4], int(sys.argv[5]))
