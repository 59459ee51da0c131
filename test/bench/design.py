"""What SciPy does of a design, for the benchmark: zeros, poles and second-order sections, then the field on a grid.

Reads commands from standard input, a line each: `form rounds`. Answers a line of JSON: times in microseconds, and sums
of |H|² over the grid, that both sides computed the same. Forms: `ellip` (order given), `iirdesign` (order found).
"""
import json
import sys
import time

import numpy as np
from scipy import signal

points, ripple, rejection, edge, stop = int(sys.argv[1]), *(float(x) for x in sys.argv[2:6])
omega = np.linspace(-np.pi, np.pi, points)


def ellip():
    return signal.ellip(4, ripple, rejection, edge, output="sos")


def iirdesign():
    return signal.iirdesign(edge, stop, ripple, rejection, ftype="ellip", output="sos")


forms = {"ellip": ellip, "iirdesign": iirdesign}
print("ready", flush=True)
for line in sys.stdin:
    name, rounds = line.split()
    times = []
    for _ in range(int(rounds)):
        start = time.perf_counter()
        _, field = signal.sosfreqz(forms[name](), worN=omega)
        times.append(1e6 * (time.perf_counter() - start))
    power = np.abs(field) ** 2
    print(json.dumps({"times": times, "sums": [power.sum(), (power * np.arange(points)).sum() / points]}), flush=True)
