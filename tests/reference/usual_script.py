#!/usr/bin/env python3
"""The script that an engineer would write to subtract two scope channels, timed stage by stage.

    usual_script.py FOLDER OUT.json

FOLDER holds reference_p.i16 and its like, written by the example `chain_speed` of `daemon/core`. Deskew twice (peak of
the correlation; phase slope), correction twice (FFT shift; convolution with 64 taps), difference and its numbers, levels
by histogram with a rise time, rejection by Welch. What is kept is the processor time of one run of each stage, in milliseconds. One thread:
`compare_speed` sees to it. The answers are printed too: they are not what the tool's are, but near.
"""

import json
import sys
import time

import numpy as np
import scipy.fft
import scipy.signal

STEP_V = 160.0 / 4096.0
RATE = 1e9


def timed(times, name, work):
    begun, used, runs, result = time.perf_counter(), time.process_time(), 0, None
    while runs < 3 or time.perf_counter() - begun < 1.0:
        result = work()
        runs += 1
    times[name] = 1e3 * (time.process_time() - used) / runs
    return result


def volts(codes):
    return codes.astype(np.float64) * STEP_V


def delay_by_correlation(p, n):
    c = scipy.signal.correlate(n - n.mean(), p - p.mean(), mode="full", method="fft")
    k = int(np.argmax(c))
    a, b, d = c[k - 1], c[k], c[k + 1]
    return k - (len(p) - 1) + 0.5 * (a - d) / (a - 2 * b + d)


def delay_by_phase(p, n):
    w = np.hanning(len(p))
    cross = scipy.fft.rfft((n - n.mean()) * w) * np.conj(scipy.fft.rfft((p - p.mean()) * w))
    power = np.abs(cross)
    keep = power > 1e-4 * power.max()
    omega = 2 * np.pi * np.arange(len(cross)) / len(p)
    return -np.sum(power[keep] * omega[keep] * np.angle(cross[keep])) / np.sum(power[keep] * omega[keep] ** 2)


def gain_offset(p, n):
    slope, offset = np.polyfit(p, n, 1)
    return slope, offset


def fft_shift(n, delay):
    omega = 2 * np.pi * np.arange(len(n) // 2 + 1) / len(n)
    return scipy.fft.irfft(scipy.fft.rfft(n) * np.exp(1j * omega * delay), len(n))


def fir_shift(n, delay):
    k = np.arange(-32, 32)
    h = np.sinc(k + delay) * np.kaiser(64, 10.0)
    return np.convolve(n, h / h.sum(), mode="same")


def numbers(d):
    return np.sqrt(np.mean(d * d)), d.mean(), d.std(), d.max(), d.min()


def levels(d):
    counts, edges = np.histogram(d, bins=256)
    half = len(counts) // 2
    low = edges[np.argmax(counts[:half])]
    high = edges[half + np.argmax(counts[half:])]
    a, b = low + 0.1 * (high - low), low + 0.9 * (high - low)
    above_a, above_b = np.flatnonzero((d[1:] >= a) & (d[:-1] < a)), np.flatnonzero((d[1:] >= b) & (d[:-1] < b))
    rise = above_b[np.searchsorted(above_b, above_a[0])] - above_a[0] if len(above_a) and len(above_b) else np.nan
    return low, high, rise / RATE


def rejection(d, c):
    _, pd = scipy.signal.welch(d, RATE, nperseg=4096)
    f, pc = scipy.signal.welch(c, RATE, nperseg=4096)
    return f, 10 * np.log10(pc / pd)


def main(folder, out):
    raw = {name: np.fromfile(f"{folder}/{name}.i16", dtype="<i2")
           for name in ("reference_p", "reference_n", "device_p", "device_n")}
    times = {}
    p, n = timed(times, "volts_reference", lambda: (volts(raw["reference_p"]), volts(raw["reference_n"])))
    tau = timed(times, "correlate", lambda: delay_by_correlation(p, n))
    tau_phase = timed(times, "phase", lambda: delay_by_phase(p, n))
    # Not timed: a script that a careful engineer would write takes gain and offset from the aligned records.
    aligned = fft_shift(n, tau)
    inner = slice(100, -100)
    gain, offset = gain_offset(p[inner], aligned[inner])
    back = timed(times, "shift_reference", lambda: (fft_shift(n, tau) - offset) / gain)
    d, c = timed(times, "difference_reference", lambda: (p - back, 0.5 * (p + back)))
    f, ratio = timed(times, "welch", lambda: rejection(d, c))
    p, n = timed(times, "volts_device", lambda: (volts(raw["device_p"]), volts(raw["device_n"])))
    timed(times, "convolve_device", lambda: (fir_shift(n, tau) - offset) / gain)
    back = timed(times, "shift_device", lambda: (fft_shift(n, tau) - offset) / gain)
    d = timed(times, "difference_device", lambda: p - back)
    found = timed(times, "numbers", lambda: numbers(d))
    low, high, rise = timed(times, "levels", lambda: levels(d))
    print(f"numpy {np.__version__}: delay {tau:.4f} and {tau_phase:.4f} samples, gain {gain:.6f}, rms {found[0]:.4f} V,"
          f" levels {low:.3f} and {high:.3f} V, rise {rise * 1e9:.1f} ns,"
          f" rejection at 10 MHz {ratio[np.searchsorted(f, 1e7)]:.1f} dB")
    with open(out, "w") as file:
        json.dump(times, file)


if __name__ == "__main__":
    main(*sys.argv[1:])
