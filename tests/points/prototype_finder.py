"""An earlier finder of ours, kept unchanged in what it does, as the thing that find_levels is compared against.

Multi-scale two-window mean difference, merge, settle trim, fragment filter.
"""

import numpy as np


def runs(mask):
    r = np.flatnonzero(np.diff(np.concatenate(([0], mask.view(np.int8), [0]))))
    return r[::2], r[1::2]


def scale_of(x, cap=400_000):
    """Noise sigma from first differences (robust), lattice step q from distinct values of a sample"""
    n = x.size
    if n < 3:
        return 0.0, 0.0
    if n > cap:  # contiguous blocks, so differences stay first differences
        k = 40
        L = cap // k
        st = np.linspace(0, n - L, k).astype(int)
        d = np.concatenate([np.diff(x[i : i + L]) for i in st])
        u = np.unique(np.round(x[st[0] : st[0] + L], 9))
        m = L
    else:
        d = np.diff(x)
        u = np.unique(np.round(x, 9))
        m = n
    a = np.abs(d)
    # lower-quartile based: up to half of the differences may be steps (sparse logs)
    s = float(np.quantile(a, 0.25)) / (0.3186394 * np.sqrt(2))
    q = float(np.median(np.diff(u)[:])) if 1 < u.size < 0.25 * m else 0.0
    if q and u.size > 3:
        g = np.diff(u)
        q = float(np.min(g[g > 1e-9])) if (g > 1e-9).any() else 0.0
    return max(s, q / np.sqrt(12)), q


def find_plateaus(x, tol_abs=None, tol_rel=0.0, k=6.0, min_samples=2, min_dwell=None, scales=(1, 4, 16, 64), frag=0.2):
    x = np.ascontiguousarray(x, float)
    n = x.size
    if n == 0:
        return []
    lo, hi = float(x.min()), float(x.max())
    span = hi - lo
    s, q = scale_of(x)
    floor = tol_abs if tol_abs is not None else max(0.004 * span, 1.5 * q)
    if span <= max(floor, 1e-12):
        return [(0, n, float(np.median(x[: 1 << 16])))]
    # one row per point: most neighbouring rows differ by more than the tolerance
    if n < 2000:
        far = np.abs(np.diff(x)) > floor
        if far.mean() > 0.6:
            out = []
            a = 0
            for e in list(np.flatnonzero(far) + 1) + [n]:
                out.append((a, int(e), float(np.median(x[a:e]))))
                a = int(e)
            return out
    s = min(s, span / 20)
    c = np.empty(n + 1)
    c[0] = 0
    np.cumsum(x - x[0], out=c[1:])
    cuts = np.zeros(n + 1, bool)
    for w in scales:
        if w > 1 and w > n // 6:
            break
        st = max(1, w // 4)
        if st == 1:
            d = np.abs(c[2 * w :] - 2 * c[w : n - w + 1] + c[: n - 2 * w + 1])
        else:
            d = np.abs(c[2 * w :: st] - 2 * c[w : n - w + 1 : st] + c[: n - 2 * w + 1 : st])
        d /= w
        a, e = runs(d > max(k * s * np.sqrt(2 / w), floor))
        if not a.size:
            continue
        if w > 1:
            cc = np.concatenate(([0], np.cumsum(cuts)))
        for aa, ee in zip(a.tolist(), e.tolist(), strict=True):
            i0 = aa * st + w
            i1 = (ee - 1) * st + w
            if w == 1:
                cuts[i0 : i1 + 1] = True
            else:
                if cc[min(n, i1 + w) + 1] - cc[max(0, i0 - w)]:
                    # a finer scale cut lies here; a run much longer than the window is a slow ramp: cut its ends too
                    if i1 - i0 > 4 * w:
                        cuts[[i0, i1]] = True
                    continue
                cuts[aa * st + int(np.argmax(d[aa:ee])) * st + w] = True
                if i1 - i0 > 3 * w:
                    cuts[[max(1, i0), min(n - 1, i1)]] = True
    cuts[0] = cuts[n] = True
    b = np.flatnonzero(cuts)

    def med(y):
        return float(np.median(y if y.size <= 8192 else y[:: y.size // 4096]))

    segs = []
    for a, e in zip(b[:-1].tolist(), b[1:].tolist(), strict=True):
        L = e - a
        segs.append([a, e, med(x[a + int(0.3 * L) : e] if L >= 4 else x[a:e])])

    def T(level, m):
        return max(floor, tol_rel * abs(level), k * s / np.sqrt(m))

    out = []
    for sg in segs:  # merge neighbours with equal level
        if out and abs(out[-1][2] - sg[2]) <= T(sg[2], min(sg[1] - sg[0], out[-1][1] - out[-1][0])):
            A = out[-1]
            wa, wb = A[1] - A[0], sg[1] - sg[0]
            A[2] = (A[2] * wa + sg[2] * wb) / (wa + wb)
            A[1] = sg[1]
        else:
            out.append(sg[:])
    res = []
    for a, e, level in out:  # drop transition singletons, re-join across spikes
        if e - a < min_samples:
            continue
        if (
            res
            and abs(res[-1][2] - level) <= max(floor, tol_rel * abs(level))
            and a - res[-1][1] <= max(2, 0.02 * (res[-1][1] - res[-1][0]))
        ):
            res[-1][1] = e
        else:
            res.append([a, e, level])
    fin = []
    for a, e, level in res:  # settle trim, then slope test
        h = min(e - a, max(2, (e - a) // 2), 200_000)
        tol = max(k * s, floor, q)
        bad = np.flatnonzero(np.abs(x[a : a + h] - level) > tol)
        # ignore isolated outliers in the dense middle: only a leading block that is mostly 'bad' counts
        lead = 0
        if bad.size:
            f = np.cumsum(np.ones(bad.size)) / (bad + 1)
            ok = np.flatnonzero(f >= 0.3)
            lead = int(bad[ok[-1]] + 1) if ok.size else 0
        t = e
        while t - 1 > a + lead and abs(x[t - 1] - level) > tol:
            t -= 1
        a2, e2 = a + lead, t
        if e2 - a2 < min_samples:
            continue
        L = e2 - a2
        m = max(1, L // 3)
        drift = abs(med(x[a2 : a2 + m]) - med(x[e2 - m : e2])) if L >= 3 else 0
        fin.append([a2, e2, med(x[a2:e2]), drift, a, e])
    if len(fin) > 2:  # fragment filter
        L = np.array([f[1] - f[0] for f in fin])
        o = np.sort(L)[::-1]
        cov = np.searchsorted(np.cumsum(o), 0.9 * o.sum()) + 1
        ref = float(np.median(o[:cov]))
        need = min_dwell if min_dwell else frag * ref
        keep = []
        for i, f in enumerate(fin):
            if L[i] >= need and not (L[i] < ref and f[3] > max(0.5 * floor, k * s / np.sqrt(max(1, L[i] // 3)))):
                keep.append(f)
                continue
            if min_dwell or L[i] < 5 or f[3] > T(f[2], max(1, L[i] // 3)):
                continue
            # short but cleanly entered and left by real steps: keep
            okl = i == 0 or (f[0] - fin[i - 1][1] <= 2 and abs(f[2] - fin[i - 1][2]) > 5 * floor)
            okr = i == len(fin) - 1 or (fin[i + 1][0] - f[1] <= 2 and abs(f[2] - fin[i + 1][2]) > 5 * floor)
            if okl and okr:
                keep.append(f)
        fin = keep
    return [(f[0], f[1], f[2]) for f in fin]
