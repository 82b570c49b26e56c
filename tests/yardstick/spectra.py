"""Spectra of the tool beside scipy's, over the same records.

    cargo test --release --test signals
    python spectra.py TARGET/tmp/signals/spectra.json
    python spectra.py --time SAMPLES SEGMENT            # timing opponent of the bench beside_scipy

The records are made anew here from their recipe: a linear congruential generator and two tones.
Every value must agree to 1e-10: a power relative to itself, a cross-spectrum to the root of the
product of its powers, a coherence to one. Bins below 1e-25 of the largest on both sides hold rounding
alone (zero frequency of a boxcar less its mean) and are left out.
"""

import json
import sys
import time

import numpy as np
from scipy import signal


def congruential(n, seed):
    r, out = seed, np.empty(n)
    for k in range(n):
        r = (1103515245 * r + 12345) % 2**31
        out[k] = r / 2**31 - 0.5
    return out


def records(n, rate):
    t = np.arange(n) / rate
    x = (np.sin(2 * np.pi * 200 * t) + 0.5 * np.cos(2 * np.pi * 417.3 * t)
         + 0.1 * congruential(n, 1) + 0.3)
    late = np.concatenate([np.zeros(3), x[:-3]])
    return x, 2 * late + 0.2 * congruential(n, 7)


def compare(path):
    with open(path) as file:
        told = json.load(file)
    rate = told["rate_hz"]
    x, y = records(told["samples"], rate)
    worst = 0.0
    for case in told["cases"]:
        how = dict(fs=rate, window=case["window"], nperseg=case["segment"], noverlap=case["overlap"],
                   detrend="constant" if case["detrend"] else False)
        _, pxx = signal.welch(x, scaling="density", **how)
        _, pyy = signal.welch(y, scaling="density", **how)
        _, spectrum = signal.welch(y, scaling="spectrum", **how)
        _, pxy = signal.csd(x, y, scaling="density", **how)
        cross = np.array(case["cross_re"]) + 1j * np.array(case["cross_im"])
        coherence = np.abs(pxy) ** 2 / (pxx * pyy)
        _, from_scipy = signal.coherence(x, y, **how)
        density, coherent = np.array(case["density"]), np.array(case["coherence"])
        spectral = np.array(case["spectrum"])
        some = np.maximum(density, pxx) > 1e-25 * np.max(pxx)
        assert np.count_nonzero(~some) <= 1
        differences = {
            "density": np.max(np.abs(density / pxx - 1)[some]),
            "spectrum": np.max(np.abs(spectral / spectrum - 1)[some]),
            "cross": np.max((np.abs(cross - pxy) / np.sqrt(pxx * pyy))[some]),
            "coherence": max(np.max(np.abs(coherent - coherence)[some]),
                             np.max(np.abs(coherent - from_scipy)[some])),
        }
        shown = ", ".join(f"{k} {v:.1e}" for k, v in differences.items())
        print(f"{case['window']:8} {case['segment']:5} {case['overlap']:5}  {shown}")
        worst = max(worst, *differences.values())
    print(f"{len(told['cases'])} cases, largest difference {worst:.1e} (allowed 1e-10)")
    return worst <= 1e-10 and len(told["cases"]) > 0


def clock(samples, segment):
    """Seconds scipy takes for four channels of `tests/bench/beside_scipy.rs`, and the first's density."""
    k = np.arange(samples)
    channels = np.array([(k * k * c) % 1009 / 1009.0 - 0.5 for c in range(1, 5)])
    began = time.perf_counter()
    _, density = signal.welch(channels, fs=25600.0, nperseg=segment)
    print(json.dumps({"seconds": time.perf_counter() - began, "density": density[0].tolist()}))


if __name__ == "__main__":
    if sys.argv[1] == "--time":
        clock(int(sys.argv[2]), int(sys.argv[3]))
        sys.exit(0)
    sys.exit(0 if compare(sys.argv[1]) else 1)
