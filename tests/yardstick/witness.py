"""Independent witness of the modes of a network.

    python witness.py --self-check            closed-form cases of tests/data, and M -> 0
    python witness.py --solve FILE...         modes of network files
    python witness.py --json FILE... [--jobs 2]   the same, one JSON object a line
    python witness.py --make 50 [--jobs 2]    write ../data/witness_modes.json

exp(s t), s = sigma + i omega. Written from the conventions and balances of the physics alone; it shares no code
with the program it witnesses.
"""

import os

os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")

import argparse
import json
import sys
import time
from multiprocessing import Pool
from pathlib import Path

import mpmath
from mpmath import mp, mpf

import assembly
import chain_export
import chains_numpy
import gases
import networks
import scattering
import search
import steady
from determinant import Matrix
from quantities import interval, parse

DATA = Path(__file__).resolve().parent.parent / "data"
FEWEST = 5  # modes a network should have to be worth keeping
mp.dps = assembly.LINEARISING_DIGITS


def window(network):
    """(sigma_low, sigma_high, omega_low, omega_high) of a parsed network."""
    low, high = interval(network["search"]["frequency"])
    growth = interval(network["search"]["growth"])
    return growth[0], growth[1], 2 * mp.pi * low, 2 * mp.pi * high


def solve(text, box=None):
    """Mean flow, modes as (s, multiplicity) and search figures of a network text."""
    network = parse(text)
    stations = steady.solve(network)
    matrix = Matrix(assembly.assemble(network, stations))
    box = box or window(network)
    mirrored = box[2] == 0
    if mirrored and assembly.has_complex_constant(network):
        raise ValueError("a complex constant needs a window above the real axis")
    modes, figures = search.find(matrix, box, mirrored)
    return network, stations, modes, figures


def digits(x, n=25):
    return mp.nstr(x, n, strip_zeros=False)


def _mean_flow(network, stations):
    out = []
    for k, e in enumerate(network["element"]):
        for side, s in (("in", stations[k]), ("out", stations[k + 1])):
            out.append({
                "element": e["name"], "side": side, "pressure_pa": digits(s.p, 20),
                "temperature_k": digits(s.T, 20), "velocity_m_s": digits(s.u, 20),
                "density_kg_m3": digits(s.rho, 20), "sound_speed_m_s": digits(s.c, 20),
                "mach": digits(s.mach, 20), "area_m2": digits(s.A, 20),
            })
    return out


def distance_to_edges(s, box):
    """Distance of a root from the four edges of a box, as a fraction of |s|."""
    x, y = mp.re(s), mp.im(s)
    edges = [(x - box[0], y, box[2], box[3]), (x - box[1], y, box[2], box[3])]
    near = [abs(d) if lo <= v <= hi else mp.hypot(d, min(abs(v - lo), abs(v - hi))) for d, v, lo, hi in edges]
    edges = [(y - box[2], x, box[0], box[1]), (y - box[3], x, box[0], box[1])]
    near += [abs(d) if lo <= v <= hi else mp.hypot(d, min(abs(v - lo), abs(v - hi))) for d, v, lo, hi in edges]
    return [d / abs(s) for d in near]


def clear_window(text, wanted, number):
    """Shift the window's edges until no root stands nearer than 2e-3 |s| to one.

    wanted = (f_low, f_high, g_low, g_high) as integers [Hz, 1/s]; f_low = 0 stays. Returns the shifted
    integers, or None where that fails or too few roots lie inside.
    """
    f0, f1, g0, g1 = wanted
    rim = 24
    low = 0 if f0 == 0 else max(f0 - rim // 4, 2)
    box = (mpf(g0 - rim), mpf(g1 + rim), 2 * mp.pi * low, 2 * mp.pi * (f1 + rim // 2))
    network = parse(text)
    roots = search.sketch(Matrix(assembly.assemble(network, steady.solve(network))), box)

    if sum(box[0] < mp.re(s) < box[1] and box[2] <= mp.im(s) < box[3] for s in roots) < FEWEST:
        return None
    if number in networks.REAL_ROOT and not any(abs(mp.im(s)) < mpf(10) ** -20 * abs(s) for s in roots):
        return None

    def clear(candidate):
        b = (mpf(candidate[2]), mpf(candidate[3]), 2 * mp.pi * candidate[0], 2 * mp.pi * candidate[1])
        for s in roots:
            d = distance_to_edges(s, b)
            if candidate[0] == 0:
                d = d[:2] + d[3:]
                real = abs(mp.im(s)) < mpf(10) ** -20 * abs(s)
                if not real and abs(mp.im(s)) < mpf("0.002") * abs(s):
                    return False
            if min(d) < mpf("0.002"):
                return False
        return True

    shifts = sorted(
        ((a, b, c, d) for a in range(0, 3) for b in range(0, 6) for c in range(0, 8) for d in range(0, 8)), key=sum)
    for a, b, c, d in shifts:
        candidate = (f0 and f0 - a, f1 + 2 * b, g0 - 3 * c, g1 + 3 * d)
        if clear(candidate):
            return candidate
    return None


def make_one(number):
    """Draw, check and solve network `number`; draws again where a draw has no mean flow or no clear window."""
    started = time.time()
    mp.dps = assembly.LINEARISING_DIGITS
    for attempt in range(200):
        draft = networks.draw(number, attempt)
        if draft is None:
            continue
        try:
            placed = clear_window(draft.text(), draft.window, number)
            if placed is None:
                continue
            draft.window = placed
            text = draft.text()
            network, stations, modes, figures = solve(text)
            nearest = min((min(distance_to_edges(s, window(network))) for s, _ in modes), default=1)
            if len(modes) < FEWEST or (nearest < mpf("0.001") and draft.window[0] > 0):
                continue
        except (search.Incomplete, ArithmeticError) as problem:
            print(f"network {number}, attempt {attempt}: {problem}", file=sys.stderr)
            continue
        break
    else:
        raise RuntimeError(f"network {number}: no draw was accepted")
    box = window(network)
    entry = {
        "id": f"w{number:02d}",
        "about": draft.about(),
        "toml": text,
        "window": {"frequency_hz": list(draft.window[:2]), "growth_per_s": list(draft.window[2:])},
        "count": sum(m for _, m in modes),
        "modes": [{"s_re": digits(mp.re(s)), "s_im": digits(mp.im(s)), "multiplicity": m} for s, m in modes],
        "mean_flow": _mean_flow(network, stations),
    }
    if mp.mpf(0) == box[2]:
        entry["count_with_conjugates"] = figures["expected"]
    line = (f"{entry['id']}: {entry['count']} modes, {matrix_size(network)} unknowns, M <= {float(max(s.mach for s in stations)):.3f}, "
            f"attempt {attempt}, {figures['how']}, {time.time() - started:.0f} s; {entry['about']}")
    return entry, line


def matrix_size(network):
    return 3 * (len(network["element"]) + 1)


def header(entries):
    return {
        "_about": "Invented random networks, no real rig. Modes of each in its window, solved by tests/yardstick/witness.py "
        f"with mpmath {mpmath.__version__} at {search.DIGITS} digits (linearised at {assembly.LINEARISING_DIGITS}); complete by the "
        "argument principle, each count taken from two sets of samples. s = sigma + i omega [1/s], exp(s t). Every root has Im s >= 0, lies in the "
        "window and is at least 1e-3 |s| from its edges. `count` counts the listed roots with multiplicity. "
        "Regenerate: see tests/yardstick/README.md (`python witness.py --make 50`).",
        "molar_gas_constant_j_mol_k": gases.MOLAR_GAS_CONSTANT,
        "air": {
            "mole_fractions": {k: v[0] for k, v in gases.AIR.items()},
            "atomic_weights_g_mol": gases.ATOMIC_WEIGHTS,
            "polynomials": "NASA TM-4513 (McBride, Gordon & Reno 1993)",
            "sensible_enthalpy_from_k": gases.REFERENCE_TEMPERATURE,
        },
        "networks": entries,
    }


def make(total, jobs):
    os.nice(10)
    entries = []
    with Pool(jobs) as pool:
        for entry, line in pool.imap(make_one, range(total)):
            print(line, flush=True)
            entries.append(entry)
            (DATA / "witness_modes.json").write_text(json.dumps(header(entries), indent=1) + "\n")
    print(f"{len(entries)} networks, {sum(e['count'] for e in entries)} modes")


def self_check():
    """Closed-form cases to 1e-12 |s| with their counts, and modes at M = 1e-7 against those in still gas."""
    cases = json.loads((DATA / "closed_form.json").read_text())["cases"]
    failures = 0
    for name, case in cases.items():
        text = (DATA / case["network"]).read_text()
        _, stations, modes, figures = solve(text)
        worst = mpf(0)
        for listed in case["eigenvalues"]:
            s = mp.mpc(listed["s_re"], listed["s_im"])
            worst = max(worst, min(abs(s - z) for z, _ in modes) / abs(s))
        if "mean_flow" in case:
            first, last = stations[0], stations[-1]
            for key, value in (("u1", first.u), ("u2", last.u), ("p2_over_p1", last.p / first.p), ("M2", last.mach)):
                worst = max(worst, abs(value / mpf(case["mean_flow"][key]) - 1))
        distinct = len(modes)
        count = sum(m for _, m in modes)
        good = worst < mpf("1e-12") and count == case["count"] and distinct == len(case["eigenvalues"])
        failures += not good
        print(f"{'ok  ' if good else 'FAIL'} {name}: {distinct} roots, count {count}, worst difference {mp.nstr(worst, 2)}")
    for name, worst, limit in scattering.check():
        failures += worst > limit
        print(f"{'ok  ' if worst <= limit else 'FAIL'} {name}: scattering, worst difference {mp.nstr(worst, 2)}")
    for name, text in networks.still_and_slow():
        still = solve(text.replace("FLOW", "0"))[2]
        errors = []
        for mach in ("1e-4", "1e-6"):
            slow = solve(text.replace("FLOW", mach))[2]
            if len(slow) != len(still):
                errors = None
                break
            errors.append(max(abs(a - b) / abs(a) for (a, _), (b, _) in zip(still, slow)))
        good = errors is not None and errors[1] < mpf("1e-4") and abs(errors[0] / errors[1] / 100 - 1) < mpf("0.05")
        failures += not good
        shown = "counts differ" if errors is None else ", ".join(mp.nstr(e, 3) for e in errors)
        print(f"{'ok  ' if good else 'FAIL'} {name}: {len(still)} modes at rest; at M = 1e-4, 1e-6 off by {shown}")
    for path in sorted((Path(__file__).parent / "chains").glob("*.toml")):
        network, stations, modes, _ = solve(path.read_text())
        arrays = chain_export.export(network, stations)
        kept = json.loads(path.with_suffix(".json").read_text())
        roots, expected, found = chains_numpy.mode_list(chains_numpy.Chain(kept))
        worst = max(min(abs(complex(s) - z) for z in roots) / abs(complex(s)) for s, _ in modes)
        full = reduction_error(network, stations)
        good = arrays == kept and expected == found and len(roots) == len(modes) and worst < 1e-9 and full < mpf(10) ** -30
        failures += not good
        print(f"{'ok  ' if good else 'FAIL'} chain {path.stem}: {len(roots)} roots in NumPy, {len(modes)} here, worst difference "
              f"{worst:.1e}; det A without and with its ducts: ratio constant to {mp.nstr(full, 2)}")
    return failures


def reduction_error(network, stations):
    """How far det A as assembled over det A with ducts and ends substituted is from a constant."""
    rows = assembly.assemble(network, stations)
    matrix = Matrix(rows)
    ratios = []
    for s in (mp.mpc(-120, 700), mp.mpc(250, 2300), mp.mpc(40, 4100)):
        whole = mp.matrix(len(rows), len(rows))
        for i, row in enumerate(rows):
            for column, terms in row.terms.items():
                whole[i, column] = sum(q * s**k * mp.exp(-s * tau + s * s * w / 2) for q, k, tau, w in terms)
        ratios.append(mp.det(whole) / matrix.det(s))
    return max(abs(r / ratios[0] - 1) for r in ratios)


def solve_to_json(name):
    """One line of --json: modes, or why there are none."""
    mp.dps = assembly.LINEARISING_DIGITS
    try:
        _, _, modes, figures = solve(Path(name).read_text())
    except Exception as problem:  # whatever it cannot do is told, and ends no other network
        return json.dumps({"file": name, "problem": f"{type(problem).__name__}: {problem}"})
    listed = [[float(mp.re(s)), float(mp.im(s)), m] for s, m in modes]
    return json.dumps({"file": name, "modes": listed, "how": figures["how"]})


def main():
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--self-check", action="store_true")
    parser.add_argument("--make", type=int, metavar="COUNT")
    parser.add_argument("--solve", nargs="+", metavar="FILE")
    parser.add_argument("--json", nargs="+", metavar="FILE")
    parser.add_argument("--jobs", type=int, default=2)
    options = parser.parse_args()
    if options.self_check:
        sys.exit(1 if self_check() else 0)
    for name in options.solve or []:
        _, _, modes, figures = solve(Path(name).read_text())
        print(f"{name}: {figures}")
        for s, m in modes:
            print(f"  {mp.nstr(mp.im(s) / (2 * mp.pi), 12)} Hz  {mp.nstr(mp.re(s), 12)} 1/s  x{m}")
    if options.json:
        with Pool(options.jobs) as pool:
            for line in pool.imap_unordered(solve_to_json, options.json):
                print(line, flush=True)
    if options.make:
        make(options.make, options.jobs)


if __name__ == "__main__":
    main()
