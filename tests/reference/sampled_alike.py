"""How far a skew is off when every edge of a reference meets the sampler at the same phase.

A square wave of which the sample rate is a whole multiple, with straight edges, behind two poles (168 MHz and 340 MHz at
1 GS/s), as its Fourier series: what lies above half the sample rate folds back exactly. The skew is the least-squares one
of the folded records. Prints, for each edge (10-90 %, in samples), the rms and the largest bias in samples over
fractions of a sample and phases of sampling. The core takes its allowance from this table (`sampled_alike`).
"""

import numpy as np

RATE, PERIOD, COUNT = 1e9, 1e-6, 1000
OMEGA = 2 * np.pi * np.fft.rfftfreq(COUNT, 1 / RATE)


def records(edge_s, skew_s, phase_s):
    k = np.arange(1, 20001)
    f = k / PERIOD
    c = (1 - (-1.0) ** k) / (2j * np.pi * k) * np.sinc(f * edge_s / 0.8) / (1 + 1j * f / 168e6) / (1 + 1j * f / 340e6)

    def sampled(late_s):
        spectrum = np.zeros(COUNT, complex)
        shifted = c * np.exp(-2j * np.pi * f * late_s)
        np.add.at(spectrum, k % COUNT, shifted)
        np.add.at(spectrum, -k % COUNT, np.conj(shifted))
        return np.fft.ifft(spectrum * COUNT).real

    return sampled(phase_s), sampled(phase_s + skew_s)


def skew(p, n, start_s):
    p, n = np.fft.rfft(p), np.fft.rfft(n)
    inside = (OMEGA > 0) & (OMEGA < 2 * np.pi * 0.45 * RATE)
    for _ in range(30):
        late = p * np.exp(-1j * OMEGA * start_s)
        slope = -1j * OMEGA * late
        start_s += np.sum((np.conj(slope) * (n - late)).real[inside]) / np.sum(np.abs(slope[inside]) ** 2)
    return start_s


if __name__ == "__main__":
    for edge in (2, 3, 4, 5, 6, 8, 10):
        bias = []
        for part in np.arange(0, 1, 0.1):
            for phase in (0.1, 0.35, 0.6, 0.85):
                true = (2 + part) / RATE
                bias.append((skew(*records(edge / RATE, true, phase / RATE), true) - true) * RATE)
        print(f"{edge:3d} samples: rms {np.std(bias):.2e}, most {np.max(np.abs(bias)):.2e} samples")
