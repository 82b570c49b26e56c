"""Quantities as they stand in a network file, turned into exact SI numbers.

A number with a unit is a string "NUMBER UNIT"; a plain number is dimensionless. Decimal digits are
read straight into mpmath, never through a binary double.
"""

import tomllib

from mpmath import mp, mpf

SCALE = {
    "m": "1", "mm": "1e-3", "cm": "1e-2",
    "m^2": "1", "cm^2": "1e-4", "mm^2": "1e-6",
    "m^3": "1", "cm^3": "1e-6", "l": "1e-3",
    "Pa": "1", "kPa": "1e3", "bar": "1e5",
    "kg/s": "1", "g/s": "1e-3",
    "m/s": "1",
    "s": "1", "ms": "1e-3", "us": "1e-6",
    "Hz": "1", "kHz": "1e3",
    "1/s": "1",
    "J/(kg K)": "1",
    "g/mol": "1e-3", "kg/mol": "1",
    "K": "1",
}


def parse(text):
    """The network file as nested dicts, its plain numbers kept as mpf."""
    return tomllib.loads(text, parse_float=mpf)


def quantity(text):
    """"120 mm" -> mpf(0.12) in SI."""
    number, unit = text.strip().split(" ", 1)
    value, unit = mpf(number), unit.strip()
    if unit == "degC":
        return value + mpf("273.15")
    if unit == "deg":
        return value * mp.pi / 180
    if unit == "rad":
        return value
    return value * mpf(SCALE[unit])


def interval(text):
    """"20 to 800 Hz", or with a unit behind each number -> (low, high) in SI."""
    low, high = text.split(" to ")
    unit = high.strip().split(" ", 1)[1]
    if " " not in low.strip():
        low = low + " " + unit
    return quantity(low), quantity(high)


def area(table):
    """The area [m^2] stated in a table by diameter or area, or None."""
    if "diameter" in table:
        return mp.pi * quantity(table["diameter"]) ** 2 / 4
    if "area" in table:
        return quantity(table["area"])
    return None
