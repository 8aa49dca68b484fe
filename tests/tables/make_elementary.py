"""Makes exp.csv, ln.csv and ln_1p.csv: arguments and values of 40 digits, for tests/statistics/elementary.rs.

    python make_elementary.py     (in this folder; mpmath 1.4.1, fixed seed, 60 digits)

Each value stands as the nearest double and what is left to the true value, so that the test can
judge an error far below one unit in the last place.
"""

import random
import struct

import mpmath
from mpmath import mp, mpf

mp.dps = 60
rng = random.Random(20240611)


def from_bits(bits):
    return struct.unpack("<d", struct.pack("<Q", bits))[0]


def write(name, function, arguments):
    with open(name, "w", newline="\n") as out:
        out.write(f"# {name[:-4]}: argument, value as the nearest double, rest; mpmath {mpmath.__version__}, 60 digits, make_elementary.py\n")
        out.write("x,nearest,rest\n")
        for x in arguments:
            value = function(mpf(x))
            nearest = float(value)
            out.write(f"{x!r},{nearest!r},{float(value - mpf(nearest))!r}\n")


def exp_arguments():
    yield from (0.0, 700.0, -700.0, 5e-324, -5e-324, 1e-300, 2.0**-53, -(2.0**-54))
    for k in range(-1009, 1010, 3):  # about the middle between two multiples of ln 2, where r is largest
        x = float((k + mpf(1) / 2) * mpmath.ln2)
        if abs(x) <= 700:
            yield x
            yield x * (1 + 2**-52)
    for _ in range(1500):
        yield rng.uniform(-700, 700)
    for _ in range(500):
        yield rng.choice((-1, 1)) * 2.0 ** rng.uniform(-60, 9.4)


def ln_arguments():
    yield from (1.0, 5e-324, 2.2250738585072014e-308, 1.7976931348623157e308, 1 - 2**-53, 1 + 2**-52, 2.0, 0.5)
    for _ in range(300):
        yield from_bits(rng.getrandbits(rng.randint(1, 52)) or 1)  # subnormals
    for _ in range(1200):
        yield from_bits(rng.randint(1, 0x7FEFFFFFFFFFFFFF))
    for _ in range(500):
        yield 1 + rng.choice((-1, 1)) * 2.0 ** rng.uniform(-52, -1)
    for _ in range(500):
        yield rng.choice((0.5, 1, 2, 1024)) * 2**0.5 * (1 + rng.uniform(-1e-3, 1e-3))  # where the exponent changes


def ln_1p_arguments():
    yield from (0.0, 5e-324, 1e-300, 1e300, 1.7976931348623157e308, 2.0**-53, 2.0**-52, 1.0, 2.0**53, 2.0**52 + 0.5)
    for _ in range(1000):
        yield 10.0 ** rng.uniform(-300, 300)
    for _ in range(1500):
        yield 2.0 ** rng.uniform(-60, 60)
    for k in range(0, 53):
        for _ in range(20):
            yield (2**0.5 * (1 + rng.uniform(-1e-2, 1e-2))) * 2.0**k - 1  # where the exponent changes


write("exp.csv", mpmath.exp, exp_arguments())
write("ln.csv", mpmath.log, ln_arguments())
write("ln_1p.csv", mpmath.log1p, ln_1p_arguments())
