"""Invented random networks, reproducible from (number, attempt).

Plan by number: 0, 5, 10, ... still gas; 3, 13, ... dry air; 4, 9, 14, 19, ... a complex reflection coefficient;
7, 17, ... window from 0 Hz with real coefficients; the rest flow of a perfect gas. In a network with flow the
feed is set so that the largest Mach number, restriction passages included, is a drawn target up to 0.36.
"""

import random

from mpmath import mp

import steady
from quantities import parse

FEED_ENDS = ["closed", "open", "reservoir", "anechoic", "reflection"]
EXIT_ENDS = ["closed", "open", "anechoic", "reflection"]
PRESSURE_STATED_THROAT = (21,)
FLOW_STATED_THROAT = (11, 36)
REAL_ROOT = (17, 37)  # kept only where a real root lies in the window


def short(x, n=4):
    """x with n significant digits, never in exponent form."""
    text = f"{float(f'{x:.{n}g}'):.12f}".rstrip("0")
    return text + "0" if text.endswith(".") else text


def length(rng, x):
    return rng.choice([f"{short(x)} m", f"{short(x * 1000)} mm", f"{short(x * 100)} cm"])


class Draft:
    """A network being drawn: tables of key -> TOML value text."""

    def __init__(self, number, attempt):
        self.rng = random.Random(f"stillflame witness {number} {attempt}")
        self.number = number
        self.search, self.feed, self.elements, self.exit = {}, {}, [], {}
        self.window = None
        self.hide = ()  # (table, key) left out of the file because the throat decides it

    def text(self):
        f0, f1, g0, g1 = self.window
        lines = [f'title = "Invented random network {self.number:02d}"', "", "[search]"]
        if self.number % 4 == 1:
            lines += [f'frequency = "{f0} Hz to {f1 / 1000:g} kHz"', f'growth = "{g0} to {g1} 1/s"']
        else:
            lines += [f'frequency = "{f0} to {f1} Hz"', f'growth = "{g0} to {g1} 1/s"']
        lines += ["", "[feed]"] + [f"{k} = {v}" for k, v in self.feed.items() if ("feed", k) not in self.hide]
        for e in self.elements:
            lines += ["", "[[element]]"]
            lines += [f"{k} = {v}" for k, v in e.items() if not k.startswith("_") and k != "response"]
            responses = e.get("response", [])
            if len(responses) == 1:
                lines.append("response = { " + ", ".join(f"{k} = {v}" for k, v in responses[0].items()) + " }")
            elif responses and e["_tables"]:
                for r in responses:
                    lines += ["", "[[element.response]]"] + [f"{k} = {v}" for k, v in r.items()]
            elif responses:
                inner = ["{ " + ", ".join(f"{k} = {v}" for k, v in r.items()) + " }" for r in responses]
                lines.append("response = [\n  " + ",\n  ".join(inner) + ",\n]")
        lines += ["", "[exit]"] + [f"{k} = {v}" for k, v in self.exit.items()]
        return "\n".join(lines) + "\n"

    def about(self):
        kinds = [e["kind"].strip('"') for e in self.elements]
        parts = [("still gas" if self.number % 5 == 0 else "flow"), f"{kinds.count('duct')} ducts"]
        parts += sorted({k for k in kinds if k != "duct"})
        carried = sum(e.get("entropy") == '"carried"' for e in self.elements)
        if carried:
            parts.append(f"entropy carried in {carried}")
        parts.append(f"feed {self.feed['end']}, exit {self.exit['end']}".replace('"', ""))
        return ", ".join(parts)


def quoted(x):
    return f'"{x}"'


def perfect_gas(rng, burnt):
    gamma = rng.uniform(1.22, 1.33) if burnt else rng.choice([1.4, 1.667, rng.uniform(1.28, 1.42)])
    if rng.random() < 0.35:
        mass = rng.uniform(26.5, 29.5) if burnt else rng.uniform(18, 32)
        return f'{{ gamma = {short(gamma)}, molar_mass = "{short(mass)} g/mol" }}'
    R = rng.uniform(280, 310) if burnt else rng.uniform(260, 420)
    return f'{{ gamma = {short(gamma)}, gas_constant = "{short(R)} J/(kg K)" }}'


PASSIVE = [["contraction"], ["expansion"], ["restriction"], ["restriction", "contraction"], ["restriction", "expansion"],
           ["contraction", "restriction"], ["plenum"], []]
BURNING = [["flame"], ["flame"], ["expansion", "flame"], ["expansion", "flame"], ["flame", "contraction"],
           ["restriction", "flame"], ["flame", "restriction"], ["contraction", "flame"], ["flame", "expansion"]]


def add_element(draft, kind, **more):
    count = sum(e["kind"] == quoted(kind) for e in draft.elements)
    e = {"name": quoted(f"{kind}_{count + 1}"), "kind": quoted(kind), **more}
    draft.elements.append(e)
    return e


def add_duct(draft, diameter):
    rng = draft.rng
    e = add_element(draft, "duct", length=quoted(length(rng, rng.uniform(0.08, 1.3))))
    if rng.random() < 0.75:
        e["diameter"] = quoted(length(rng, diameter))
    else:
        a = 0.785398163 * diameter**2
        e["area"] = quoted(rng.choice([f"{short(a * 1e4)} cm^2", f"{short(a * 1e6)} mm^2", f"{short(a)} m^2"]))
    return e


def chain(draft):
    """Ducts and the compact elements between them."""
    rng = draft.rng
    ducts = rng.choice([2, 2, 3, 3, 4, 4, 5, 5, 6, 7])
    joints = ducts - 1
    flames = min(joints, rng.choice([0] + [1] * 11 + [2] * 5))
    burning = set(rng.sample(range(joints), flames))
    if flames == 1 and rng.random() < 0.5:
        burning = {joints // 2}
    d = rng.uniform(0.03, 0.1)
    add_duct(draft, d)
    for j in range(joints):
        elements = rng.choice(BURNING if j in burning else PASSIVE)
        if elements == [] and rng.random() < 0.6:
            elements = ["restriction"]
        if "contraction" in elements:
            d2 = d * rng.uniform(0.45, 0.85)
        elif "expansion" in elements:
            d2 = d * rng.uniform(1.2, 2.2)
        elif elements == ["plenum"]:
            d2 = d * rng.uniform(0.6, 1.6)
        else:
            d2 = d
        if not 0.012 < d2 < 0.25:
            return False
        for kind in elements:
            e = add_element(draft, kind)
            if kind in ("contraction", "expansion", "restriction") and rng.random() < 0.55:
                e["effective_length"] = quoted(length(rng, rng.uniform(0.2, 0.9) * min(d, d2)))
            if kind == "restriction":
                before = elements.index("restriction") == 0 and "contraction" in elements
                neighbour = d if before or elements == ["restriction", "expansion"] else d2
                e["loss_coefficient"] = short(rng.uniform(0.3, 3.5), 3)
                if rng.random() < 0.5:
                    e["diameter" if rng.random() < 0.7 else "area"] = "?"
                    hole = neighbour * rng.uniform(0.6, 0.95)
                    if "diameter" in e:
                        e["diameter"] = quoted(length(rng, hole))
                    else:
                        e["area"] = quoted(f"{short(0.785398 * hole**2 * 1e6)} mm^2")
            if kind == "plenum":
                e["volume"] = quoted(f"{short(rng.uniform(0.2, 1.5) * 0.8 * max(d, d2) ** 2 * rng.uniform(0.3, 1.0))} m^3")
        if d2 == d and draft.elements[-1]["kind"] != quoted("duct"):
            last = next(e for e in reversed(draft.elements) if e["kind"] == quoted("duct"))
            twin = add_duct(draft, d)
            twin.pop("diameter", None), twin.pop("area", None)
            twin.update({k: last[k] for k in ("diameter", "area") if k in last})
        elif d2 == d:
            last = draft.elements[-1]
            twin = add_duct(draft, d)
            twin.pop("diameter", None), twin.pop("area", None)
            twin.update({k: last[k] for k in ("diameter", "area") if k in last})
        else:
            add_duct(draft, d2)
        d = d2
    return True


def reference(draft, k):
    """A station a response refers to, or None for the flame's inlet; k is the flame's position."""
    rng, elements = draft.rng, draft.elements

    def at(i):
        return quoted(elements[i]["name"].strip('"') + rng.choice([".in", ".out", ""]))

    kind = rng.choices(["inlet", "upstream", "downstream", "outlet"], [30, 36, 17, 17])[0]
    if kind == "upstream" and k > 0:
        return at(rng.randrange(k))
    if kind == "downstream" and k + 1 < len(elements):
        return at(rng.randrange(k + 1, len(elements)))
    if kind == "outlet":
        return quoted(elements[k]["name"].strip('"') + rng.choice([".out", ""]))
    return rng.choice([None, quoted(elements[k]["name"].strip('"') + ".in")])


def response(draft, k, n):
    rng = draft.rng
    tau = rng.uniform(0.7, 6.0)
    r = {"kind": quoted("n-tau"), "interaction_index": short(n, 3),
         "delay": quoted(rng.choice([f"{short(tau)} ms", f"{short(tau / 1000)} s"]))}
    if rng.random() < 0.35:
        r["kind"] = quoted("gaussian")
        r["spread"] = quoted(f"{short(tau * rng.uniform(0.08, 0.32), 3)} ms")
    ref = reference(draft, k)
    if ref:
        r["reference"] = ref
    return r


def fill_flames(draft, feed_temperature, air, still):
    rng = draft.rng
    T = feed_temperature
    for k, e in enumerate(draft.elements):
        if e["kind"] != quoted("flame"):
            continue
        second = T > feed_temperature
        T = T * (rng.uniform(1.1, 1.5) if second else rng.uniform(1.6, 4.8))
        T = min(max(T, feed_temperature + 200), 2300)
        velocity_basis = rng.random() < 0.3
        if velocity_basis:
            e["basis"] = quoted("velocity")
        if not (velocity_basis and rng.random() < 0.3):
            e["burnt_temperature"] = quoted(rng.choice([f"{T:.0f} K", f"{T - 273:.0f} degC"]))
            if rng.random() < (0.3 if still or air else 0.5):
                e["burnt_gas"] = perfect_gas(rng, True)
        terms = rng.choice([1, 1, 1, 1, 2, 2, 3])
        if rng.random() < 0.05:
            continue
        if terms == 1:
            gains = [rng.uniform(0.2, 2.6) * rng.choice([1, 1, 1, -1])]
        else:
            gains = [rng.uniform(0.3, 1.6) * (-1) ** j for j in range(terms)]
        e["response"] = [response(draft, k, n) for n in gains]
        e["_tables"] = rng.random() < 0.5


def ends(draft, still, complex_constant):
    rng, number = draft.rng, draft.number
    feed_end = FEED_ENDS[(number // 5) % 5] if still else (FEED_ENDS + ["choked", "choked"])[number % 7]
    exit_end = EXIT_ENDS[(number // 5 + number // 20) % 4] if still else (EXIT_ENDS + ["choked"])[(number + number // 5) % 5]
    if number in PRESSURE_STATED_THROAT + FLOW_STATED_THROAT or number % 20 == 13:
        exit_end = "choked"
    if complex_constant:
        if number % 10 == 4:
            feed_end = "reflection"
        else:
            exit_end = "reflection"
    draft.feed["end"], draft.exit["end"] = quoted(feed_end), quoted(exit_end)
    for table, end in ((draft.feed, feed_end), (draft.exit, exit_end)):
        if end == "reflection":
            table["coefficient"] = short(rng.uniform(0.25, 0.97) * rng.choice([1, -1]), 3)
            if complex_constant:
                table["phase"] = quoted(f"{rng.choice([-1, 1]) * rng.randint(12, 160)} deg")


def largest_mach(network, stations):
    m = max(float(s.mach) for s in stations)
    for e, s in zip(network["element"], stations):
        if e["kind"] == "restriction":
            m = max(m, float(steady.loss_velocity(e, s) / s.c))
    return m


def set_flow(draft, target):
    """Feed Mach number that makes the largest Mach number the target; None where there is none."""
    with mp.workdps(25):
        low, high = 0.0, target
        for _ in range(22):
            middle = (low + high) / 2
            draft.feed["mach"] = f"{middle:.8f}"
            network = parse(draft.text())
            try:
                too_fast = largest_mach(network, steady.solve(network)) > target
            except (ArithmeticError, ValueError, TypeError):
                too_fast = True
            low, high = (low, middle) if too_fast else (middle, high)
        if low < 0.001:
            return None
        draft.feed["mach"] = f"{low:.8f}"
        network = parse(draft.text())
        return network, steady.solve(network)


def state_flow(draft, station):
    """Write the feed's flow as mass flow, velocity or Mach number, rounded."""
    del draft.feed["mach"]
    form = draft.rng.choice(["mass_flow", "mass_flow", "velocity", "mach"])
    if form == "mass_flow":
        m = float(station.flow)
        draft.feed["mass_flow"] = quoted(f"{short(m * 1000)} g/s" if m < 1 else f"{short(m)} kg/s")
    elif form == "velocity":
        draft.feed["velocity"] = quoted(f"{short(float(station.u))} m/s")
    else:
        draft.feed["mach"] = short(float(station.mach))
    return form


def carry_entropy(draft, stations, slowest_growth):
    """Let some ducts carry entropy: each transit at most 50 ms, their sum at most 90 ms, never into a plenum."""
    rng, total = draft.rng, 0.0
    for k, e in enumerate(draft.elements):
        if e["kind"] != quoted("duct"):
            continue
        transit = float(e["_L"] / stations[k].u)
        into_plenum = k + 1 < len(draft.elements) and draft.elements[k + 1]["kind"] == quoted("plenum")
        if into_plenum or rng.random() < 0.45 or transit > 0.05 or total + transit > 0.09:
            if rng.random() < 0.3:
                e["entropy"] = quoted("mixed")
            continue
        total += transit
        assert transit * abs(slowest_growth) < 60
        e["entropy"] = quoted("carried")
        if rng.random() < 0.4:
            e["entropy_dispersion"] = quoted(f"{short(transit * rng.uniform(0.05, 0.25) * 1000, 3)} ms")


def draw(number, attempt):
    """Network `number` at its given attempt, or None where the draw does not fit."""
    draft = Draft(number, attempt)
    rng = draft.rng
    still, air, complex_constant = number % 5 == 0, number % 10 == 3, number % 10 in (4, 9)
    draft.window = (0 if number % 10 == 7 else rng.choice([20, 25, 30, 40, 50]), rng.choice([600, 700, 800, 900]),
                    *rng.choice([(-400, 400), (-300, 300), (-350, 500), (-400, 250), (-250, 600)]))
    T = rng.uniform(285, 720)
    p = rng.choice([101325.0, rng.uniform(1e5, 2e6)])
    draft.feed["gas"] = quoted("air") if air else perfect_gas(rng, False)
    if still:
        draft.feed.update(rng.choice([{"velocity": '"0 m/s"'}, {"mass_flow": '"0 kg/s"'}, {"mach": "0.0"}]))
    else:
        draft.feed["mach"] = "0.01"
    T = round(T)
    draft.feed["temperature"] = quoted(rng.choice([f"{T} K", f"{T - 273} degC"]))
    if p != 101325.0:
        p = float(short(p))
    draft.feed["pressure"] = quoted(rng.choice([f"{short(p, 6)} Pa", f"{short(p / 1e3, 6)} kPa", f"{short(p / 1e5, 6)} bar"]))
    ends(draft, still, complex_constant)
    if not chain(draft):
        return None
    fill_flames(draft, T, air, still)
    if still:
        return draft
    flow = set_flow(draft, rng.choice([0.03, 0.06, 0.1, 0.15, 0.2, 0.25, 0.3, 0.34, 0.355]))
    if flow is None:
        return None
    network, stations = flow
    if any(s.pt < 0.85 * stations[0].pt for s in stations):
        return None
    for e, parsed in zip(draft.elements, network["element"]):
        e["_L"] = parsed.get("_length")
    form = state_flow(draft, stations[0])
    carry_entropy(draft, stations, draft.window[2])
    if number in PRESSURE_STATED_THROAT + FLOW_STATED_THROAT:
        with mp.workdps(25):
            s = stations[-1]
            throat = float(s.flow / steady.throat_mass_flux(s.gas, s.pt, s.Tt))
        if number % 2:
            draft.exit["throat_area"] = quoted(f"{short(throat * 1e6)} mm^2")
        else:
            draft.exit["throat_diameter"] = quoted(f"{short((throat / 0.785398163) ** 0.5 * 1000)} mm")
        if number in PRESSURE_STATED_THROAT:
            draft.hide = (("feed", form),)
        elif form == "mass_flow":
            draft.hide = (("feed", "pressure"),)
        else:
            return None
    return draft


STILL_OR_SLOW = '''title = "Invented: from flow to rest"
[search]
frequency = "40 to 900 Hz"
growth = "-300 to 300 1/s"
[feed]
gas = GAS
mach = FLOW
temperature = "350 K"
pressure = "2 bar"
end = "FEED"
[[element]]
name = "supply"
kind = "duct"
length = "0.4 m"
diameter = "60 mm"
[[element]]
name = "nozzle_in"
kind = "contraction"
effective_length = "12 mm"
[[element]]
name = "tube"
kind = "duct"
length = "0.15 m"
diameter = "35 mm"
[[element]]
name = "plate"
kind = "restriction"
loss_coefficient = 1.5
effective_length = "8 mm"
diameter = "25 mm"
[[element]]
name = "dump"
kind = "expansion"
effective_length = "5 mm"
[[element]]
name = "main_flame"
kind = "flame"
basis = "BASIS"
burnt_temperature = "1700 K"
BURNT
response = [
  { kind = "n-tau", interaction_index = 1.3, delay = "2.5 ms", reference = "tube.in" },
  { kind = "gaussian", interaction_index = -0.4, delay = "4 ms", spread = "0.9 ms", reference = "main_flame.out" },
]
[[element]]
name = "grid"
kind = "restriction"
loss_coefficient = 0.8
[[element]]
name = "chamber"
kind = "duct"
length = "0.5 m"
diameter = "80 mm"
[[element]]
name = "box"
kind = "plenum"
volume = "0.002 m^3"
[[element]]
name = "tail"
kind = "duct"
length = "0.3 m"
diameter = "50 mm"
[exit]
end = "EXIT"
'''


def still_and_slow():
    """(name, text with FLOW for the feed's Mach number): modes must go to those in still gas linearly."""
    perfect = '{ gamma = 1.38, gas_constant = "290 J/(kg K)" }'
    other = 'burnt_gas = { gamma = 1.27, molar_mass = "28.1 g/mol" }'
    for name, gas, burnt, basis, feed, end in (
        ("perfect gas, other burnt gas, heat release, closed to open", perfect, other, "heat release", "closed", "open"),
        ("perfect gas, velocity basis, reservoir to closed", perfect, "", "velocity", "reservoir", "closed"),
        ("dry air, heat release, open to anechoic", '"air"', "", "heat release", "open", "anechoic"),
    ):
        text = STILL_OR_SLOW.replace("GAS", gas).replace("BURNT", burnt).replace("BASIS", basis)
        yield name, text.replace("FEED", feed).replace("EXIT", end)
