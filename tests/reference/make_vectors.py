"""Reference vectors for the estimation side of the analysis, made with numpy and scipy.

    python -m venv VENV && VENV/bin/pip install -r requirements.txt && VENV/bin/python make_vectors.py

writes vectors/*.json beside this file; the unit tests of the core read them. With `--check` nothing is written: what the
libraries give now is compared with what is stored. Everything is seeded: a second run gives the same files (up to the
last digits of another build of the libraries).
"""

import json
import sys
import warnings
from pathlib import Path

import numpy as np
from scipy import signal, special, stats

sys.dont_write_bytecode = True  # no cache beside the sources
import figure_vectors

with warnings.catch_warnings():
    warnings.simplefilter("ignore")
    from scipy import odr

HERE = Path(__file__).parent / "vectors"


CHECK = "--check" in sys.argv[1:]


def write(name, **values):
    plain = {key: value.tolist() if isinstance(value, np.ndarray) else value for key, value in values.items()}
    path = HERE / f"{name}.json"
    if CHECK:
        compare(name, json.loads(path.read_text()), json.loads(json.dumps(plain)))
    else:
        path.write_text(json.dumps(plain, indent=None, separators=(",", ":")) + "\n")


def compare(place, stored, made):
    """Ends the program where what is stored is not what is made; another build's rounding (1e-9) is the same."""
    if isinstance(made, dict) and isinstance(stored, dict) and made.keys() == stored.keys():
        for key in made:
            compare(f"{place}.{key}", stored[key], made[key])
    elif isinstance(made, list) and isinstance(stored, list) and len(made) == len(stored):
        for i, pair in enumerate(zip(stored, made)):
            compare(f"{place}[{i}]", *pair)
    elif not (isinstance(made, (int, float)) and isinstance(stored, (int, float)) and
              abs(made - stored) <= 1e-9 * max(1.0, abs(made))):
        sys.exit(f"vectors/{place}: {stored} is stored, {made} is made; run make_vectors.py and look at the difference")


def spectrum():
    """numpy.fft.rfft of a seeded record of 150 samples."""
    x = np.random.default_rng(1).normal(size=150) + np.sin(0.7 * np.arange(150))
    X = np.fft.rfft(x)
    write("rfft", signal=x, real=X.real, imaginary=X.imag)


def correlation():
    """The lag of scipy.signal.correlate's peak for a pulse with noise, late by 17 samples."""
    rng = np.random.default_rng(2)
    t = np.arange(400.0)
    pulse = lambda at: np.exp(-(((t - at) / 9.0) ** 2))
    p = pulse(180) + 0.02 * rng.normal(size=400)
    n = 0.9 * pulse(197) + 0.1 + 0.02 * rng.normal(size=400)
    full = signal.correlate(n - n.mean(), p - p.mean(), method="direct")
    lag = int(signal.correlation_lags(400, 400)[np.argmax(full)])
    # numpy.corrcoef over the samples both records have at that lag.
    write("correlation", p=p, n=n, lag=lag, coefficient=float(np.corrcoef(p[: 400 - lag], n[lag:])[0, 1]))


def line():
    """scipy.stats.linregress on data far from the origin."""
    rng = np.random.default_rng(3)
    x = 1.0e4 + rng.uniform(0, 5, 200)
    y = 3.0 - 0.25 * x + 0.01 * rng.normal(size=200)
    # Same numbers about the centroid: linregress itself loses digits far from the origin.
    fit = stats.linregress(x - x.mean(), y - y.mean())
    slope, at_mean = float(fit.slope), float(y.mean() + fit.intercept)
    write("line", x=x, y=y, slope=slope, u_slope=float(fit.stderr), mean_x=float(x.mean()), at_mean=at_mean)


def both_errors():
    """scipy.odr on Pearson's data with York's weights (values of the data: York 1966, quoted in York et al. 2004)."""
    x = np.array([0.0, 0.9, 1.8, 2.6, 3.3, 4.4, 5.2, 6.1, 6.5, 7.4])
    y = np.array([5.9, 5.4, 4.4, 4.6, 3.5, 3.7, 2.8, 2.8, 2.4, 1.5])
    wx = np.array([1000.0, 1000, 500, 800, 200, 80, 60, 20, 1.8, 1])
    wy = np.array([1.0, 1.8, 4, 8, 20, 20, 70, 70, 100, 500])
    model = odr.Model(lambda b, x: b[0] * x + b[1])
    data = odr.RealData(x, y, sx=wx**-0.5, sy=wy**-0.5)
    out = odr.ODR(data, model, beta0=[-0.5, 5.5], sstol=1e-15, partol=1e-15, maxit=500).run()
    write("pearson", x=x, y=y, weight_x=wx, weight_y=wy, slope=out.beta[0], intercept=out.beta[1],
          residual_variance=out.res_var, covariance=out.cov_beta)


def interpolation():
    """scipy.signal.resample (exact for whole periods) gives a band-limited record between its samples."""
    n, up = 240, 4
    rng = np.random.default_rng(4)
    bins = np.arange(1, 90)  # up to 0.37 of the sample rate
    phase, size = rng.uniform(0, 2 * np.pi, bins.size), rng.uniform(0.2, 1, bins.size)
    t = np.arange(n)
    x = (size[:, None] * np.cos(2 * np.pi * bins[:, None] * t / n + phase[:, None])).sum(0)
    fine = signal.resample(x, up * n)
    write("interpolation", signal=x, advance=0.75, shifted=np.roll(fine, -3)[::up])


def edge():
    """A square wave with error-function edges, and its copy 3.3 samples late, noise free (scipy.special.erf)."""
    t = np.arange(600.0)
    width = 10.0 / 2.563103131  # 10-90 % duration of 10 samples

    def square(t):
        s = -np.ones_like(t)
        for k in range(-2, 10):
            s += (-1.0) ** k * special.erfc(-(t - 37.4 - 75.2 * k) / (np.sqrt(2) * width))
        return s

    write("edge", p=square(t), n=0.97 * square(t - 3.3) + 0.02, lag=3.3, gain=0.97, offset=0.02)


def kernel():
    """The fractional-delay kernel from numpy's sinc and scipy's Bessel function, its window centred on the fraction."""
    cases = []
    for advance, taps in [(0.0, 44), (0.25, 44), (0.5, 44), (-3.3, 44), (12.9137, 44), (0.71, 24), (-0.001, 64)]:
        beta = np.pi * taps * (0.5 - 0.4)
        whole = int(np.floor(advance))
        k = np.arange(1 - taps // 2, taps // 2 + 1)
        x = advance - whole - k
        window = special.i0(beta * np.sqrt(np.maximum(0.0, 1 - (2 * x / taps) ** 2))) / special.i0(beta)
        window[np.abs(x) >= taps / 2] = 0.0
        if advance == whole:
            # On the grid it is scipy's own Kaiser window, whose end at a tap more is left off.
            assert np.allclose(window[:-1], signal.windows.kaiser(taps + 1, beta)[1:-1], rtol=1e-13)
        h = np.sinc(x) * window
        cases.append({"advance": advance, "first": int(whole + k[0]), "taps": (h / h.sum()).tolist()})
    write("kernel", cases=cases)


def low_pass():
    """scipy.signal.lsim of 1/(1 + s T), exact for an input that is straight between its samples."""
    rng = np.random.default_rng(5)
    x = 0.4 + np.cumsum(rng.normal(size=300)) / 10 + (np.arange(300) // 60 % 2)
    cases = []
    for samples in [0.7, 25.0, 400.0]:
        # Before the record: at its mean, settled, one sample earlier.
        before = np.concatenate([[x.mean()], x])
        _, y, _ = signal.lsim(([1.0], [samples, 1.0]), before, np.arange(301.0), X0=[x.mean() * samples], interp=True)
        cases.append({"samples": samples, "output": y[1:].tolist()})
    write("low_pass", signal=x, cases=cases)


def deming():
    """scipy.odr with one uncertainty for all x and another for all y."""
    rng = np.random.default_rng(6)
    true = rng.uniform(-2, 2, 150)
    x, y = true + 0.11 * rng.normal(size=150), 0.3 - 0.8 * true + 0.05 * rng.normal(size=150)
    data = odr.RealData(x, y, sx=0.11, sy=0.05)
    model = odr.Model(lambda b, x: b[0] * x + b[1])
    out = odr.ODR(data, model, beta0=[-0.8, 0.3], sstol=1e-15, partol=1e-15, maxit=500).run()
    write("deming", x=x, y=y, u_x=0.11, u_y=0.05, slope=out.beta[0], intercept=out.beta[1],
          residual_variance=out.res_var, covariance=out.cov_beta)


if __name__ == "__main__":
    HERE.mkdir(exist_ok=True)
    for make in (spectrum, correlation, line, both_errors, interpolation, edge, kernel, low_pass, deming):
        make()
    for make in figure_vectors.MAKERS:
        make(write)
