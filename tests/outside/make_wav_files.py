#!/usr/bin/env python3
"""Makes the small WAV files the recording crate is tested on, with other
people's writers, and checks ours with their readers.

    make_wav_files.py            write crates/recording/tests/data afresh
    make_wav_files.py --check    make all files again in a temporary folder and
                                 compare them with the committed ones; then run
                                 the example write_wav and read its files back
                                 with soundfile and scipy

Needs numpy, scipy and soundfile from PyPI (made with numpy 2.4.6, scipy 1.17.1,
soundfile 0.14.0 on libsndfile 1.2.2). Nothing is random.

Each file holds 101 frames of 3 channels at 51 200 Hz: an odd number of bytes in
8 and 24 bits, so that chunks need their padding byte. The expected values are
what soundfile reads from its own plain WAV as 64-bit floats, one CSV per kind
of sample.
"""

import argparse
import pathlib
import subprocess
import sys
import tempfile

import numpy as np
import scipy.io.wavfile
import soundfile

ROOT = pathlib.Path(__file__).resolve().parents[2]
DATA = ROOT / "crates" / "recording" / "tests" / "data"
RATE = 51_200
FRAMES = 101
CHANNELS = 3
SUBTYPES = ["PCM_U8", "PCM_16", "PCM_24", "PCM_32", "FLOAT", "DOUBLE"]
FORMATS = ["WAV", "WAVEX", "RF64", "W64"]
SCIPY = {
    "PCM_U8": np.uint8,
    "PCM_16": np.int16,
    "PCM_32": np.int32,
    "FLOAT": np.float32,
    "DOUBLE": np.float64,
}


def signal():
    """Three channels that reach both ends of the scale, exactly representable
    in no short format."""
    n = np.arange(FRAMES)
    columns = [
        (n * 37 % FRAMES) / (FRAMES - 1) * 2 - 1,
        np.where(n % 2 == 0, -1.0, 1.0) * n / (FRAMES - 1),
        ((n * n) % 97) / 97 - 0.5,
    ]
    return np.stack(columns, axis=1)


def without_clock(path):
    """Zeroes the time of writing that libsndfile puts into its PEAK chunk."""
    data = bytearray(path.read_bytes())
    at = data.find(b"PEAK")
    if at >= 0:
        data[at + 12 : at + 16] = b"\0\0\0\0"
        path.write_bytes(data)


def make(folder):
    folder.mkdir(parents=True, exist_ok=True)
    x = signal()
    for subtype in SUBTYPES:
        for kind in FORMATS:
            path = folder / f"{subtype}_{kind}.{'w64' if kind == 'W64' else 'wav'}"
            soundfile.write(path, x, RATE, subtype=subtype, format=kind)
            without_clock(path)
        values, _ = soundfile.read(folder / f"{subtype}_WAV.wav", dtype="float64")
        lines = [",".join(repr(float(v)) for v in row) for row in values]
        (folder / f"{subtype}.csv").write_text("\n".join(lines) + "\n")
        if subtype in SCIPY:
            # the same stored numbers, through scipy's writer
            if subtype == "PCM_U8":
                stored = (values * 128 + 128).astype(np.uint8)
            elif subtype.startswith("PCM"):
                bits = int(subtype[4:])
                stored = (values * 2.0 ** (bits - 1)).astype(SCIPY[subtype])
            else:
                stored = values.astype(SCIPY[subtype])
            scipy.io.wavfile.write(folder / f"{subtype}_scipy.wav", RATE, stored)


def compare(fresh):
    """Names of the files that differ from the committed ones."""
    wrong = []
    names = {p.name for p in fresh.iterdir()} | {p.name for p in DATA.iterdir()}
    for name in sorted(names):
        old, new = DATA / name, fresh / name
        if not (old.exists() and new.exists()):
            wrong.append(f"{name}: only in {'the new' if new.exists() else 'the committed'} set")
        elif old.read_bytes() == new.read_bytes():
            continue
        elif name.endswith(".csv"):
            wrong.append(f"{name}: values differ")
        else:
            # another version of a writer may lay out its header otherwise
            a, rate_a = soundfile.read(old, dtype="float64")
            b, rate_b = soundfile.read(new, dtype="float64")
            if rate_a != rate_b or not np.array_equal(a, b):
                wrong.append(f"{name}: samples differ")
            else:
                print(f"note: {name} holds the same samples in other bytes")
    return wrong


def check_written(folder):
    """Reads what the example write_wav wrote; it names its files
    `CHANNELS_BITS.wav` and states its formula."""
    wrong = []
    files = sorted(folder.glob("*.wav"))
    if len(files) != 4:
        wrong.append(f"write_wav wrote {len(files)} files, expected 4")
    for path in files:
        channels, bits = map(int, path.stem.split("_"))
        n = np.arange(1000)[:, None]
        c = np.arange(channels)[None, :]
        k = (n * 7919 + c * 104_729) % 65_536
        expected = k / 65_536 * 3 - 1.5 if bits == 32 else (k - 30_000) / 3
        x, rate = soundfile.read(path, dtype="float64", always_2d=True)
        if rate != 48_000 or not np.array_equal(x, expected):
            wrong.append(f"{path.name}: soundfile reads something else")
        subtype = soundfile.info(path).subtype
        if subtype != {32: "FLOAT", 64: "DOUBLE"}[bits]:
            wrong.append(f"{path.name}: soundfile calls it {subtype}")
        rate, x = scipy.io.wavfile.read(path)
        x = x.reshape(len(x), -1)
        if rate != 48_000 or x.dtype != f"float{bits}" or not np.array_equal(x, expected):
            wrong.append(f"{path.name}: scipy reads something else")
    return wrong


def main():
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--check", action="store_true", help="compare, write nothing")
    if not parser.parse_args().check:
        make(DATA)
        return 0
    with tempfile.TemporaryDirectory() as folder:
        folder = pathlib.Path(folder)
        make(folder / "made")
        wrong = compare(folder / "made")
        (folder / "written").mkdir()
        subprocess.run(
            ["cargo", "run", "--quiet", "-p", "shaftwise-recording", "--example", "write_wav"]
            + ["--", str(folder / "written")],
            cwd=ROOT,
            check=True,
        )
        wrong += check_written(folder / "written")
    for line in wrong:
        print(f"wrong: {line}", file=sys.stderr)
    if not wrong:
        print("WAV files: made again alike; ours read back alike by soundfile and scipy")
    return 1 if wrong else 0


if __name__ == "__main__":
    sys.exit(main())
