"""Reference values for the uncertainty side of the analysis, made with GTC, numpy and scipy.

    python -m venv VENV && VENV/bin/pip install -r requirements.txt
    VENV/bin/python uncertainty.py           # writes vectors/budget.json, half_width.json and transfer.json
    VENV/bin/python uncertainty.py --check   # computes them again and compares with what is stored

The unit tests of the core read the files. GTC (the GUM Tree Calculator) propagates uncertain numbers by automatic
differentiation through the formulas below, sample by sample; it shares no formula with the core.
"""

import json
import sys
from pathlib import Path

import numpy as np
from GTC import component, get_correlation, result, set_correlation, sqrt, type_b, ureal, value, uncertainty
from scipy import integrate, optimize, stats

HERE = Path(__file__).parent / "vectors"


def slope(b, interval):
    """Five-point central difference; the two samples at each end repeat their neighbour."""
    s = np.empty_like(b)
    s[2:-2] = (8 * (b[3:-1] - b[1:-3]) - (b[4:] - b[:-4])) / (12 * interval)
    s[:2], s[-2:] = s[2], s[-3]
    return s


def budget():
    """A difference of 240 samples on a swinging node: mean and rms with their budgets.

    D_i = (1 + e)·(P_i − (N_i − o)/g − b'_i·t), b' the slope of (N − o)/g: what a skew error t adds to N(t + τ).
    Gain and offset are correlated; the scale e is rectangular; each sample of each leg has its own noise.
    """
    rng = np.random.default_rng(20)
    n, interval = 240, 1e-9
    t = np.arange(n)
    node = 24.0 + 24.0 * np.tanh(8 * np.sin(2 * np.pi * t / 97.0))
    d = 3.0 + 2.0 * np.sin(2 * np.pi * t / 31.0) + 0.1 * rng.normal(size=n)
    gain, offset = 0.97, 0.3
    # A capture is kept in single precision: the values that both work on are made such before.
    d, node = (x.astype(np.float32).astype(np.float64) for x in (d, node))
    positive, negative = node + d, gain * node + offset
    # Small against the signal: the part of second order (s² against R²) must stay below what is compared.
    noise_p, noise_n = 2e-4, 3e-4
    u_gain, u_offset, r, u_skew, spec = 4e-4, 9e-3, -0.7, 15e-12, 5e-4

    g, o = ureal(gain, u_gain, independent=False, label="gain"), ureal(offset, u_offset, independent=False, label="offset")
    set_correlation(r, g, o)
    skew = ureal(0.0, u_skew, label="skew")
    e = ureal(0.0, type_b.uniform(spec), label="scale")
    p = [ureal(x, noise_p) for x in positive]
    q = [ureal(x, noise_n) for x in negative]
    b = (negative - offset) / gain
    db = slope(b, interval)
    difference = [result((1 + e) * (p[i] - (q[i] - o) / g - db[i] * skew)) for i in range(n)]
    mean = result(sum(difference) / n)
    rms = result(sqrt(sum(x * x for x in difference) / n))
    parts = lambda y: dict(
        value=value(y), u=uncertainty(y),
        noise=float(np.sqrt(sum(component(y, x) ** 2 for x in p + q))),
        gain=abs(component(y, g)), offset=abs(component(y, o)), skew=abs(component(y, skew)), scale=abs(component(y, e)))
    return dict(
        difference=d.tolist(), negative=node.tolist(), interval_s=interval, gain=gain, offset_v=offset,
        u_gain=u_gain, u_offset_v=u_offset, gain_offset=get_correlation(g, o), u_skew_s=u_skew, scale_spec=spec,
        noise_p_v=noise_p, noise_n_v=noise_n, mean=parts(mean), rms=parts(rms))


def half_width():
    """95 % half-width of N(0, u) convolved with a rectangular distribution of ±a: the convolution by quadrature."""
    cases = []
    for u, a in [(1, 0.01), (1, 0.3), (1, 1), (1, 3), (0.3, 1), (0.1, 1), (0.03, 1), (1e-3, 1)]:
        def holds(x):
            # P(|S| <= x), with Y uniform on (-a, a): the mean over y of P(-x - y <= X <= x - y).
            f = lambda y: stats.norm.cdf((x - y) / u) - stats.norm.cdf((-x - y) / u)
            inner = [p for p in (x - 5 * u, x, x + 5 * u) if 0 < p < a]
            return integrate.quad(f, 0, a, points=inner or None, epsabs=1e-13, epsrel=1e-13, limit=400)[0] / a - 0.95
        cases.append([u, a, optimize.brentq(holds, 1e-6, 4 * u + a, xtol=1e-14, rtol=1e-14)])
    return dict(cases=cases)


def transfer():
    """Gain and offset carried from one vertical range to another by one straight line for each leg.

    V_B = k·V_A + c for either leg, N_A = g_A·P_A + o_A: what N_B = g_B·P_B + o_B are g_B and o_B?
    """
    cases = []
    for gain, offset, r, legs in [
        ((0.97, 2e-5), (0.035, 6e-4), -0.7, (((1.004, 5e-5), (-0.12, 4e-4), -0.6), ((0.996, 7e-5), (0.31, 5e-4), -0.65))),
        ((1.06, 4e-4), (-0.4, 9e-3), 0.5, (((0.99, 1e-3), (0.5, 2e-3), 0.9), ((1.01, 8e-4), (-0.45, 6e-3), -0.95))),
        ((1.0, 1e-5), (0.0, 1e-3), 0.0, (((1.0, 1e-6), (0.0, 1e-4), 0.0), ((1.0, 3e-2), (2.0, 0.2), 0.0))),
    ]:
        def two(first, second, correlation):
            a, b = ureal(*first, independent=False), ureal(*second, independent=False)
            set_correlation(correlation, a, b)
            return a, b
        g, o = two(gain, offset, r)
        (k_p, c_p), (k_n, c_n) = two(*legs[0]), two(*legs[1])
        # Substituted rather than in the core's closed form: N_B = k_n·(g·P_A + o) + c_n at P_B = 0 and at P_B = 1.
        at = lambda p_b: k_n * (g * ((p_b - c_p) / k_p) + o) + c_n
        new_offset = result(at(0))
        new_gain = result(at(1) - at(0))
        cases.append(dict(
            gain=gain, offset=offset, correlation=r, positive=legs[0], negative=legs[1],
            new_gain=[value(new_gain), uncertainty(new_gain)], new_offset=[value(new_offset), uncertainty(new_offset)],
            new_correlation=get_correlation(new_gain, new_offset)))
    return dict(cases=cases)


def same(stored, found, where):
    """Whether all numbers agree to 1e-9, and everything else exactly."""
    if isinstance(stored, dict) and isinstance(found, dict) and stored.keys() == found.keys():
        return all([same(stored[k], found[k], f"{where}.{k}") for k in stored])
    if isinstance(stored, list) and isinstance(found, (list, tuple)) and len(stored) == len(found):
        return all([same(a, b, f"{where}[{i}]") for i, (a, b) in enumerate(zip(stored, found))])
    ok = isinstance(stored, (int, float)) and abs(stored - found) <= 1e-9 * abs(stored) + 1e-15
    if not ok:
        print(f"{where}: stored {stored}, found {found}")
    return ok


if __name__ == "__main__":
    check = "--check" in sys.argv[1:]
    good = True
    for name, make in dict(budget=budget, half_width=half_width, transfer=transfer).items():
        found, path = make(), HERE / f"{name}.json"
        if check:
            good &= same(json.loads(path.read_text()), found, name)
        else:
            path.write_text(json.dumps(found, separators=(",", ":")) + "\n")
    if check:
        print("the stored vectors are those of this script" if good else "the stored vectors differ")
    sys.exit(0 if good else 1)
