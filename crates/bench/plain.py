"""The plain way, with numpy and scipy: one process, no care taken.

    python3 plain.py FILE TACH_CHANNEL

WAV read, straight edges at the tach's half level, cubic spline through the pulses, cubic spline of
each channel at 128 samples a revolution, Welch's spectrum of blocks of 16 revolutions with 50 %
overlap, and the mean revolution by reshaping.
"""
import sys

import numpy as np
from scipy import interpolate, io, signal

rate, data = io.wavfile.read(sys.argv[1])
tach = data[:, int(sys.argv[2]) - 1].astype(float)
level = 0.5 * (tach.min() + tach.max())
rising = np.flatnonzero((tach[:-1] < level) & (tach[1:] >= level))
edges = (rising + (level - tach[rising]) / (tach[rising + 1] - tach[rising])) / rate
revs = np.arange(len(edges))
time_of_angle = interpolate.CubicSpline(revs, edges)
per_rev = 128
angles = np.arange((len(edges) - 1) * per_rev) / per_rev
instants = time_of_angle(angles)
seconds = np.arange(len(tach)) / rate
for channel in range(data.shape[1]):
    if channel == int(sys.argv[2]) - 1:
        continue
    samples = interpolate.CubicSpline(seconds, data[:, channel].astype(float))(instants)
    orders, power = signal.welch(samples, fs=per_rev, window="hann", nperseg=16 * per_rev, scaling="spectrum")
    mean = samples.reshape(-1, per_rev).mean(axis=0)
    print(channel + 1, orders[power.argmax()], np.sqrt(power.max()), mean.std())
