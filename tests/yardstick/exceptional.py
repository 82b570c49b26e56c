"""Nine exceptional points of a heater in an open tube, and the modes beside them, for tests/trials.

    python exceptional.py            write ../data/exceptional_neighbourhoods.json, about a minute

Still gas, c = 340 m/s, L = 1 m, heater at x_f, both ends open, exp(s t):

    D(s; n, tau) = sinh(s L/c) + n exp(-s tau) cosh(s x_f/c) sinh(s (L - x_f)/c).

At an exceptional point D = 0 and dD/ds = 0. With R = sinh(s L/c) / (cosh(s x_f/c) sinh(s (L - x_f)/c)) this is
tau = -R'/R and n = -R exp(s tau), both of which must be real: two real equations for s, solved by Newton's method
in 50 digits. About each point n and tau are moved in turn by 1 to 1e-12 of themselves, either way, and not at all, rounded to
doubles, and every root of D in the window is found from a grid and, beside the point, from the square root that parts the
two; the argument principle in double precision must count as many.
"""

import json
from pathlib import Path

import numpy as np
from mpmath import mp, mpc, mpf

mp.dps = 50
C, L = mpf(340), mpf(1)
WINDOW = (-600.0, 400.0, 2 * np.pi * 40.0, 2 * np.pi * 480.0)
POINTS = 9


def parts(s, xf):
    a, b, g = L / C, xf / C, (L - xf) / C
    return a, b, g, mp.sinh(s * a), mp.cosh(s * b), mp.sinh(s * g)


def log_slope(s, xf):
    """(ln R)' and (ln R)''."""
    a, b, g = L / C, xf / C, (L - xf) / C
    first = a * mp.coth(s * a) - b * mp.tanh(s * b) - g * mp.coth(s * g)
    second = -(a / mp.sinh(s * a)) ** 2 - (b / mp.cosh(s * b)) ** 2 + (g / mp.sinh(s * g)) ** 2
    return first, second


def exceptional(s, xf):
    """(s, n, tau) near s, or None."""
    def conditions(x, y):
        z = mpc(x, y)
        tau = -log_slope(z, xf)[0]
        _, _, _, sa, cb, sg = parts(z, xf)
        n = -sa / (cb * sg) * mp.exp(z * mp.re(tau))
        return [mp.im(tau) * 1000, mp.im(n) / (1 + abs(n))]
    try:
        x, y = mp.findroot(conditions, (mp.re(s), mp.im(s)), tol=mpf(10) ** -80, maxsteps=40)
    except (ValueError, ZeroDivisionError):
        return None
    z = mpc(x, y)
    tau = mp.re(-log_slope(z, xf)[0])
    _, _, _, sa, cb, sg = parts(z, xf)
    n = mp.re(-sa / (cb * sg) * mp.exp(z * tau))
    f, d1, d2 = taylor(z, n, tau, xf)
    if abs(f) > mpf(10) ** -40 or abs(d1) > mpf(10) ** -40 or abs(d2) < mpf(10) ** -12:
        return None
    return z, n, tau


def taylor(s, n, tau, xf):
    """D, D', D''."""
    a, b, g, sa, cb, sg = parts(s, xf)
    ca, sb, cg = mp.cosh(s * a), mp.sinh(s * b), mp.cosh(s * g)
    e = n * mp.exp(-s * tau)
    h, h1 = cb * sg, b * sb * sg + g * cb * cg
    h2 = (b * b + g * g) * h + 2 * b * g * sb * cg
    return (sa + e * h, a * ca + e * (h1 - tau * h), a * a * sa + e * (h2 - 2 * tau * h1 + tau * tau * h))


def double(s, n, tau, xf):
    """D and D' over an array."""
    a, b, g = float(L / C), float(xf / C), float((L - xf) / C)
    e = n * np.exp(-s * tau)
    h = np.cosh(s * b) * np.sinh(s * g)
    h1 = b * np.sinh(s * b) * np.sinh(s * g) + g * np.cosh(s * b) * np.cosh(s * g)
    return np.sinh(s * a) + e * h, a * np.cosh(s * a) + e * (h1 - tau * h)


def counted(n, tau, xf):
    x0, x1, y0, y1 = WINDOW
    m = 6000
    t = np.arange(m) / m
    edge = np.concatenate([x0 + (x1 - x0) * t + 1j * y0, x1 + 1j * (y0 + (y1 - y0) * t),
                           x1 + (x0 - x1) * t + 1j * y1, x0 + 1j * (y1 + (y0 - y1) * t)])
    d, _ = double(edge, n, tau, xf)
    turn = np.angle(np.roll(d, -1) / d)
    if abs(turn).max() > 0.4:
        return None
    return int(round(turn.sum() / (2 * np.pi)))


def polish(s, n, tau, xf):
    for _ in range(60):
        f, d1, _ = taylor(s, n, tau, xf)
        if d1 == 0:
            return s if f == 0 else None
        step = f / d1
        if abs(step) > 500:
            return None
        s -= step
        if abs(step) < mpf(10) ** -30 * abs(s):
            return s
    return None


def inside(s):
    return WINDOW[0] < s.real < WINDOW[1] and WINDOW[2] < s.imag < WINDOW[3]


def roots(n, tau, xf, point, moved):
    """Every root in the window; None where that cannot be told."""
    x0, x1, y0, y1 = WINDOW
    s = (np.linspace(x0 - 20, x1 + 20, 40)[None, :] + 1j * np.linspace(y0 - 50, y1 + 50, 80)[:, None]).ravel()
    with np.errstate(all="ignore"):
        for _ in range(30):
            f, d = double(s, n, tau, xf)
            s = s - f / d
    s = s[np.isfinite(s)]
    starts = []
    for z in s[[inside(z) for z in s]] if len(s) else []:
        if all(abs(z - o) > 1e-3 for o in starts):
            starts.append(z)
    starts = [mpc(z) for z in starts]
    if abs(moved) < mpf("0.01"):
        z, n0, tau0 = point
        _, _, sg = parts(z, xf)[3:]
        h = mp.exp(-z * tau0) * parts(z, xf)[4] * sg
        change = h * (mpf(n) - n0) - z * n0 * h * (mpf(tau) - tau0)
        half = mp.sqrt(-2 * change / taylor(z, n0, tau0, xf)[2])
        # What the double grid left near the point is not to be trusted there.
        starts = [s for s in starts if abs(s - z) > 20 * abs(half) + 1] + [z + half, z - half]
    found = []
    for z in starts:
        z = polish(z, mpf(n), mpf(tau), xf)
        if z is not None and inside(complex(z)) and all(abs(z - o) > mpf(10) ** -20 for o in found):
            found.append(z)
    edge = min((min(abs(z.real - x0), abs(z.real - x1), abs(z.imag - y0), abs(z.imag - y1)) for z in found), default=1)
    if edge < 1e-3 or counted(n, tau, xf) != len(found):
        return None
    return sorted(found, key=lambda z: (z.imag, z.real))


def nine():
    points = []
    for place in ("0.25", "0.4", "0.7"):
        xf, here = mpf(place), []
        for y in range(300, 2900, 130):
            for x in (-250, -120, 60, 180):
                p = exceptional(mpc(x, y), xf)
                if p is None:
                    continue
                s, n, tau = p
                good = inside(complex(s)) and 2e-4 < tau < 1.2e-2 and 0.02 < abs(n) < 8 and s.imag < 2800
                if good and all(abs(s - q[0]) > 1 for q in here):
                    here.append(p)
        here.sort(key=lambda p: p[0].imag)
        print(place, [(mp.nstr(s, 6), mp.nstr(n, 5), mp.nstr(t, 5)) for s, n, t in here])
        points += [(xf, p) for p in here[:: max(1, len(here) // 3)][:3]]
    return points


def digits(x):
    return mp.nstr(x, 22)


def main():
    out, skipped, cases = [], 0, 0
    points = nine()
    assert len(points) == POINTS, len(points)
    for xf, point in points:
        s, n, tau = point
        _, _, d2 = taylor(s, n, tau, xf)
        h = mp.exp(-s * tau) * parts(s, xf)[4] * parts(s, xf)[5]
        entry = {"x_f": mp.nstr(xf, 3), "s_re": digits(s.real), "s_im": digits(s.imag), "n": digits(n), "tau": digits(tau),
                 "parting": [float(abs(mp.sqrt(-2 * n * h / d2))), float(abs(mp.sqrt(2 * s * tau * n * h / d2)))], "beside": []}
        for knob in ("n", "tau"):
            steps = [(f"{'+' if way > 0 else '-'}1e-{k}", way * mpf(10) ** -k) for k in range(13) for way in (1, -1)]
            for name, moved in steps + ([("on it", mpf(0))] if knob == "n" else []):
                a = float(n * (1 + moved)) if knob == "n" else float(n)
                b = float(tau * (1 + moved)) if knob == "tau" else float(tau)
                found = roots(a, b, xf, point, moved)
                if found is None:
                    skipped += 1
                    print("skipped", mp.nstr(xf, 3), mp.nstr(s, 5), knob, mp.nstr(moved, 3))
                    continue
                cases += 1
                entry["beside"].append({"moved": f"{knob} {name}", "n": a, "tau": b,
                                        "roots": [[float(z.real), float(z.imag)] for z in found]})
        out.append(entry)
    print(f"{cases} cases, {skipped} skipped")
    text = {"_about": "Written by tests/yardstick/exceptional.py: exceptional points of a heater in an open tube and every root in the "
            "window beside them, in 50-digit arithmetic (mpmath), rounded. x_f in m over a length of 1 m, c = 340 m/s; s, roots in 1/s; tau in s. `parting`: modulus of "
            "(s - s0)/sqrt(dn/n) and of (s - s0)/sqrt(dtau/tau), in 1/s.",
            "window": {"frequency_hz": [40, 480], "growth_per_s": [WINDOW[0], WINDOW[1]]}, "points": out}
    # One case a line.
    lines = json.dumps(text).replace('{"moved"', '\n{"moved"').replace('{"x_f"', '\n{"x_f"')
    (Path(__file__).resolve().parent.parent / "data" / "exceptional_neighbourhoods.json").write_text(lines + "\n")


if __name__ == "__main__":
    main()
