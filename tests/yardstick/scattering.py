"""Scattering matrices of the witness's expansion and contraction against published relations (scattering.json)."""

import json
from pathlib import Path

from mpmath import mp, mpf

import chain_export
import steady
from quantities import parse

TEXT = """
[feed]
gas = {{ gamma = {gamma}, gas_constant = "287 J/(kg K)" }}
mach = {mach}
temperature = "300 K"
pressure = "101325 Pa"
end = "open"
[[element]]
name = "before"
kind = "duct"
length = "1 m"
area = "{A1} m^2"
[[element]]
name = "step"
kind = "{kind}"
[[element]]
name = "behind"
kind = "duct"
length = "1 m"
area = "{A2} m^2"
[exit]
end = "open"
"""


def scatter(kind, gamma, mach, A1, A2):
    """(stations, {incoming: {outgoing: coefficient}}) with P+ = f/2 and P- = g/2."""
    network = parse(TEXT.format(kind=kind, gamma=gamma, mach=mach, A1=A1, A2=A2))
    stations = steady.solve(network)
    M, _ = chain_export.compact(network, stations, 1)
    # f2, g2, e2 = M (f1, g1, e1); unknown g1, f2, e2.
    unknown = mp.matrix([[M[0, 1], -1, 0], [M[1, 1], 0, 0], [M[2, 1], 0, -1]])
    out = {}
    for name, column, sign in (("P1plus", 0, -1), ("entropy", 2, -1), ("P2minus", None, 1)):
        side = mp.matrix([0, 1, 0]) if column is None else sign * M[:, column]
        g1, f2, e2 = mp.lu_solve(unknown, side)
        scale = mpf(1) / 2 if name == "entropy" else mpf(1)
        out[name] = {"P1minus": g1 * scale, "P2plus": f2 * scale, "sig2": e2 * scale * 2}
    return stations, out


def isentropic_area_ratio(gamma, m1, m2):
    """A2/A1 of an isentropic stream of a perfect gas between two Mach numbers."""
    g = mpf(str(gamma))

    def per_area(m):
        return m * (1 + (g - 1) / 2 * m**2) ** (-(g + 1) / (2 * (g - 1)))

    return per_area(mpf(str(m1))) / per_area(mpf(str(m2)))


def _worst(ours, theirs):
    worst = mpf(0)
    for incoming, row in theirs.items():
        for outgoing, value in row.items():
            worst = max(worst, abs(ours[incoming][outgoing] - mpf(str(value))))
    return worst


def check():
    """(name, worst difference, limit) of each family."""
    data = json.loads((Path(__file__).parent / "scattering.json").read_text())
    worst = mpf(0)
    for c in data["sudden_expansion_mean_flow"]["cases"]:
        stations, ours = scatter("expansion", c["gamma"], c["M1"], c["S1_over_S2"], 1)
        theirs = {"P1plus": c["P1plus"], "P2minus": c["P2minus"], "entropy": c["sig1"]}
        worst = max(worst, _worst(ours, theirs), abs(stations[-1].mach - mpf(str(c["M2"]))))
    yield "sudden expansion with flow", worst, mpf("1e-11")
    worst = mpf(0)
    for c in data["compact_nozzle_subcritical"]["cases"]:
        ratio = mp.nstr(isentropic_area_ratio(c["gamma"], c["M1"], c["M2"]), 40)
        stations, ours = scatter("contraction", c["gamma"], c["M1"], 1, ratio)
        theirs = {k: c[k] for k in ("P1plus", "P2minus", "entropy")}
        worst = max(worst, _worst(ours, theirs), abs(stations[-1].mach - mpf(str(c["M2"]))))
    yield "subcritical nozzle", worst, mpf("1e-11")
