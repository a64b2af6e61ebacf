#!/usr/bin/env python3
"""The same measurement as a good laboratory would script it, for benches/measure.rs to run on the same files.

Reads captures (time_s, ramp_V, photodiode_V[, crossed_V]) with pandas' C reader, finds peaks with scipy, fits each in a
window with curve_fit and an analytic Jacobian, sorts the centres into orders and teeth of a comb, and solves
sum c_i P_i(x) - m * spacing = k * FSR for axis and spacing by weighted linear least squares, terms chosen by BIC.

Usage: reference.py FSR_HZ NOMINAL_HZ CAPTURE...   prints one JSON object a capture: spacing_hz, u_hz, times by
the clock (read_s, measure_s) and by the processor (read_cpu_s, cpu_s).
"""
import json
import sys
import time

import numpy as np
import pandas as pd
from numpy.polynomial import legendre
from scipy.optimize import curve_fit
from scipy.signal import find_peaks


def read(path):
    table = pd.read_csv(path, comment="#", engine="c", dtype=np.float64)
    return table["ramp_V"].to_numpy(), table.iloc[:, 2:].to_numpy().sum(axis=1)


def rising_ramp(ramp):
    """First sample and one past the last of the one rising ramp of a sawtooth."""
    last = int(np.argmax(ramp))
    return int(np.argmin(ramp[: last + 1])), last + 1


def lorentzian(x, centre, height, width, base):
    q = 2 * (x - centre) / width
    return base + height / (1 + q * q)


def jacobian(x, centre, height, width, base):
    q = 2 * (x - centre) / width
    line = 1 / (1 + q * q)
    return np.column_stack(
        (height * 4 * q * line**2 / width, line, height * 2 * q * q * line**2 / width, np.ones_like(x))
    )


def lines(signal):
    """Centres, their uncertainties and heights of all lines, samples and volts."""
    noise = np.median(np.abs(np.diff(signal))) / 0.9539
    base = np.percentile(signal, 5)
    window = np.ones(5) / 5
    smooth = np.convolve(signal, window, mode="same")
    floor = max(6 * noise, 0.012 * (smooth.max() - base))
    peaks, seen = find_peaks(smooth, prominence=floor, width=2)
    found = []
    for peak, width in zip(peaks, seen["widths"]):
        low, high = max(0, int(peak - 4 * width)), min(len(signal), int(peak + 4 * width) + 1)
        x = np.arange(low, high, dtype=float)
        start = (float(peak), signal[peak] - base, width, base)
        try:
            best, covariance = curve_fit(lorentzian, x, signal[low:high], p0=start, jac=jacobian)
        except RuntimeError:
            continue
        if best[1] > floor and low < best[0] < high:
            found.append((best[0], np.sqrt(covariance[0, 0]), best[1]))
    return np.array(found)


def orders_and_teeth(x, heights, fsr, nominal):
    """Order and tooth of every line: clusters are orders, neighbours in a cluster are teeth, orders are laid over each other."""
    gaps = np.diff(x)
    # A comb is much narrower than the order: the few widest gaps stand between orders.
    split = np.flatnonzero(gaps > 0.35 * gaps.max()) + 1
    clusters = np.split(np.arange(len(x)), split)
    inner = np.concatenate([np.diff(x[c]) for c in clusters if len(c) > 1])
    spacing = np.median(inner[inner < 1.6 * inner.min()])
    teeth = [np.rint((x[c] - x[c[0]]) / spacing).astype(int) for c in clusters]
    whole = max(range(len(clusters)), key=lambda k: (len(clusters[k]), -k))
    per_order = spacing * fsr / nominal
    order, tooth = np.zeros(len(x), int), np.zeros(len(x), int)
    for k, cluster in enumerate(clusters):
        away = np.rint((x[cluster[0]] - x[clusters[whole][0]]) / per_order).astype(int)
        # Which tooth the first line is: the one whose heights agree best.
        def misfit(shift):
            pairs = [
                (heights[i], heights[j])
                for i, t in zip(cluster, teeth[k] + shift)
                for j, s in zip(clusters[whole], teeth[whole])
                if t == s
            ]
            return np.mean([abs(np.log(a / b)) for a, b in pairs]) - 0.2 * len(pairs) if pairs else np.inf
        shift = min(range(-4, 5), key=misfit)
        order[cluster] = away if k != whole else 0
        tooth[cluster] = teeth[k] + shift
    # Clusters in a row are orders in a row.
    rank = {k: n for n, k in enumerate(range(len(clusters)))}
    for k, cluster in enumerate(clusters):
        order[cluster] = rank[k] - rank[whole]
    return order, tooth


def spacing_of(x, u, n, order, tooth, fsr):
    """Weighted linear solve, terms by BIC; spacing and its uncertainty, Hz."""
    z = 2 * x / n - 1
    # Uncertainty in hertz from samples by the mean slope: only its ratio between lines matters.
    weight = 1 / np.maximum(u, 1e-6)
    best = None
    for terms in range(1, 6):
        if terms + 2 > len(x) - 1:
            break
        design = np.column_stack((legendre.legvander(z, terms), -tooth.astype(float)))
        solution, *_ = np.linalg.lstsq(design * weight[:, None], order * weight, rcond=None)
        residual = (design @ solution - order) * weight
        dof = len(x) - terms - 2
        chi = float(residual @ residual)
        merit = len(x) * np.log(chi / len(x)) + (terms + 2) * np.log(len(x))
        covariance = np.linalg.inv((design * weight[:, None]).T @ (design * weight[:, None])) * chi / dof
        if best is None or merit < best[0]:
            best = (merit, solution[-1] * fsr, np.sqrt(covariance[-1, -1]) * fsr)
    return best[1], best[2]


def main():
    fsr, nominal = float(sys.argv[1]), float(sys.argv[2])
    for path in sys.argv[3:]:
        begun, begun_cpu = time.perf_counter(), time.process_time()
        ramp, signal = read(path)
        read_at, read_cpu = time.perf_counter(), time.process_time()
        try:
            first, end = rising_ramp(ramp)
            found = lines(signal[first:end])
            x, u, heights = found[:, 0], found[:, 1], found[:, 2]
            order, tooth = orders_and_teeth(x, heights, fsr, nominal)
            spacing, uncertainty = spacing_of(x, u, end - first, order, tooth, fsr)
        except (ValueError, IndexError, TypeError):
            spacing, uncertainty = None, None
        done, done_cpu = time.perf_counter(), time.process_time()
        result = {"spacing_hz": spacing, "u_hz": uncertainty, "read_s": read_at - begun, "measure_s": done - read_at}
        print(json.dumps(result | {"read_cpu_s": read_cpu - begun_cpu, "cpu_s": done_cpu - begun_cpu}))


if __name__ == "__main__":
    main()
