"""det A(s) in multiple precision (sparse elimination) and, for starting values only, in double precision."""

import numpy as np
from mpmath import mp, mpc, mpf


def _in_waves(rows):
    """Unknowns a, b of every interface replaced by the waves f = a + b (downstream) and g = a - b (upstream).

    a = (f + g)/2, b = (f - g)/2; det is multiplied by a constant. Terms of one law are added up.
    """
    out = []
    for row in rows:
        terms = {}
        for col, ts in row.terms.items():
            base, which = col - col % 3, col % 3
            for q, k, tau, w in ts:
                parts = [(col, q)] if which == 2 else [(base, q / 2), (base + 1, q / 2 if which == 0 else -q / 2)]
                for c, v in parts:
                    law = terms.setdefault(c, {})
                    law[(k, tau, w)] = law.get((k, tau, w), 0) + v
        row_out = {c: {law: q for law, q in laws.items() if q != 0} for c, laws in terms.items()}
        out.append({c: laws for c, laws in row_out.items() if laws})
    return out


def _without_ducts(rows):
    """Ducts substituted: a row that says x_j = E x_i with one law E (or x_j = 0) takes x_j out of all others.

    The row's entry at x_j is a constant, so det changes by a constant factor only.
    """
    rows = list(rows)
    while True:
        found = None
        for r, row in enumerate(rows):
            if len(row) > 2:
                continue
            for j, laws in row.items():
                rest = [(c, l) for c, l in row.items() if c != j]
                if set(laws) == {(0, 0, 0)} and all(len(l) == 1 and next(iter(l))[0] == 0 for _, l in rest):
                    found = (r, j, laws[(0, 0, 0)], rest)
                    break
            if found:
                break
        if not found:
            break
        r, j, pivot, rest = found
        del rows[r]
        for row in rows:
            if j not in row:
                continue
            old = row.pop(j)
            for c, laws in rest:
                ((k2, tau2, w2), q2), = laws.items()
                target = row.setdefault(c, {})
                for (k, tau, w), q in old.items():
                    law = (k + k2, tau + tau2, w + w2)
                    target[law] = target.get(law, 0) - q * q2 / pivot
    columns = {c: k for k, c in enumerate(sorted({c for row in rows for c in row}))}
    return [{columns[c]: [(q, *law) for law, q in laws.items()] for c, laws in row.items()} for row in rows]


class Matrix:
    """A(s) from the rows of `assembly`, evaluated at complex s."""

    def __init__(self, rows):
        rows = _without_ducts(_in_waves(rows))
        self.n = len(rows)
        laws = sorted({(t[2], t[3]) for r in rows for ts in r.values() for t in ts})
        self.laws = laws
        number = {law: k for k, law in enumerate(laws)}
        self.rows = [
            [(col, [(q, k, number[(tau, w)]) for q, k, tau, w in ts]) for col, ts in r.items()] for r in rows
        ]
        self.longest = sum(
            max([t[2] for ts in r.values() for t in ts], default=mpf(0)) for r in rows
        )  # a bound on how fast the phase of det turns with s
        entries = [(i, col, q, k, law) for i, r in enumerate(self.rows) for col, ts in r for q, k, law in ts]
        self.ij = np.array([e[0] * self.n + e[1] for e in entries])
        self.q = np.array([complex(e[2]) for e in entries])
        self.k = np.array([e[3] for e in entries])
        self.law = np.array([e[4] for e in entries])
        self.tau = np.array([float(law[0]) for law in laws])
        self.w = np.array([float(law[1]) for law in laws])

    def values(self, s):
        """Rows of A(s) as dicts column -> mpc."""
        s2 = s * s / 2
        exps = [mp.exp(-s * tau + s2 * w) if tau or w else mpf(1) for tau, w in self.laws]
        out = []
        for row in self.rows:
            values = {}
            for col, terms in row:
                total = mpc(0)
                for q, k, law in terms:
                    v = q * exps[law]
                    total += v * s if k else v
                values[col] = total
            out.append(values)
        return out

    def det(self, s):
        """det A(s), by elimination column after column with the largest pivot of each."""
        waiting = [[] for _ in range(self.n)]  # rows by their first column
        for i, row in enumerate(self.values(mpc(s))):
            waiting[min(row)].append((i, row))
        product, order = mpc(1), []
        for col in range(self.n):
            rows = waiting[col]
            if not rows:
                return mpc(0)
            sizes = [abs(complex(r[1][col])) for r in rows]
            best = sizes.index(max(sizes))
            i, pivot_row = rows.pop(best)
            pivot = pivot_row.pop(col)
            product *= pivot
            order.append(i)
            for j, row in rows:
                factor = row.pop(col) / pivot
                for c, v in pivot_row.items():
                    row[c] = row[c] - factor * v if c in row else -factor * v
                if not row:
                    return mpc(0)
                waiting[min(row)].append((j, row))
        return -product if _odd(order) else product

    def newton_step(self, s):
        """det / det' with the derivative by a difference of 1e-20 |s|."""
        h = mpf(10) ** -20 * (abs(s) + 1)
        f = self.det(s)
        slope = (self.det(s + h) - f) / h
        return f / slope

    def newton_double(self, s, iterations):
        """Newton's method on det A in double precision from an array of starts; returns points and last steps."""
        s = s.copy()
        step = np.full(s.shape, np.inf, dtype=complex)
        moving = np.ones(s.shape, dtype=bool)
        for _ in range(iterations):
            if not moving.any():
                break
            z = s[moving]
            A, dA = self._double(z)
            try:
                trace = np.trace(np.linalg.solve(A, dA), axis1=1, axis2=2)
            except np.linalg.LinAlgError:  # one of them exactly singular: step aside
                s[moving] = z * (1 + 1e-7j)
                continue
            newton = 1.0 / trace
            step[moving] = newton
            s[moving] = z - newton / np.maximum(1.0, abs(newton) * float(self.longest) / 6.0)
            moving = moving & np.isfinite(s) & (abs(step) > 1e-9 * (abs(s) + 1)) & (abs(s) < 1e6)
        return s, step

    def _double(self, s):
        """A(s) and dA/ds at an array of s."""
        e = np.exp(-s[:, None] * self.tau + s[:, None] ** 2 / 2 * self.w)[:, self.law] * self.q
        power = np.where(self.k, s[:, None], 1.0)
        slope = (-self.tau[self.law] + s[:, None] * self.w[self.law]) * power + self.k
        A = np.zeros((len(s), self.n * self.n), dtype=complex)
        dA = np.zeros_like(A)
        for t, ij in enumerate(self.ij):
            A[:, ij] += (e * power)[:, t]
            dA[:, ij] += (e * slope)[:, t]
        return A.reshape(-1, self.n, self.n), dA.reshape(-1, self.n, self.n)


def _odd(order):
    """Parity of the permutation that `order` is."""
    seen, odd = [False] * len(order), False
    for start in range(len(order)):
        length, k = 0, start
        while not seen[k]:
            seen[k], k, length = True, order[k], length + 1
        odd ^= length > 0 and length % 2 == 0
    return odd
