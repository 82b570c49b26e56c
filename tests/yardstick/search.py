"""Every root of det A(s) in a rectangle, with a count by the argument principle.

Count: the phase of det A is followed around the rectangle; a segment is halved until its phase increment is
below 0.6 rad and the same as the sum of the increments of its two halves, each below 0.6 rad. The midpoints of
this test double the samples; the count is taken from both sets and must agree. With real coefficients and the
lower edge on the real axis the rectangle is mirrored, and real roots are told apart from pairs.

Roots: Newton's method in double precision from a grid gives starting values; Newton's method in multiple
precision gives the roots; a small circle around each gives its multiplicity. If the weighted sum is not the
count: deflated Newton's method, then subdivision into rectangles whose counts must add up.
"""

import numpy as np
from mpmath import mp, mpc, mpf

DIGITS = 45
LIMIT = mpf("0.6")
# Pitch of the starting grid over the sum of delays, and the most columns and rows of it.
GRIDS = ((1.6, (6, 100)), (0.8, (12, 200)), (0.4, (24, 400)))


class Incomplete(ArithmeticError):
    pass


def _increment(f, g):
    return mp.arg(g / f)


def _walk(det, a, b, fa, fb, pieces):
    """Phase increments from a to b (single samples, doubled samples)."""
    single = doubled = mpf(0)
    n_samples = 0
    stack = []
    points = [a + (b - a) * mpf(k) / pieces for k in range(pieces + 1)]
    values = [fa] + [det(p) for p in points[1:-1]] + [fb]
    for k in range(pieces - 1, -1, -1):
        stack.append((points[k], points[k + 1], values[k], values[k + 1], 0))
    while stack:
        p, q, f, g, depth = stack.pop()
        middle = (p + q) / 2
        m = det(middle)
        n_samples += 1
        if f == 0 or g == 0 or m == 0:
            raise Incomplete("a root on the edge")
        whole, left, right = _increment(f, g), _increment(f, m), _increment(m, g)
        if abs(whole) < LIMIT and abs(left) < LIMIT and abs(right) < LIMIT and abs(whole - left - right) < 1:
            single += whole
            doubled += left + right
        elif depth > 40:
            raise Incomplete("a root on the edge")
        else:
            stack.append((middle, q, m, g, depth + 1))
            stack.append((p, middle, f, m, depth + 1))
    return single, doubled, n_samples + pieces


def count(matrix, box):
    """Number of roots with multiplicity inside box = (sigma_low, sigma_high, omega_low, omega_high)."""
    x0, x1, y0, y1 = (mpf(v) for v in box)
    corners = [mpc(x0, y0), mpc(x1, y0), mpc(x1, y1), mpc(x0, y1)]
    values = [matrix.det(c) for c in corners]
    single = doubled = mpf(0)
    samples = 0
    for k in range(4):
        a, b = corners[k], corners[(k + 1) % 4]
        pieces = int(abs(b - a) * matrix.longest / mpf("0.8")) + 8
        one, two, used = _walk(matrix.det, a, b, values[k], values[(k + 1) % 4], pieces)
        single, doubled, samples = single + one, doubled + two, samples + used
    turns = [v / (2 * mp.pi) for v in (single, doubled)]
    n = int(mp.nint(turns[0]))
    if any(abs(t - n) > mpf(10) ** -20 for t in turns):
        raise Incomplete(f"phase is no whole number of turns: {turns}")
    return n, samples


def polish(matrix, s):
    """Newton's method in multiple precision; None where it does not settle.

    At a multiple root convergence is linear; 100 steps then reach about 1e-15 |s|, which is accepted.
    """
    step = mp.inf
    for _ in range(100):
        try:
            step = matrix.newton_step(s)
        except ZeroDivisionError:
            return s if matrix.det(s) == 0 else None
        if not mp.isfinite(step) or abs(step) > 1000:
            return None
        s -= step
        if abs(step) < mpf(10) ** -28 * (abs(s) + 1):
            return s
    return s if abs(step) < mpf(10) ** -15 * (abs(s) + 1) else None


def multiplicity(matrix, s, others):
    """Roots within a small circle around s."""
    radius = min([mpf(10) ** -5 * (abs(s) + 1)] + [abs(s - o) / 3 for o in others])
    values = [matrix.det(s + radius * mp.expjpi(mpf(k) / 8)) for k in range(16)]
    total = sum(_increment(values[k], values[(k + 1) % 16]) for k in range(16))
    return int(mp.nint(total / (2 * mp.pi)))


def _merge(roots, new):
    for r in new:
        if all(abs(r - o) > mpf(10) ** -12 * (abs(r) + 1) for o in roots):
            roots.append(r)


def _inside(s, box):
    return box[0] < mp.re(s) < box[1] and box[2] < mp.im(s) < box[3]


def _starts(matrix, box, pitch, most):
    x0, x1, y0, y1 = (float(v) for v in box)
    nx, ny = max(3, int((x1 - x0) / pitch) + 1), max(3, int((y1 - y0) / pitch) + 1)
    nx, ny = min(nx, most[0]), min(ny, most[1])
    x = x0 + (x1 - x0) * (np.arange(nx) + 0.5) / nx
    y = y0 + (y1 - y0) * (np.arange(ny) + 0.5) / ny
    s = (x[None, :] + 1j * (y[:, None] + (y1 - y0) / ny * 0.25 * (-1) ** np.arange(nx)[None, :])).ravel()
    out = []
    with np.errstate(all="ignore"):
        for k in range(0, len(s), 256):
            z, step = matrix.newton_double(s[k:k + 256], 40)
            good = np.isfinite(z) & (abs(step) < 1e-6 * (abs(z) + 1))
            out += list(z[good])
    wide = (x0 - 0.02 * (x1 - x0), x1 + 0.02 * (x1 - x0), y0 - 0.02 * (y1 - y0), y1 + 0.02 * (y1 - y0))
    unique = []
    for z in sorted(out, key=lambda z: (z.imag, z.real)):
        if wide[0] < z.real < wide[1] and wide[2] < z.imag < wide[3]:
            if all(abs(z - o) > 1e-6 * (abs(z) + 1) for o in unique[-8:]):
                unique.append(z)
    return unique


def sketch(matrix, box):
    """Roots near a box from one grid of starts, uncounted."""
    with mp.workdps(DIGITS):
        roots = []
        starts = _starts(matrix, box, *GRIDS[1])
        _merge(roots, [r for r in (polish(matrix, mpc(z)) for z in starts) if r is not None])
        return roots


def _deflated(matrix, roots, start):
    """Newton's method on det / prod (s - root)."""
    s = mpc(start)
    for _ in range(80):
        try:
            step = matrix.newton_step(s)
            step = 1 / (1 / step - sum(1 / (s - r) for r in roots))
        except ZeroDivisionError:
            return None
        if not mp.isfinite(step) or abs(step) > 5000:
            return None
        s -= step
        if abs(step) < mpf(10) ** -20 * (abs(s) + 1):
            return polish(matrix, s)
    return None


def _subdivide(matrix, box, roots, wanted):
    """Halve a box until each part is accounted for."""
    inside = [r for r in roots if _inside(r, box)]
    if sum(multiplicity(matrix, r, [o for o in roots if o != r]) for r in inside) == wanted:
        return
    x0, x1, y0, y1 = box
    if max(x1 - x0, y1 - y0) < mpf(10) ** -6 * (abs(mpc(x1, y1)) + 1):
        raise Incomplete("roots too close to part")
    new = polish(matrix, mpc((x0 + x1) / 2, (y0 + y1) / 2))
    if new is not None:
        _merge(roots, [new])
    for shift in ("0.5", "0.47", "0.54", "0.41", "0.58"):
        f = mpf(shift)
        if x1 - x0 > y1 - y0:
            parts = [(x0, x0 + f * (x1 - x0), y0, y1), (x0 + f * (x1 - x0), x1, y0, y1)]
        else:
            parts = [(x0, x1, y0, y0 + f * (y1 - y0)), (x0, x1, y0 + f * (y1 - y0), y1)]
        try:
            counts = [count(matrix, p)[0] for p in parts]
        except Incomplete:
            continue
        if sum(counts) == wanted:
            for part, n in zip(parts, counts):
                _subdivide(matrix, part, roots, n)
            return
    raise Incomplete("counts of the parts do not add up")


def find(matrix, box, mirrored=False):
    """Roots in a box as (s, multiplicity), sorted by Im s, and figures of the search.

    mirrored: real coefficients and omega_low = 0; the list then holds real roots and the upper half of pairs.
    """
    with mp.workdps(DIGITS):
        box = tuple(mpf(v) for v in box)
        walked = (box[0], box[1], -box[3], box[3]) if mirrored else box
        expected, samples = count(matrix, walked)
        roots, rounds, how = [], 0, "newton"

        def weighted():
            total = []
            for r in roots:
                if _inside(r, walked):
                    total.append((r, multiplicity(matrix, r, [o for o in roots if o != r])))
            return total

        listed = []
        for pitch, most in GRIDS:
            rounds += 1
            starts = _starts(matrix, box, pitch / float(matrix.longest), most)
            _merge(roots, [r for r in (polish(matrix, mpc(z)) for z in starts) if r is not None])
            _real_or_pair(roots, mirrored)
            listed = weighted()
            if sum(m for _, m in listed) >= expected:
                break
        if sum(m for _, m in listed) < expected:
            how = "deflation"
            y1, x0, x1 = walked[3], walked[0], walked[1]
            for k in range(40):
                start = mpc(x0 + (x1 - x0) * mp.frac(k * mpf("0.618034")), y1 * mp.frac(k * mpf("0.754878")))
                new = _deflated(matrix, roots, start)
                if new is not None:
                    _merge(roots, [new])
                    _real_or_pair(roots, mirrored)
            listed = weighted()
        if sum(m for _, m in listed) < expected:
            how = "subdivision"
            _subdivide(matrix, walked, roots, expected)
            _real_or_pair(roots, mirrored)
            listed = weighted()
        found = sum(m for _, m in listed)
        if found != expected:
            raise Incomplete(f"{found} roots found, {expected} expected")
        upper = [(r, m) for r, m in listed if mp.im(r) >= 0]
        upper.sort(key=lambda e: (mp.im(e[0]), mp.re(e[0])))
        return upper, {"expected": expected, "samples": samples, "rounds": rounds, "how": how}


def _real_or_pair(roots, mirrored):
    """With real coefficients: put a root with Im s = 0 within rounding on the axis and add conjugates."""
    if not mirrored:
        return
    for k, r in enumerate(roots):
        if abs(mp.im(r)) < mpf(10) ** -24 * (abs(r) + 1):
            roots[k] = mpc(mp.re(r), 0)
    _merge(roots, [mp.conj(r) for r in list(roots)])
