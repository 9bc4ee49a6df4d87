"""Filters as second-order sections with their responses, by scipy 1.10 (scipy.signal.butter, cheby1, iirpeak, sosfreqz).

Run: python3 make_filters.py > filters.json
"""
import json
import numpy as np
from scipy import signal

RATE = 48000
HZ = np.geomspace(25, 19000, 23)


def entry(name, sos):
    _, h = signal.sosfreqz(sos, worN=HZ, fs=RATE)
    return {
        "name": name,
        "sos": [[float(v) for v in row] for row in sos],
        "hz": [float(f) for f in HZ],
        "re": [float(v) for v in h.real],
        "im": [float(v) for v in h.imag],
    }


b, a = signal.iirpeak(1000, 4, fs=RATE)
peak = signal.tf2sos(np.array(a) + 1.5 * np.array(b), a)  # 8 dB up at 1 kHz
out = [
    entry("second-order high-pass, 30 Hz", signal.butter(2, 30, "high", output="sos", fs=RATE)),
    entry("fourth-order low-pass with 1 dB ripple, 5 kHz", signal.cheby1(4, 1, 5000, output="sos", fs=RATE)),
    entry("band-pass, 100 Hz to 3 kHz", signal.butter(2, [100, 3000], "band", output="sos", fs=RATE)),
    entry("peak of 8 dB at 1 kHz, Q 4", peak),
]
print(json.dumps({"rate_hz": RATE, "filters": out}, indent=1))
