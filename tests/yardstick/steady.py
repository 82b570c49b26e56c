"""Mean flow of a network: the steady balances of each element, marched from the feed to the exit.

A network of N elements has N + 1 interfaces; interface k is the outlet of element k - 1 and the inlet of
element k. Between interfaces 1 and 2 of a compact element hold

    mass        rho1 u1 A1 = rho2 u2 A2
    enthalpy    m h_t1 + Q = m h_t2
    third       contraction  p_t1 = p_t2
                expansion    p1 A2 + rho1 u1^2 A1 = (p2 + rho2 u2^2) A2
                restriction  p_t1 - p_t2 = zeta rho1 u |u| / 2,  u = m/(rho1 A)
                flame        p1 + rho1 u1^2 = p2 + rho2 u2^2,  T2 stated
                plenum       p_t2 = p1

`p_t` is the isentropic stagnation pressure, h_t the sensible enthalpy from 298.15 K plus kinetic energy.
"""

from mpmath import mp, mpf

from gases import gas_of
from quantities import area, quantity


class Station:
    """The stream at an interface. SI units."""

    def __init__(self, gas, p, u, T, A):
        self.gas, self.p, self.u, self.T, self.A = gas, p, u, T, A

    @property
    def rho(self):
        return self.p / (self.gas.R * self.T)

    @property
    def cp(self):
        return self.gas.cp(self.T)

    @property
    def gamma(self):
        return self.cp / (self.cp - self.gas.R)

    @property
    def c(self):
        return mp.sqrt(self.gamma * self.gas.R * self.T)

    @property
    def mach(self):
        return self.u / self.c

    @property
    def flow(self):
        return self.rho * self.u * self.A

    @property
    def h(self):
        return self.gas.h(self.T)

    @property
    def ht(self):
        return self.h + self.u**2 / 2

    @property
    def Tt(self):
        return self.gas.temperature(self.ht, self.T)

    @property
    def pt(self):
        return self.p * mp.exp((self.gas.phi(self.Tt) - self.gas.phi(self.T)) / self.gas.R)

    def moved(self, p, u, T):
        return Station(self.gas, p, u, T, self.A)


def throat_mass_flux(gas, pt, Tt):
    """Largest mass flux [kg/(m^2 s)] of an isentropic expansion from (pt, Tt): flow at the local sound speed."""
    if hasattr(gas, "gamma_"):
        g = gas.gamma_
        return pt * mp.sqrt(g / (gas.R * Tt)) * (2 / (g + 1)) ** ((g + 1) / (2 * (g - 1)))
    ht = gas.h(Tt)

    def c2(T):
        cp = gas.cp(T)
        return cp / (cp - gas.R) * gas.R * T

    T = mp.findroot(lambda T: (gas.h(T) + c2(T) / 2 - ht) / ht, (Tt * mpf("0.83"), Tt * mpf("0.84")), solver="secant")
    p = pt * mp.exp((gas.phi(T) - gas.phi(Tt)) / gas.R)
    return p / (gas.R * T) * mp.sqrt(c2(T))


def loss_velocity(element, s1):
    A = element.get("_area") or s1.A
    return s1.flow / (s1.rho * A)


def third_balance(element, s1, s2):
    """Third balance of a compact element as a difference that vanishes [Pa]."""
    kind = element["kind"]
    if kind == "contraction":
        return s1.pt - s2.pt
    if kind == "expansion":
        return s1.p + s1.rho * s1.u**2 * s1.A / s2.A - s2.p - s2.rho * s2.u**2
    if kind == "restriction":
        u = loss_velocity(element, s1)
        return s1.pt - s2.pt - element["_zeta"] * s1.rho * u * abs(u) / 2
    if kind == "flame":
        return s1.p + s1.rho * s1.u**2 - s2.p - s2.rho * s2.u**2
    if kind == "plenum":
        return s1.p - s2.pt
    raise ValueError(kind)


def _prepare(network):
    """Areas of the interfaces, gases and numbers of each element, kept under keys starting with "_"."""
    elements = network["element"]
    n = len(elements)
    areas = [None] * (n + 1)
    for k, e in enumerate(elements):
        kind = e["kind"]
        if kind == "duct":
            e["_length"] = quantity(e["length"])
            areas[k] = areas[k + 1] = area(e)
            e["_carried"] = e.get("entropy", "mixed") == "carried"
            e["_spread"] = quantity(e["entropy_dispersion"]) if "entropy_dispersion" in e else mpf(0)
        elif kind in ("contraction", "expansion", "restriction"):
            e["_slug"] = quantity(e["effective_length"]) if "effective_length" in e else mpf(0)
            if kind == "restriction":
                e["_area"], e["_zeta"] = area(e), mpf(e["loss_coefficient"])
        elif kind == "plenum":
            e["_volume"] = quantity(e["volume"])
    for k, e in enumerate(elements):
        if e["kind"] == "duct" and not (areas[k] == areas[k + 1] == area(e)):
            raise ValueError("adjoining ducts of different area")
    for _ in range(n):
        for k, e in enumerate(elements):
            if e["kind"] in ("flame", "restriction"):
                areas[k] = areas[k] or areas[k + 1]
                areas[k + 1] = areas[k + 1] or areas[k]
    if None in areas:
        raise ValueError("an interface has no area")
    for k, e in enumerate(elements):
        if e["kind"] in ("flame", "restriction") and areas[k] != areas[k + 1]:
            raise ValueError(f"{e['name']} has neighbours of different area")
    return areas


def _behind(element, s1, A2):
    """The station behind an element."""
    kind = element["kind"]
    if kind == "duct":
        return Station(s1.gas, s1.p, s1.u, s1.T, A2)
    if kind == "flame":
        gas = gas_of(element["burnt_gas"]) if "burnt_gas" in element else s1.gas
        T2 = quantity(element["burnt_temperature"]) if "burnt_temperature" in element else s1.T
        if s1.u == 0:
            return Station(gas, s1.p, s1.u, T2, A2)
        # p2 + G u2 = F with rho2 u2 = G and p2 = rho2 R T2: G R2 T2/u2 + G u2 = F, subsonic root.
        G, F = s1.rho * s1.u, s1.p + s1.rho * s1.u**2
        u2 = (F - mp.sqrt(F**2 - 4 * G**2 * gas.R * T2)) / (2 * G)
        return Station(gas, G * gas.R * T2 / u2, u2, T2, A2)
    if s1.u == 0:
        return Station(s1.gas, s1.p, s1.u, s1.T, A2)

    # One unknown, the velocity behind; enthalpy gives T2, mass gives p2, the third balance must vanish.
    m, ht = s1.flow, s1.ht

    def station(u2):
        T2 = s1.gas.temperature(ht - u2**2 / 2, s1.T)
        return Station(s1.gas, m / (u2 * A2) * s1.gas.R * T2, u2, T2, A2)

    guess = s1.u * s1.A / A2
    u2 = mp.findroot(lambda u: third_balance(element, s1, station(u)) / s1.p, (guess, guess * mpf("1.002")),
                     solver="secant", maxsteps=100, tol=mpf(10) ** (20 - 2 * mp.dps))
    return station(u2)


def _march(network, areas, p, T, flow=None, velocity=None):
    gas = gas_of(network["feed"]["gas"])
    u = flow * gas.R * T / (p * areas[0]) if velocity is None else velocity
    stations = [Station(gas, p, u, T, areas[0])]
    for e, A in zip(network["element"], areas[1:]):
        stations.append(_behind(e, stations[-1], A))
        s = stations[-1]
        if mp.im(s.u) != 0 or s.u < 0 or s.mach >= 1 or s.p <= 0:
            raise ArithmeticError(f"no subsonic flow through {e['name']}")
    return stations


def solve(network):
    """The stations at the interfaces of a parsed network, in flow order."""
    feed, end = network["feed"], network["exit"]
    areas = _prepare(network)
    T = quantity(feed["temperature"])
    throat = None
    for key, power in (("throat_area", 1), ("throat_diameter", 2)):
        if key in end:
            value = quantity(end[key])
            throat = value if power == 1 else mp.pi * value**2 / 4

    def velocity(p):
        if "mass_flow" in feed:
            gas = gas_of(feed["gas"])
            return quantity(feed["mass_flow"]) * gas.R * T / (p * areas[0])
        if "velocity" in feed:
            return quantity(feed["velocity"])
        return mpf(feed["mach"]) * Station(gas_of(feed["gas"]), p, mpf(0), T, areas[0]).c

    if throat is None:
        p = quantity(feed["pressure"])
        return _march(network, areas, p, T, velocity=velocity(p))

    def excess(stations):
        s = stations[-1]
        return s.flow / (throat * throat_mass_flux(s.gas, s.pt, s.Tt)) - 1

    if "pressure" in feed:
        p = quantity(feed["pressure"])
        c = Station(gas_of(feed["gas"]), p, mpf(0), T, areas[0]).c

        def run(mach):
            return _march(network, areas, p, T, velocity=mach * c)

        # The excess grows with the feed's Mach number up to the first choking inside: bracket from below.
        low, high = mpf(0), mpf("0.5")
        for _ in range(24):
            middle = (low + high) / 2
            try:
                too_much = excess(run(middle)) > 0
            except (ArithmeticError, ValueError):
                too_much = True
            low, high = (low, middle) if too_much else (middle, high)
        start = (low, high)
    else:

        def run(p):
            return _march(network, areas, p, T, velocity=velocity(p))

        low, high = mpf("1e3"), mpf("1e9")
        for _ in range(48):
            middle = mp.sqrt(low * high)
            try:
                too_low = excess(run(middle)) > 0
            except (ArithmeticError, ValueError):
                too_low = True
            low, high = (middle, high) if too_low else (low, middle)
        start = (low, high)
    root = mp.findroot(lambda z: excess(run(z)), start, solver="secant", tol=mpf(10) ** (20 - 2 * mp.dps))
    return run(root)
