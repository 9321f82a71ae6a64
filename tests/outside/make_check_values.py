#!/usr/bin/env python3
"""Values from numpy and scipy that the Rust tests are checked against.

    python3 tests/outside/make_check_values.py            writes tests/outside/check_values.json
    python3 tests/outside/make_check_values.py --check    makes them anew and compares

Needs numpy and scipy (PyPI). `cargo test` needs neither: it reads the committed file. The test
signal is whole-number arithmetic, so that Rust and Python start from the same bits.
"""
import json
import pathlib
import sys

import numpy as np
from scipy import signal, stats

HERE = pathlib.Path(__file__).parent
FILE = HERE / "check_values.json"


def test_signal(count):
    """x[n] = ((n * 2654435761) mod 2^32) / 2^32 - 1/2 + ((n * 7) mod 64) / 64."""
    n = np.arange(count, dtype=np.uint64)
    noise = (n * np.uint64(2654435761)) % np.uint64(2**32)
    return noise.astype(float) / 2.0**32 - 0.5 + ((n * np.uint64(7)) % np.uint64(64)).astype(float) / 64.0


def welch(window, overlap):
    x = test_signal(8192)
    _, power = signal.welch(
        x, fs=1.0, window=window, nperseg=256, noverlap=overlap, detrend="constant", scaling="spectrum"
    )
    return power.tolist()


def values():
    revolution = test_signal(90 * 41).reshape(41, 90)
    lines = np.fft.rfft(revolution.mean(axis=0)) * 2 / 90
    probabilities = [0.001, 0.05, 0.5, 0.95, 0.999]
    freedoms = [0.5, 2.0, 14.3, 100.0, 5000.0]
    return {
        "welch_hann_50": welch("hann", 128),
        "welch_blackmanharris_75": welch("blackmanharris", 192),
        "welch_kaiser18_50": welch(("kaiser", 18.0), 128),
        "welch_hamming_0": welch("hamming", 0),
        "revolution_mean": revolution.mean(axis=0).tolist(),
        "revolution_sd": revolution.std(axis=0, ddof=1).tolist(),
        "revolution_amplitude": np.abs(lines[1:40]).tolist(),
        "revolution_phase_turns": (np.angle(lines[1:40]) / (2 * np.pi)).tolist(),
        "chi_square": [[p, f, stats.chi2.ppf(p, f)] for p in probabilities for f in freedoms],
        "normal": [[p, stats.norm.ppf(p)] for p in probabilities],
    }


def differences(old, new, path=""):
    """Yields every place where two trees of numbers differ by more than 1e-9 of the larger."""
    if isinstance(old, dict):
        if old.keys() != new.keys():
            yield f"{path}: other keys"
        for key in old.keys() & new.keys():
            yield from differences(old[key], new[key], f"{path}/{key}")
    elif isinstance(old, list):
        if len(old) != len(new):
            yield f"{path}: other length"
        for place, (a, b) in enumerate(zip(old, new)):
            yield from differences(a, b, f"{path}/{place}")
    elif abs(old - new) > 1e-9 * max(abs(old), abs(new), 1e-9):
        yield f"{path}: {old} committed, {new} now"


if __name__ == "__main__":
    made = values()
    if "--check" in sys.argv:
        wrong = list(differences(json.loads(FILE.read_text()), made))
        print("\n".join(wrong[:10]) if wrong else "check values: the committed ones are those numpy and scipy give")
        sys.exit(1 if wrong else 0)
    FILE.write_text(json.dumps(made, indent=None, separators=(",", ":")) + "\n")
