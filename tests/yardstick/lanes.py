"""Exponential, sine and cosine to forty digits, for the test of eight numbers at once.

Writes tests/data/lanes.csv: the function, an argument that is a double, and its value as the nearest double and what is
left of forty digits (mpmath, arbitrary precision). Arguments cover what occurs: exponents -60 to 60 closely and out to
where values overflow and underflow, angles to 30 closely, to 1.6e6 thinly, and beside multiples of a quarter turn.

    python tests/yardstick/lanes.py
"""

import csv
import pathlib
import random

from mpmath import mp, mpf

mp.dps = 40
random.seed(40)


def rows():
    exponents = [random.uniform(-60, 60) for _ in range(500)]
    exponents += [random.uniform(-700, 709.7) for _ in range(150)]
    exponents += [s * 10 ** random.uniform(-12, 0) for s in (1, -1) for _ in range(50)]
    angles = [random.uniform(-30, 30) for _ in range(300)]
    angles += [s * 10 ** random.uniform(0, 6.2) for s in (1, -1) for _ in range(150)]
    for k in range(60):
        near = float(mp.pi / 2 * random.randint(-10**random.randint(0, 5), 10**random.randint(0, 5)))
        angles.append(near + random.choice([0, 1e-12, 1e-8, -1e-5]) * random.random())
    for name, f, at in [("exp", mp.exp, exponents), ("sin", mp.sin, angles), ("cos", mp.cos, angles)]:
        for x in at:
            exact = f(mpf(x))
            nearest = float(exact)
            yield name, repr(x), repr(nearest), repr(float(exact - mpf(nearest)))


if __name__ == "__main__":
    to = pathlib.Path(__file__).parent.parent / "data" / "lanes.csv"
    with to.open("w", newline="") as file:
        writer = csv.writer(file, lineterminator="\n")
        writer.writerow(["function", "argument", "nearest", "left"])
        writer.writerows(rows())
