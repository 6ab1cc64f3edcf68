"""The numbers of many crossed studies with general-purpose Python libraries, as a peer to time against.

  analysis.py numpy|draws-shared READINGS PARTS APPRAISERS TRIALS COUNT

READINGS holds little-endian doubles: characteristic by characteristic, part by part, appraiser by appraiser. Each line
of standard input is a number of passes over the first COUNT characteristics; the answer is their CPU seconds.

numpy          whole arrays at once: the 27 numbers of the closed form
draws-shared   95 % limits of six figures, the same 10,000 draws for all characteristics
"""

import sys
import time

import numpy as np

DRAWS = 10_000
# What `study` works out, in this order.
FIELDS = (
    "ms_part", "ms_appraiser", "ms_interaction", "ms_repeat",
    "p_part", "p_appraiser", "p_interaction",
    "part", "appraiser", "interaction", "repeat", "reproducibility", "gauge", "total",
    "gauge_share",
    "repeat_low", "repeat_high", "gauge_low", "gauge_high", "total_low", "total_high",
    "part_low", "part_high", "gauge_matched_low", "gauge_matched_high",
    "reproducibility_matched_low", "reproducibility_matched_high",
)


def mean_squares(y):
    """y: (characteristic, part, appraiser, trial) -> four mean squares each."""
    _, p, o, r = y.shape
    cell = y.mean(axis=3)
    part, appraiser = cell.mean(axis=2), cell.mean(axis=1)
    grand = part.mean(axis=1)
    both = cell - part[:, :, None] - appraiser[:, None, :] + grand[:, None, None]
    rest = y - cell[..., None]
    return np.stack([
        o * r * np.square(part - grand[:, None]).sum(axis=1) / (p - 1),
        p * r * np.square(appraiser - grand[:, None]).sum(axis=1) / (o - 1),
        r * np.square(both).sum(axis=(1, 2)) / ((p - 1) * (o - 1)),
        np.square(rest).sum(axis=(1, 2, 3)) / (p * o * (r - 1)),
    ])


def degrees(p, o, r):
    return np.array([p - 1, o - 1, (p - 1) * (o - 1), p * o * (r - 1)], dtype=float)


def study(y):
    """27 numbers per characteristic, in the order of FIELDS."""
    from scipy.special import chdtri, fdtrc, fdtri      # thin, vectorised, no checks
    _, p, o, r = y.shape
    df = degrees(p, o, r)
    ms = mean_squares(y)

    def chi(prob, n):
        return chdtri(n, 1.0 - prob)

    g = 1 - df / chi(0.975, df)
    h = df / chi(0.025, df) - 1
    high, low = fdtri(df[0], df[2], 0.975), fdtri(df[0], df[2], 0.025)
    g13 = ((high - 1) ** 2 - g[0] ** 2 * high ** 2 - h[2] ** 2) / high
    h13 = ((1 - low) ** 2 - h[0] ** 2 * low ** 2 - g[2] ** 2) / low

    part = (ms[0] - ms[2]) / (o * r)
    appraiser = (ms[1] - ms[2]) / (p * r)
    both = (ms[2] - ms[3]) / r
    zero = np.zeros_like(part)
    gauge_terms = np.stack([zero, ms[1] / (p * r), (p - 1) * ms[2] / (p * r), (r - 1) * ms[3] / r])
    total_terms = np.stack([ms[0] / (o * r), ms[1] / (p * r),
                            (p * o - p - o) * ms[2] / (p * o * r), (r - 1) * ms[3] / r])
    reproducibility_terms = np.stack([zero, gauge_terms[1], gauge_terms[2], -ms[3] / r])
    gauge, total = gauge_terms.sum(axis=0), total_terms.sum(axis=0)
    reproducibility = reproducibility_terms.sum(axis=0)

    def closed(terms, total):
        """Modified large-sample bounds of a sum of independent mean squares."""
        return (total - np.sqrt(np.square(terms * g[:, None]).sum(axis=0)),
                total + np.sqrt(np.square(terms * h[:, None]).sum(axis=0)))

    def matched(terms, total):
        """Bounds from a chi-square with matched first two moments."""
        n = np.maximum(total ** 2 / (terms ** 2 / df[:, None]).sum(axis=0), 0.5)
        return n * total / chi(0.975, n), n * total / chi(0.025, n)

    down = (g[0] * ms[0]) ** 2 + (h[2] * ms[2]) ** 2 + g13 * ms[0] * ms[2]
    up = (h[0] * ms[0]) ** 2 + (g[2] * ms[2]) ** 2 + h13 * ms[0] * ms[2]
    return np.stack([
        *ms,
        fdtrc(df[0], df[2], ms[0] / ms[2]), fdtrc(df[1], df[2], ms[1] / ms[2]),
        fdtrc(df[2], df[3], ms[2] / ms[3]),
        part, appraiser, both, ms[3], reproducibility, gauge, total, gauge / total,
        ms[3] * (1 - g[3]), ms[3] * (1 + h[3]),
        *closed(gauge_terms, gauge), *closed(total_terms, total),
        part - np.sqrt(np.maximum(down, 0)) / (o * r), part + np.sqrt(np.maximum(up, 0)) / (o * r),
        *matched(gauge_terms, gauge), *matched(reproducibility_terms, reproducibility),
    ], axis=1)


def pivots(rng, df):
    return np.stack([n / rng.chisquare(n, DRAWS) for n in df])


def drawn(ms, pivot, size):
    """95 % bounds of six quantities from drawn mean squares."""
    p, o, r = size
    m = ms[:, None] * pivot
    part = np.maximum((m[0] - m[2]) / (o * r), 0)
    reproducibility = np.maximum((m[1] - m[2]) / (p * r), 0) + np.maximum((m[2] - m[3]) / r, 0)
    gauge = reproducibility + m[3]
    six = np.stack([m[3], reproducibility, gauge, part, gauge + part, gauge / (gauge + part)])
    return np.quantile(six, [0.025, 0.975], axis=1).T.ravel()


def main():
    what, path, *size = sys.argv[1:]
    p, o, r, count = map(int, size)
    y = np.fromfile(path, dtype="<f8").reshape(-1, p, o, r)[:count]
    df = degrees(p, o, r)
    shared = pivots(np.random.default_rng(1), df)

    def one_pass():
        if what == "numpy":
            study(y)
        else:
            for row in mean_squares(y).T:
                drawn(row, shared, (p, o, r))

    one_pass()
    for line in sys.stdin:
        start = time.process_time()
        for _ in range(int(line)):
            one_pass()
        print(time.process_time() - start, flush=True)


if __name__ == "__main__":
    main()
