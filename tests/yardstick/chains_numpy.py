"""Modes and stability map of a chain in vectorised NumPy: the same work as the tool, for timing beside it.

    python chains_numpy.py --chain FILE [--repeat 5] [--no-map]

The chain is a JSON object:

    {"start": [v0, v1, ...],                          vector at the feed (2, or 3 with entropy)
     "ops": [
        {"delay": [tau0, tau1, ...],                  v_i <- v_i exp(-s tau_i), tau_i >= 0 [s]
         "spread": [d0, d1, ...]},                    optional, factor exp(s^2 d_i^2 / 2) [s]
        {"matrix": [[m00, m01], ...],                 v <- M v + sum out F(s) (sense . v), the v before the operation;
         "flame": {"out": [..], "sense": [..],        F(s) = n s^power exp(-s tau + s^2 spread^2 / 2); optional; an
                   "n": 1.0, "tau": 0.003,            object or a list of them (flames, slugs, volumes)
                   "spread": 0.0, "power": 0}}        spread and power optional
     ],
     "end": [w0, w1, ...],                            D(s) = end . v
     "window": {"frequency_hz": [20, 800], "growth_per_s": [-400, 400]},
     "map": {"op": 5, "n": [0, 2], "tau": [0, 0.01], "points": [200, 200]}}    optional

Matrices are real and may be rectangular: a coordinate (entropy, a remembered velocity) opens and closes so. "map" names
the operation by its index and spans n (rows) and tau (columns) of its only flame; without it the first flame of power 0
is mapped over n in [0, 2] and tau in [0, 10 ms].

Printed as one JSON object: ns per point for D and D' over a large array; us per complete mode list (grid of starts,
Newton's method, argument-principle count); seconds per map, once with every point solved from the grid and once
followed along tau with a count at every point (the fastest way found here). Points whose list disagrees with its
count are reported, as are points where the two maps differ. NumPy runs on one core here.
"""

import argparse
import json
import os
import time
from pathlib import Path

for variable in ("OPENBLAS_NUM_THREADS", "OMP_NUM_THREADS", "MKL_NUM_THREADS"):
    os.environ.setdefault(variable, "1")

import numpy as np

CHUNK = 4096  # elements per array, so that a pass stays in cache


class Chain:
    """Arrays of a chain and its characteristic function."""

    def __init__(self, data):
        self.start, self.end, self.ops = data["start"], data["end"], []
        self.sum_of_delays = 0.0
        for index, op in enumerate(data["ops"]):
            if "delay" in op:
                spread = op.get("spread", [0.0] * len(op["delay"]))
                self.ops.append(("delay", op["delay"], spread))
                self.sum_of_delays += max(op["delay"])
            else:
                flames = op.get("flame", [])
                flames = flames if isinstance(flames, list) else [flames]
                self.ops.append(("matrix", op["matrix"], flames))
                self.sum_of_delays += max([f["tau"] for f in flames], default=0.0)
        f, g = data["window"]["frequency_hz"], data["window"]["growth_per_s"]
        self.box = (g[0], g[1], 2 * np.pi * f[0], 2 * np.pi * f[1])
        self.map = data.get("map") or self._default_map()

    def _default_map(self):
        for index, op in enumerate(self.ops):
            if op[0] == "matrix" and len(op[2]) == 1 and not op[2][0].get("power"):
                return {"op": index, "n": [0.0, 2.0], "tau": [0.0, 0.01], "points": [200, 200]}
        return None

    def run(self, s, ops, v, dv, mapped=None):
        """Vector behind `ops` and its derivative in s (dv None: value only). mapped = (op, n, tau) replaces a flame's."""
        for op in ops:
            if op[0] == "delay":
                for i, (tau, d) in enumerate(zip(op[1], op[2])):
                    if tau == 0 and d == 0:
                        continue
                    e = np.exp(-tau * s) if d == 0 else np.exp(s * (0.5 * d * d * s - tau))
                    if dv is not None:
                        dv[i] = (dv[i] - (tau if d == 0 else tau - d * d * s) * v[i]) * e
                    v[i] = v[i] * e
                continue
            out_v = [_dot(row, v) for row in op[1]]
            out_dv = None if dv is None else [_dot(row, dv) for row in op[1]]
            for flame in op[2]:
                q = _dot(flame["sense"], v)
                n, tau, d, power = flame["n"], flame["tau"], flame.get("spread", 0.0), flame.get("power", 0)
                if mapped is not None and op is mapped[0]:
                    n, tau = mapped[1], mapped[2]
                if power:
                    F = n * s
                    dF = n
                else:
                    F = n * (np.exp(-tau * s) if d == 0 else np.exp(s * (0.5 * d * d * s - tau)))
                    dF = (-tau if d == 0 else d * d * s - tau) * F
                Fq = F * q
                dFq = None if dv is None else dF * q + F * _dot(flame["sense"], dv)
                for r, o in enumerate(flame["out"]):
                    if o != 0:
                        out_v[r] = out_v[r] + o * Fq
                        if dv is not None:
                            out_dv[r] = out_dv[r] + o * dFq
            v, dv = out_v, out_dv
        return v, dv

    def value(self, s, mapped=None):
        """D(s)."""
        v, _ = self.run(s, self.ops, list(self.start), None, mapped)
        return _dot(self.end, v)

    def both(self, s, mapped=None):
        """D(s) and D'(s)."""
        v, dv = self.run(s, self.ops, list(self.start), [0.0] * len(self.start), mapped)
        return _dot(self.end, v), _dot(self.end, dv)

    def split(self, s):
        """P, Q and P', Q' of D = P + F Q, F the mapped flame's n exp(-s tau): its chain run with F = 0 and F = 1."""
        op = self.ops[self.map["op"]]
        P = self.both(s, (op, 0.0, 0.0))
        whole = self.both(s, (op, 1.0, 0.0))
        return P[0], whole[0] - P[0], P[1], whole[1] - P[1]


def _dot(row, v):
    """sum row_i v_i without the zeros and ones."""
    total = None
    for r, x in zip(row, v):
        if r == 0 or (np.isscalar(x) and x == 0):
            continue
        part = x if r == 1 else r * x
        total = part if total is None else total + part
    return 0.0 if total is None else total


def contour(box, sum_of_delays):
    """Points around the window, fine enough for the phase of a chain; half of it where it starts at the real axis.

    Returns points and the number of half turns that one root above the axis makes.
    """
    x0, x1, y0, y1 = box
    half = y0 == 0.0
    corners = [complex(x1, y0), complex(x1, y1), complex(x0, y1), complex(x0, y0)]
    if not half:
        corners.append(corners[0])
    points = []
    for a, b in zip(corners, corners[1:]):
        n = int(abs(b - a) * sum_of_delays / 0.5) + 8
        points.append(a + (b - a) * np.arange(n) / n)
    points.append(np.array([corners[-1]]))
    return np.concatenate(points)


def half_turns(values):
    """Phase along the last axis in half turns, and the largest increment [rad]."""
    increment = np.angle(values[..., 1:] * np.conj(values[..., :-1]))
    return increment.sum(axis=-1) / np.pi, abs(increment).max(axis=-1)


def count(chain, box, mapped=None):
    """2 x (roots above the axis) + (real roots, where the window starts at the axis)."""
    points = contour(box, chain.sum_of_delays)
    for _ in range(30):
        values = chain.value(points, mapped)
        increment = np.angle(values[1:] * np.conj(values[:-1]))
        wide = np.nonzero(abs(increment) > 1.0)[0]
        if len(wide) == 0:
            return int(round(increment.sum() / np.pi))
        points = np.insert(points, wide + 1, 0.5 * (points[wide] + points[wide + 1]))
    raise ArithmeticError("a root on the window's edge")


def grid(box, pitch):
    """Staggered starting values, some beyond the window's edges."""
    x0, x1, y0, y1 = box
    nx, ny = int((x1 - x0) / pitch) + 2, int((y1 - y0) / pitch) + 2
    x = x0 + (x1 - x0) * (np.arange(nx) + 0.5) / nx
    y = y0 + (y1 - y0) * (np.arange(ny) + 0.5) / ny
    shift = 0.25 * (y1 - y0) / ny * (-1.0) ** np.arange(nx)
    return (x[None, :] + 1j * (y[:, None] + shift[None, :])).ravel()


def newton(chain, s, reach, mapped=None):
    """Newton's method from each start whose first step is shorter than `reach`; (points, index of start, converged)."""
    index = np.arange(len(s))
    done_s, done_i = [], []
    for iteration in range(40):
        D, dD = chain.both(s, None if mapped is None else (mapped[0], mapped[1][index], mapped[2][index]))
        step = D / dD
        s = s - step
        size = abs(step)
        finished = size < 1e-13 * abs(s) + 1e-11
        going = np.isfinite(size) & (size < reach) & ~finished
        done_s.append(s[finished])
        done_i.append(index[finished])
        s, index = s[going], index[going]
        if len(s) == 0:
            break
        if iteration == 24:  # not quadratic any more: rounding level or a multiple root
            reach = 1e-6 * reach
    if len(s):
        done_s.append(s)
        done_i.append(index)
    return np.concatenate(done_s), np.concatenate(done_i)


def distinct(s, group, box):
    """Roots inside the window, one of each: (values, groups), duplicates within 1e-7 |s| of one group removed."""
    real = (box[2] == 0.0) & (abs(s.imag) < 1e-9 * abs(s) + 1e-9)
    s = np.where(real, s.real, s)
    keep = (s.real > box[0]) & (s.real < box[1]) & (s.imag >= box[2]) & (s.imag < box[3])
    s, group = s[keep], group[keep]
    order = np.lexsort((s.real, np.round(s.imag, 3), group))
    s, group = s[order], group[order]
    if len(s) < 2:
        return s, group
    same = np.zeros(len(s), bool)
    for k in range(1, 8):  # equal rounded Im s does not mean neighbours: compare with a few before
        near = (group[k:] == group[:-k]) & (abs(s[k:] - s[:-k]) < 1e-7 * abs(s[k:]) + 1e-9)
        same[k:] |= near
    return s[~same], group[~same]


def weight(s):
    """Half turns each root accounts for."""
    return np.where(s.imag == 0, 1, 2)


def mode_list(chain, mapped=None):
    """(roots, expected, found): from ever finer grids until the count is met."""
    expected = count(chain, chain.box, mapped)
    roots = np.zeros(0, complex)
    for pitch in (1.6, 0.8, 0.4, 0.2):
        starts = grid(chain.box, pitch / chain.sum_of_delays)
        m = None if mapped is None else (mapped[0], np.full(len(starts), mapped[1]), np.full(len(starts), mapped[2]))
        s, _ = newton(chain, starts, 2.5 / chain.sum_of_delays, m)
        roots, _ = distinct(s, np.zeros(len(s), int), chain.box)
        found = int(weight(roots).sum())
        if found == expected:
            break
    return roots, expected, found


class Map:
    """Largest growth rate over n and tau of one flame, every point counted."""

    def __init__(self, chain):
        self.chain, m = chain, chain.map
        self.op = chain.ops[m["op"]]
        rows, columns = m["points"]
        self.n = m["n"][0] + (m["n"][1] - m["n"][0]) * np.arange(rows) / max(rows - 1, 1)
        self.tau = m["tau"][0] + (m["tau"][1] - m["tau"][0]) * np.arange(columns) / max(columns - 1, 1)
        self.delays = chain.sum_of_delays - self.op[2][0]["tau"] + m["tau"][1]
        # On the contour and at the grid D = P + F Q with P and Q the same for every point of the map.
        self.edge = contour(chain.box, self.delays)
        self.P, self.Q = chain.split(self.edge)[:2]
        self.spread = self.op[2][0].get("spread", 0.0)
        self.wide = 0

    def response(self, s, tau):
        return np.exp(-tau * s + 0.5 * self.spread**2 * s * s)

    def counts(self, column):
        """Half turns at each n of one column."""
        E = self.response(self.edge, self.tau[column]) * self.Q
        out = np.zeros(len(self.n))
        for a in range(0, len(self.n), 64):
            turns, widest = half_turns(self.P[None, :] + self.n[a:a + 64, None] * E[None, :])
            out[a:a + 64] = turns
            for k in np.nonzero(widest > 1.0)[0]:  # too coarse there: on its own
                self.wide += 1
                try:
                    out[a + k] = count(self.chain, self.chain.box, (self.op, self.n[a + k], self.tau[column]))
                except ArithmeticError:
                    out[a + k] = np.nan
        return np.round(out)

    def solve(self, rows, column, pitches=(1.6, 0.8, 0.4)):
        """Roots of given rows of a column from the grid: (values, row of each)."""
        for_rows, tau = self.n[rows], self.tau[column]
        expected = self.expected[rows]
        all_s, all_g = np.zeros(0, complex), np.zeros(0, int)
        open_rows = np.arange(len(rows))
        for pitch in pitches:
            P, Q, dP, dQ, starts = self.at_grid(pitch)
            F = self.response(starts, tau)
            dF = (self.spread**2 * starts - tau) * F
            reach = 2.5 / self.delays
            D = P[None, :] + for_rows[open_rows, None] * (F * Q)[None, :]
            dD = dP[None, :] + for_rows[open_rows, None] * (dF * Q + F * dQ)[None, :]
            step = D / dD
            r, k = np.nonzero(abs(step) < reach)
            s, g = starts[k] - step[r, k], open_rows[r]
            parts_s, parts_g = [all_s], [all_g]
            for a in range(0, len(s), CHUNK):
                z, i = newton(self.chain, s[a:a + CHUNK], reach,
                              (self.op, for_rows[g[a:a + CHUNK]], np.full(len(s[a:a + CHUNK]), tau)))
                parts_s.append(z)
                parts_g.append(g[a:a + CHUNK][i])
            all_s, all_g = distinct(np.concatenate(parts_s), np.concatenate(parts_g), self.chain.box)
            found = np.bincount(all_g, weights=weight(all_s), minlength=len(rows))
            open_rows = np.nonzero(found != expected)[0]
            if len(open_rows) == 0:
                break
        return all_s, rows[all_g]

    def at_grid(self, pitch):
        if pitch not in self.grids:
            starts = grid(self.chain.box, pitch / self.delays)
            P, Q, dP, dQ = self.chain.split(starts)
            self.grids[pitch] = (P, Q, dP, dQ, starts)
        return self.grids[pitch]

    def run(self, follow):
        """(largest growth, unproven points, points solved from the grid). follow: start from the column before."""
        self.grids = {}
        largest = np.full((len(self.n), len(self.tau)), -np.inf)
        unproven = solved = 0
        s, g = np.zeros(0, complex), np.zeros(0, int)
        for column in range(len(self.tau)):
            self.expected = self.counts(column)
            if follow and column:
                tau = self.tau[column]
                z, i = newton(self.chain, s, 2.5 / self.delays, (self.op, self.n[g], np.full(len(s), tau)))
                s, g = distinct(z, g[i], self.chain.box)
                found = np.bincount(g, weights=weight(s), minlength=len(self.n))
                again = np.nonzero(found != self.expected)[0]
            else:
                again = np.arange(len(self.n))
                s, g = s[:0], g[:0]
            if len(again):
                solved += len(again)
                z, h = self.solve(again, column)
                keep = ~np.isin(g, again)
                s, g = np.concatenate([s[keep], z]), np.concatenate([g[keep], h])
            found = np.bincount(g, weights=weight(s), minlength=len(self.n))
            unproven += int((found != self.expected).sum())
            np.maximum.at(largest[:, column], g, s.real)
        return largest, unproven, solved


def best(function, repeat):
    """Least time of several runs [s] and the last result."""
    times = []
    for _ in range(repeat):
        began = time.perf_counter()
        result = function()
        times.append(time.perf_counter() - began)
    return min(times), result


def main():
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--chain", required=True)
    parser.add_argument("--repeat", type=int, default=5)
    parser.add_argument("--no-map", action="store_true")
    options = parser.parse_args()
    data = json.loads(Path(options.chain).read_text())
    chain = Chain(data)
    rng = np.random.default_rng(1)
    x0, x1, y0, y1 = chain.box
    s = rng.uniform(x0, x1, 1 << 17) + 1j * rng.uniform(y0, y1, 1 << 17)
    pieces = [s[a:a + CHUNK] for a in range(0, len(s), CHUNK)]
    per_point, _ = best(lambda: [chain.both(p) for p in pieces], options.repeat)
    per_list, (roots, expected, found) = best(lambda: mode_list(chain), 4 * options.repeat)
    roots = sorted(roots, key=lambda z: (z.imag, z.real))
    report = {
        "chain": data.get("title", Path(options.chain).name), "numpy": np.__version__,
        "operations": len(data["ops"]),
        "ns_per_point_D_and_derivative": per_point / len(s) * 1e9,
        "us_per_mode_list": per_list * 1e6,
        "half_turns_expected": expected, "half_turns_found": found,
        "modes": [{"frequency_hz": z.imag / (2 * np.pi), "growth_per_s": z.real} for z in roots],
    }
    if chain.map and not options.no_map:
        maps = {}
        for name, follow in (("followed", True), ("solved_at_each_point", False)):
            seconds, (largest, unproven, solved) = best(lambda: Map(chain).run(follow), 2 if follow else 1)
            maps[name] = largest
            report[f"s_per_map_{name}"] = seconds
            report[f"unproven_points_{name}"] = unproven
            report[f"points_solved_from_grid_{name}"] = solved
        a, b = maps.values()
        with np.errstate(invalid="ignore"):
            report["points_where_maps_differ"] = int((~((abs(a - b) < 1e-6) | (a == b))).sum())
        report["map_points"] = list(chain.map["points"])
        report["growing_fraction"] = float((b > 0).mean())
    print(json.dumps(report, indent=1))


if __name__ == "__main__":
    main()
