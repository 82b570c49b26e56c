"""Files written by general-purpose libraries, read and analysed by the tool, beside the same samples through scipy.

    python records.py TARGET/release/stillflame

WAV by scipy.io.wavfile (whole numbers of 16 and 32 bits, floats of 32 and 64), dataset 58 by pyuff (text in
single and double, binary in double, and in single as pyuff reads it back), CSV by numpy. Levels and power densities must agree with what scipy.signal.welch gives for
the samples as the file holds them: to 1e-10 of the largest, or to the digits that a text dataset keeps.
"""

import json
import pathlib
import subprocess
import sys
import tempfile

import numpy as np
import pyuff
from scipy import signal
from scipy.io import wavfile

RATE = 2560
SEGMENT = 512


def samples():
    rng = np.random.default_rng(20)
    t = np.arange(20 * RATE) / RATE
    noise = signal.lfilter([1.0], [1.0, -1.6, 0.9], rng.standard_normal((2, t.size)))
    return np.array([0.02 * noise[0] + 0.1 * np.sin(2 * np.pi * 212.5 * t), 0.03 * noise[1] - 0.05])


def ask(tool, path, *more):
    command = [tool, "spectrum", str(path), "--json", "--bin-width", f"{RATE / SEGMENT} Hz", "--frequency", "10 to 1000 Hz", *more]
    ran = subprocess.run(command, capture_output=True, text=True, check=False)
    told = json.loads(ran.stdout)
    if ran.returncode != 0:
        raise SystemExit(f"{path.name}: {ran.stderr}")
    return told


def compare(name, told, channels, allowed):
    worst = 0.0
    assert abs(told["record"]["rate_hz"] / RATE - 1) < 1e-9, told["record"]
    assert told["record"]["samples"] == channels.shape[1]
    for channel, x in zip(told["channels"], channels):
        f, p = signal.welch(x, fs=RATE, window="hann", nperseg=SEGMENT, noverlap=SEGMENT // 2)
        inside = (f >= 10) & (f <= 1000)
        got = np.array(channel["density"])
        worst = max(
            worst,
            np.max(np.abs(got - p[inside])) / np.max(p),
            abs(channel["rms_about_mean"] / np.std(x) - 1),
            abs(channel["mean"] - np.mean(x)) / np.std(x),
            abs(channel["highest"] - np.max(x)) / np.std(x),
        )
    for pair in told["pairs"]:
        f, c = signal.coherence(channels[0], channels[1], fs=RATE, nperseg=SEGMENT)
        inside = (f >= 10) & (f <= 1000)
        worst = max(worst, np.max(np.abs(np.array(pair["coherence"]) - c[inside])))
    print(f"{name:28} {worst:.1e} (allowed {allowed:.0e})")
    return worst <= allowed


def singles(source, path):
    """A binary file of doubles as one of singles: the number of bytes in the first line of a dataset, the type in its seventh, the values."""
    rest, out = source.read_bytes(), b""
    while rest:
        lines = rest.split(b"\n", 13)
        head, rest = lines[:13], lines[13]
        # -1, 58b ... bytes, five titles, the identification, type and abscissa, four axes.
        count = int(head[1].split()[4])
        head[1] = head[1].replace(b"%12d" % count, b"%12d" % (count // 2), 1)
        fields = head[8].split()
        assert fields[0] == b"4", head[8]
        head[8] = head[8].replace(b"4", b"2", 1)
        values = np.frombuffer(rest[:count], "<f8").astype("<f4").tobytes()
        rest = rest[count:]
        end = rest.index(b"-1\n") + 3
        out += b"\n".join(head) + b"\n" + values + rest[:end]
        rest = rest[end:]
    path.write_bytes(out)


def main(tool):
    x = samples()
    sound = []
    full = ["--names", "p1, p2", "--calibration", "p1 = 1 Pa", "--calibration", "p2 = 1 Pa"]
    with tempfile.TemporaryDirectory() as folder:
        folder = pathlib.Path(folder)
        for kind, scale in [("int16", 2.0**15), ("int32", 2.0**31), ("float32", None), ("float64", None)]:
            path = folder / f"{kind}.wav"
            stored = x if scale is None else np.round(x * scale)
            stored = stored.astype(kind)
            wavfile.write(path, RATE, stored.T)
            held = stored.astype(float) / (scale or 1.0)
            sound.append(compare(f"WAV {kind}", ask(tool, path, *full), held, 1e-10))
        # pyuff writes binary values as doubles whatever their head says, and only adds them right; singles are below.
        for binary, double in [(0, False), (0, True), (1, True)]:
            path = folder / f"b{binary}d{int(double)}.uff"
            for i, row in enumerate(x):
                data = pyuff.prepare_58(
                    binary=binary, func_type=1, rsp_node=i + 1, rsp_dir=3, ref_dir=3, ref_node=0,
                    rsp_ent_name=f"p{i + 1}", ref_ent_name="NONE", data=row, x=np.arange(row.size) / RATE,
                    id1="synthetic", abscissa_spacing=1, num_pts=row.size, abscissa_min=0.0,
                    abscissa_inc=1 / RATE, spec_data_type=1, ordinate_spec_data_type=15,
                    orddenom_spec_data_type=0, ordinate_axis_units_lab="Pa",
                    abscissa_spec_data_type=17, abscissa_axis_units_lab="s",
                    ord_data_type=4 if double else 2)
                pyuff.UFF(str(path)).write_sets(data, "add", force_double=double)
            held = np.array([s["data"] for s in pyuff.UFF(str(path)).read_sets()], dtype=float)
            word = "binary" if binary else "text"
            sound.append(compare(f"58 {word}, double {double}", ask(tool, path), held, 1e-10))
        path = folder / "b1d0.uff"
        singles(folder / "b1d1.uff", path)
        held = np.array([s["data"] for s in pyuff.UFF(str(path)).read_sets()], dtype=float)
        # pyuff and the tool must both see the doubles rounded to singles.
        assert np.array_equal(held, x.astype(np.float32).astype(float))
        sound.append(compare("58 binary, single", ask(tool, path), held, 1e-10))
        path = folder / "record.csv"
        t = np.arange(x.shape[1]) / RATE
        np.savetxt(path, np.column_stack([t, *x]), delimiter=",", fmt="%.17g", header="time [s],p1 [Pa],p2 [Pa]", comments="")
        sound.append(compare("CSV", ask(tool, path), x, 1e-10))
    return all(sound) and len(sound) == 9


if __name__ == "__main__":
    sys.exit(0 if main(sys.argv[1]) else 1)
