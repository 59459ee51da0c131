"""The kernel's computation vectorised in NumPy, for the benchmark, in the three forms one would write.

Arguments as kernel.c. Prints, a form a line: name, least and median time in microseconds, sums of the four field parts.
"""
import sys
import time

import numpy as np

rounds, points = int(sys.argv[1]), int(sys.argv[2])
arm_phases = [float(x) for x in sys.argv[3:5]]
rings = int(sys.argv[5])
k = np.array([float(x) for x in sys.argv[6 : 6 + rings]])
phi = np.array([float(x) for x in sys.argv[6 + rings : 6 + 2 * rings]])
omega = np.linspace(-np.pi, np.pi, points)
half = rings // 2
arms = [(arm_phases[0], k[:half], phi[:half]), (arm_phases[1], k[half:], phi[half:])]


def outputs(a0, a1):
    return 0.5 * (a0 - a1), -0.5j * (a0 + a1)


def ring_by_ring():
    z = np.exp(-1j * omega)
    found = []
    for phase, ks, phis in arms:
        arm = np.full(points, np.exp(-1j * phase))
        for t, e in zip(np.sqrt(1 - ks), np.exp(-1j * phis)):
            x = e * z
            arm *= (t - x) / (1 - t * x)
        found.append(arm)
    return outputs(*found)


def ring_products():
    z = np.exp(-1j * omega)
    found = []
    for phase, ks, phis in arms:
        top = np.full(points, np.exp(-1j * phase))
        bottom = np.ones(points, dtype=complex)
        for t, e in zip(np.sqrt(1 - ks), np.exp(-1j * phis)):
            x = e * z
            top *= t - x
            bottom *= 1 - t * x
        top /= bottom
        found.append(top)
    return outputs(*found)


def expanded_horner():
    z = np.exp(-1j * omega)
    found = []
    for phase, ks, phis in arms:
        top, bottom = np.array([np.exp(-1j * phase)]), np.array([1 + 0j])
        for t, e in zip(np.sqrt(1 - ks), np.exp(-1j * phis)):
            top = np.convolve(top, [t, -e])
            bottom = np.convolve(bottom, [1, -t * e])
        found.append(np.polyval(top[::-1], z) / np.polyval(bottom[::-1], z))
    return outputs(*found)


for form in (ring_products, ring_by_ring, expanded_horner):
    times = []
    for _ in range(rounds):
        start = time.perf_counter()
        out1, out2 = form()
        times.append(1e6 * (time.perf_counter() - start))
    times.sort()
    sums = [out1.real.sum(), out1.imag.sum(), out2.real.sum(), out2.imag.sum()]
    print(form.__name__, f"{times[0]:.3f} {times[rounds // 2]:.3f}", *(f"{s:.12g}" for s in sums))
