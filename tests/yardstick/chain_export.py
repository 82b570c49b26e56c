"""Write a network as a chain of plain arrays for chains_numpy.py (its schema stands there).

    python chain_export.py NETWORK.toml > CHAIN.json

Vector at an interface: f = a + b (downstream), g = a - b (upstream), e (entropy), as in `assembly`. A compact
element says R2 x2 = R1 x1 + sum over k of out_k F_k(s) (sense_k . x1), hence x2 = R2^-1 (...). A duct is scaled by
exp(-s L/(c - u)), so that no exponential grows for Re s > 0. Coordinates that are zero are dropped. Not covered:
references other than a flame's own inlet, and the slug of a contraction with flow, which moves with x2.
"""

import json
import sys

from mpmath import mp

import assembly
import steady
from quantities import interval, parse

WAVES = mp.matrix([["0.5", "0.5", 0], ["0.5", "-0.5", 0], [0, 0, 1]])  # (a, b, e) from (f, g, e)


def _columns(row, first):
    """Constant entries of a row at the three columns of an interface, in waves."""
    entries = [sum(t[0] for t in row.terms.get(first + k, []) if t[1] == 0 and t[2] == 0) for k in range(3)]
    return mp.matrix([entries]) * WAVES


def compact(network, stations, k):
    """(M, rank-one terms) of a compact element."""
    e, s1 = network["element"][k], stations[k]
    if e["kind"] == "plenum":
        rows = assembly.plenum_rows(e, s1, stations[k + 1], 3 * k, 3 * k + 3)
    else:
        rows = (assembly.still_rows if s1.u == 0 else assembly.flow_rows)(network, stations, k)
    before, behind = mp.matrix(3, 3), mp.matrix(3, 3)
    terms = []  # (row, sense, n, tau, spread, power)
    for i, row in enumerate(rows):
        rest = assembly.Row()
        for column, entries in row.terms.items():
            for q, power, tau, w in entries:
                source = (e["kind"] == "flame" and i == 1 and (tau != 0 or w != 0)) or power
                if not source:
                    rest.add(column, q, power, tau, w)
                    continue
                factor = 1
                if power and column == 3 * k + 4 and s1.u == 0:  # slug of a contraction: u2' = u1' A1/A2
                    s2 = stations[k + 1]
                    column, factor = 3 * k + 1, s1.A * s1.c / (s2.A * s2.c)
                if column // 3 != k:
                    raise ValueError(f"{e['name']}: only terms at its own inlet can be exported")
                sense = mp.matrix(1, 3)
                sense[column % 3] = 1
                terms.append((i, sense * WAVES, q * factor, tau, mp.sqrt(w), power))
        before[i, :], behind[i, :] = _columns(rest, 3 * k), -_columns(rest, 3 * k + 3)
    inverse = mp.inverse(behind)
    return inverse * before, [(inverse[:, i], sense, n, tau, spread, power) for i, sense, n, tau, spread, power in terms]


def _drop(op, rows):
    """Take output rows out of a matrix operation."""
    flames = op.get("flame", [])
    for r in reversed(rows):
        del op["matrix"][r]
        for flame in flames if isinstance(flames, list) else [flames]:
            del flame["out"][r]


def export(network, stations):
    with mp.workdps(assembly.LINEARISING_DIGITS):
        rows = mp.matrix(2, 3)
        for i, row in enumerate(assembly.feed_rows(network["feed"], stations[0])):
            rows[i, :] = _columns(row, 0)
        start = [rows[0, 1] * rows[1, 2] - rows[0, 2] * rows[1, 1],
                 rows[0, 2] * rows[1, 0] - rows[0, 0] * rows[1, 2],
                 rows[0, 0] * rows[1, 1] - rows[0, 1] * rows[1, 0]]
        tiny = mp.mpf(10) ** -25 * max(abs(v) for v in start)
        live = [k for k in range(3) if k < 2 or abs(start[k]) > tiny]
        first, ops = [start[k] for k in live], []
        for k, e in enumerate(network["element"]):
            s = stations[k]
            if e["kind"] == "duct":
                up = e["_length"] / (s.c - s.u)
                kept = [c for c in live if c < 2 or (e["_carried"] and s.u != 0)]
                if kept != live and ops and "matrix" in ops[-1]:  # entropy ends here: not even computed
                    _drop(ops[-1], [r for r, c in enumerate(live) if c not in kept])
                elif kept != live:
                    ops.append({"matrix": [[float(c == r) for c in live] for r in kept]})
                live = kept
                delays = [e["_length"] / (s.c + s.u) + up, mp.mpf(0), e["_length"] / s.u + up if s.u else None]
                op = {"delay": [float(delays[c]) for c in live]}
                if 2 in live and e["_spread"]:
                    op["spread"] = [0.0, 0.0, float(e["_spread"])]
                ops.append(op)
                continue
            M, terms = compact(network, stations, k)
            scale = max(abs(v) for v in M)
            rows_of = lambda r: [M[r, c] for c in live] + [t[0][r] * t[2] * 1000 ** t[5] for t in terms]
            kept = [r for r in range(3) if r < 2 or max(abs(v) for v in rows_of(r)) > mp.mpf(10) ** -25 * scale]
            op = {"matrix": [[float(M[r, c]) for c in live] for r in kept]}
            flames = []
            for out, sense, n, tau, spread, power in terms:
                flame = {"out": [float(out[r]) for r in kept], "sense": [float(sense[c]) for c in live],
                         "n": float(n), "tau": float(tau)}
                if spread:
                    flame["spread"] = float(spread)
                if power:
                    flame["power"] = power
                else:  # the gain as written, the rest in `out`
                    gain = float(next(r[0] for r in assembly.response_terms(e) if r[1] == tau))
                    flame["out"] = [v * flame["n"] / gain for v in flame["out"]]
                    flame["n"] = gain
                flames.append(flame)
            if flames:
                op["flame"] = flames[0] if len(flames) == 1 else flames
            ops.append(op)
            live = kept
        last = _columns(assembly.exit_row(network["exit"], stations[-1], 0), 0)
        low, high = interval(network["search"]["frequency"])
        growth = interval(network["search"]["growth"])
        return {
            "title": network["title"],
            "start": [float(mp.re(v)) for v in first], "ops": ops, "end": [float(last[c]) for c in live],
            "window": {"frequency_hz": [float(low), float(high)], "growth_per_s": [float(g) for g in growth]},
        }


if __name__ == "__main__":
    mp.dps = assembly.LINEARISING_DIGITS
    parsed = parse(open(sys.argv[1]).read())
    print(json.dumps(export(parsed, steady.solve(parsed)), indent=1))
