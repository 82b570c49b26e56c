"""The linearised network as a global matrix A(s), each entry a sum of coef * s^k * exp(-s tau + s^2 w/2).

Unknowns at interface k: columns 3k, 3k+1, 3k+2 =
    a = p'/(gamma p),  b = u'/c,  e = s'/cp             with flow
                                  e = u s'/(cp c)       in still gas (the limit M -> 0 of M s'/cp)
Downstream sound wave: a + b. Upstream sound wave: a - b.

With flow the rows of a compact element are the steady balances of `steady`, differentiated by central
differences in 80-digit arithmetic. In still gas they are the limits written out by hand:
    mass      A1 rho1 (u1' - eta1) = A2 rho2 (u2' - eta2),  eta = u s'/cp
    enthalpy  A1 [rho1 h1 (u1' - eta1) + rho1 cp1 T1 eta1] + Q' = the same behind
    pressure  p1' - p2' = rho1 L s u'
Storage terms and ends are written by hand in both.
"""

from mpmath import mp, mpc, mpf

from quantities import quantity
from steady import loss_velocity, third_balance

STEP = mpf(10) ** -20
LINEARISING_DIGITS = 80


class Row:
    """One row of A(s): column -> list of (coef, power of s, tau, w)."""

    def __init__(self):
        self.terms = {}

    def add(self, column, coef, power=0, tau=0, w=0):
        if coef != 0:
            self.terms.setdefault(column, []).append((coef, power, mpf(tau), mpf(w)))
        return self

    def add_all(self, first, coefs, power=0, tau=0, w=0, factor=1):
        for k, c in enumerate(coefs):
            self.add(first + k, c * factor, power, tau, w)
        return self

    def scaled(self):
        largest = max(abs(t[0]) for terms in self.terms.values() for t in terms)
        self.terms = {c: [(q / largest, k, tau, w) for q, k, tau, w in terms] for c, terms in self.terms.items()}
        return self


def directions(s):
    """Displacements (p, u, T) of a station for one unit of a, b, e with flow."""
    g = s.gamma
    return (g * s.p, mpf(0), (g - 1) * s.T), (mpf(0), s.c, mpf(0)), (mpf(0), mpf(0), s.T)


def gradient(function, s):
    """Derivatives of function(station) along a, b, e at the mean state."""
    out = []
    for dp, du, dT in directions(s):
        plus = function(s.moved(s.p + STEP * dp, s.u + STEP * du, s.T + STEP * dT))
        minus = function(s.moved(s.p - STEP * dp, s.u - STEP * du, s.T - STEP * dT))
        out.append((plus - minus) / (2 * STEP))
    return out


def response_terms(flame):
    """Each term n exp(-s tau + s^2 w/2) of a flame's response with its reference."""
    entries = flame.get("response", [])
    for r in entries if isinstance(entries, list) else [entries]:
        spread = quantity(r["spread"]) if r["kind"] == "gaussian" else mpf(0)
        yield mpf(r["interaction_index"]), quantity(r["delay"]), spread**2, r.get("reference")


def reference_interface(network, k, reference):
    """Index of the interface a reference names; k is the flame's own position."""
    if reference is None:
        return k
    name, _, side = reference.partition(".")
    if name in ("feed", "exit"):
        return 0 if name == "feed" else len(network["element"])
    index = next(i for i, e in enumerate(network["element"]) if e["name"] == name)
    return index if side == "in" else index + 1


def flame_heat(network, stations, k):
    """Q' of the flame at position k as a list of (column, coef, tau, w)."""
    flame, s1, s2 = network["element"][k], stations[k], stations[k + 1]
    out = []
    for n, tau, w, reference in response_terms(flame):
        j = reference_interface(network, k, reference)
        r = stations[j]
        if flame.get("basis", "heat release") == "velocity":
            g = s1.gamma
            per_u = g * s1.p * s1.A / (g - 1) * r.A * r.rho / (s1.A * s1.rho)
        elif s1.u == 0:
            per_u = r.rho * r.A * (s2.h - s1.h)
        else:
            per_u = s1.flow * (s2.ht - s1.ht) / r.u
        out.append((3 * j + 1, n * per_u * r.c, tau, w))
    return out


def duct_rows(e, s, i, o):
    """Sound and entropy along a duct from columns i to columns o."""
    L, u, c = e["_length"], s.u, s.c
    down = Row().add_all(o, (1, 1, 0)).add_all(i, (-1, -1, 0), tau=L / (c + u))
    up = Row().add_all(i, (1, -1, 0)).add_all(o, (-1, 1, 0), tau=L / (c - u))
    entropy = Row().add(o + 2, mpf(1))
    if e["_carried"] and u != 0:
        entropy.add(i + 2, mpf(-1), tau=L / u, w=e["_spread"] ** 2)
    return [down, up, entropy]


def slug(e, s1, s2):
    """(which station's velocity, factor on it) moving an element's slug."""
    if e["kind"] == "contraction":
        return 2, mpf(1)
    if e["kind"] == "restriction" and e["_area"] is not None:
        return 1, s1.A / e["_area"]
    return 1, mpf(1)


def plenum_rows(e, s1, s2, i, o):
    V = e["_volume"]
    inside = s1.moved(s1.p, mpf(0), s1.Tt)
    storage = V * s1.gamma * s1.p / inside.c**2  # per unit of a at the inlet
    # Entropy that flows in is mixed out: it heats the vessel as isentropic inflow of the same energy would.
    if s1.u == 0:
        mass = Row().add_all(i, (0, s1.A * s1.rho * s1.c, 0))
        mass.add_all(o, (0, -s2.A * s2.rho * s2.c, s2.A * s2.rho * s2.c))
    else:
        inflow = [*gradient(lambda s: s.flow, s1)[:2], 0]
        mass = Row().add_all(i, inflow).add_all(o, gradient(lambda s: s.flow, s2), factor=-1)
    mass.add(i, -storage, power=1)
    pressure = Row().add(i, s1.gamma * s1.p)
    pressure.add_all(o, [s2.gamma * s2.p, 0, 0] if s1.u == 0 else gradient(lambda s: s.pt, s2), factor=-1)
    return [mass, pressure, Row().add(o + 2, mpf(1))]


def still_rows(network, stations, k):
    e, s1, s2 = network["element"][k], stations[k], stations[k + 1]
    i, o = 3 * k, 3 * k + 3
    mass, enthalpy, pressure = Row(), Row(), Row()
    for s, first, sign in ((s1, i, 1), (s2, o, -1)):
        m = sign * s.A * s.rho * s.c
        mass.add_all(first, (0, m, -m))
        enthalpy.add_all(first, (0, m * s.h, m * (s.cp * s.T - s.h)))
    pressure.add(i, s1.gamma * s1.p).add(o, -s2.gamma * s2.p)
    if e["kind"] == "flame":
        for column, q, tau, w in flame_heat(network, stations, k):
            enthalpy.add(column, q, 0, tau, w)
    else:
        which, factor = slug(e, s1, s2)
        column, c = (i + 1, s1.c) if which == 1 else (o + 1, s2.c)
        pressure.add(column, -s1.rho * e["_slug"] * factor * c, power=1)
    return [mass, enthalpy, pressure]


def flow_rows(network, stations, k):
    e, s1, s2 = network["element"][k], stations[k], stations[k + 1]
    i, o = 3 * k, 3 * k + 3
    mass = Row().add_all(i, gradient(lambda s: s.flow, s1)).add_all(o, gradient(lambda s: s.flow, s2), factor=-1)
    enthalpy = Row().add_all(i, gradient(lambda s: s.flow * s.ht, s1))
    enthalpy.add_all(o, gradient(lambda s: s.flow * s.ht, s2), factor=-1)
    third = Row().add_all(i, gradient(lambda s: third_balance(e, s, s2), s1))
    third.add_all(o, gradient(lambda s: third_balance(e, s1, s), s2))
    if e["kind"] == "flame":
        for column, q, tau, w in flame_heat(network, stations, k):
            enthalpy.add(column, q, 0, tau, w)
    else:
        which, factor = slug(e, s1, s2)
        column, c = (i + 1, s1.c) if which == 1 else (o + 1, s2.c)
        velocity = e["_slug"] * factor * c
        enthalpy.add(column, -s1.flow * velocity, power=1)
        third.add(column, -s1.rho * velocity, power=1)
    return [mass, enthalpy, third]


def coefficient(table):
    value = mpf(table["coefficient"])
    return value * mp.expj(quantity(table["phase"])) if "phase" in table else value


def feed_rows(feed, s):
    end = feed["end"]
    if end == "choked":
        return [Row().add_all(0, gradient(lambda x: x.flow, s)), Row().add_all(0, gradient(lambda x: x.ht, s))]
    if end == "reservoir" and s.u != 0:
        return [Row().add_all(0, gradient(lambda x: x.pt, s)), Row().add_all(0, gradient(lambda x: x.ht, s))]
    sound = {"closed": (0, 1), "open": (1, 0), "reservoir": (1, 0), "anechoic": (1, 1)}
    if end == "reflection":
        R = coefficient(feed)
        row = Row().add_all(0, (1 - R, 1 + R))  # (a + b) - R (a - b)
    else:
        row = Row().add_all(0, sound[end])
    return [row, Row().add(2, mpf(1))]


def exit_row(table, s, first):
    end = table["end"]
    if end == "choked":
        from steady import throat_mass_flux

        if hasattr(s.gas, "gamma_"):
            return Row().add_all(first, gradient(lambda x: x.mach, s))
        return Row().add_all(first, gradient(lambda x: x.flow / throat_mass_flux(x.gas, x.pt, x.Tt), s))
    sound = {"closed": (0, 1), "open": (1, 0), "anechoic": (1, -1)}
    if end == "reflection":
        R = coefficient(table)
        return Row().add_all(first, (1 - R, -1 - R))  # (a - b) - R (a + b)
    return Row().add_all(first, sound[end])


def assemble(network, stations):
    """Rows of A(s), in an order that follows the flow."""
    with mp.workdps(LINEARISING_DIGITS):
        rows = feed_rows(network["feed"], stations[0])
        for k, e in enumerate(network["element"]):
            s1, s2 = stations[k], stations[k + 1]
            if e["kind"] == "duct":
                rows += duct_rows(e, s1, 3 * k, 3 * k + 3)
            elif e["kind"] == "plenum":
                rows += plenum_rows(e, s1, s2, 3 * k, 3 * k + 3)
            elif s1.u == 0:
                rows += still_rows(network, stations, k)
            else:
                rows += flow_rows(network, stations, k)
        rows.append(exit_row(network["exit"], stations[-1], 3 * len(network["element"])))
        return [row.scaled() for row in rows]


def has_complex_constant(network):
    """True when a constant of the network is not real, so that roots do not come in conjugate pairs."""
    return any("phase" in network[t] and mp.im(coefficient(network[t])) != 0 for t in ("feed", "exit"))
