"""Reference vectors for the figures and the spectrum: numpy's and scipy's answers on seeded samples.

make_vectors.py calls what stands in MAKERS with its own way of writing. Each answer follows from its definition by
another way than ours: levels as plain means of samples that a stated distance from every transition keeps clean,
durations and places from crossings on a cubic spline, harmonics from a linear least-squares solution.
"""

import numpy as np
from scipy import interpolate, signal, special

INTERVAL_S = 1e-9


def spectrum(write):
    """scipy.signal.welch, both scalings, of a seeded record: a sine, a mean and white noise."""
    rng = np.random.default_rng(41)
    t = np.arange(1500) * INTERVAL_S
    x = 0.7 + 3.0 * np.sin(2 * np.pi * 61.3e6 * t) + 0.05 * rng.normal(size=t.size)
    with_window = dict(fs=1 / INTERVAL_S, window="hann", nperseg=256, noverlap=128, detrend="constant")
    _, density = signal.welch(x, scaling="density", **with_window)
    _, power = signal.welch(x, scaling="spectrum", **with_window)
    write("welch", interval_s=INTERVAL_S, signal=x, density=np.sqrt(density), rms=np.sqrt(power))


def pulse(write):
    """Levels, durations, period, duty, slews and times beyond thresholds of a pulse train, noise free."""
    points, period, width, sigma = 3900, 901.7, 0.31, 6.3
    t = np.arange(points, dtype=float)

    def edges(t):
        y = np.zeros_like(t)
        for k in range(-1, 6):
            rise, fall = 143.2 + k * period, 143.2 + (k + width) * period
            y += 0.5 * (special.erf((t - rise) / sigma / np.sqrt(2)) - special.erf((t - fall) / (2 * sigma) / np.sqrt(2)))
        return -0.5 + 12.5 * y

    x = edges(t)
    middle = 0.5 * (x.min() + x.max())
    places = np.flatnonzero(np.diff(np.sign(x - middle)))
    clean = np.min(np.abs(t[:, None] - places[None, :]), axis=1) > 80
    low, high = x[clean & (x < middle)].mean(), x[clean & (x > middle)].mean()
    spline = interpolate.CubicSpline(t, x)

    def crossings(level, rising):
        found = np.sort(spline.solve(level, extrapolate=False))
        return found[(spline(found, 1) > 0) == rising]

    at = lambda part: low + part * (high - low)
    rise = np.mean(crossings(at(0.9), True)[:4] - crossings(at(0.1), True)[:4])
    fall = np.mean(crossings(at(0.1), False)[:4] - crossings(at(0.9), False)[:4])
    ups, downs = crossings(at(0.5), True), crossings(at(0.5), False)
    mean_period = np.polyfit(np.arange(ups.size), ups, 1)[0]
    count = min(ups.size, downs.size)
    duty = np.mean(downs[:count] - ups[:count]) / mean_period
    span = (ups[0], ups[-1])

    def above(level):
        fine = np.linspace(*span, 4_000_001)
        return np.mean(spline(fine) > level) * (span[1] - span[0]) / (ups.size - 1)

    write(
        "pulse", interval_s=INTERVAL_S, signal=x, high_level=high, low_level=low, amplitude=high - low,
        rise_time=rise * INTERVAL_S, fall_time=fall * INTERVAL_S, period=mean_period * INTERVAL_S, duty=duty,
        rise_slew=0.8 * (high - low) / rise / INTERVAL_S, fall_slew=0.8 * (high - low) / fall / INTERVAL_S,
        time_above=above(8.0) * INTERVAL_S, time_below=(mean_period - above(1.0)) * INTERVAL_S,
    )


def distortion(write):
    """Total harmonic distortion of 17.3 periods by numpy.linalg.lstsq at the known frequency."""
    rng = np.random.default_rng(43)
    points = 3000
    t = np.arange(points)
    angle = 2 * np.pi * 17.3 / points * t
    x = 0.2 + 2 * np.cos(angle + 0.3) + 0.05 * np.cos(2 * angle - 1) + 0.03 * np.cos(3 * angle) + 1e-4 * rng.normal(size=points)
    basis = [np.ones(points)] + [f(k * angle) for k in range(1, 11) for f in (np.cos, np.sin)]
    solution = np.linalg.lstsq(np.array(basis).T, x, rcond=None)[0]
    power = solution[1::2] ** 2 + solution[2::2] ** 2
    write("harmonics", signal=x, periods=17.3, power=power, thd=float(np.sqrt(power[1:].sum() / power[0])))


MAKERS = (spectrum, pulse, distortion)
