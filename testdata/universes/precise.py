#!/usr/bin/env python3
"""Distances and times of difficult universes to 16 digits, in 40-digit arithmetic.

Run with any Python 3 that has mpmath:   python3 precise.py > precise.csv
Units c/H0 and 1/H0. A field that does not apply is empty. The universes: over the whole prior range, and
beside the line where E² touches zero in the past, at OL = boundary - 10^-k.

E² is linear in OL, E² = base(a) + OL (D(a) - a^-2), so the boundary is the least base/(a^-2 - D) over a < 1.
"""
import random

import mpmath as mp

mp.mp.dps = 40
rng = random.Random(20240608)


class Universe:
    def __init__(self, om, ol, orad, w0, wa):
        self.om, self.ol, self.orad, self.w0, self.wa = map(mp.mpf, (om, ol, orad, w0, wa))
        self.ok = 1 - self.om - self.ol - self.orad

    def dark(self, s):
        a = mp.exp(s)
        return mp.exp(-3 * (1 + self.w0 + self.wa) * s + 3 * self.wa * (a - 1))

    def e2(self, s):
        x = mp.exp(-s)
        return self.orad * x**4 + self.om * x**3 + self.ok * x**2 + self.ol * self.dark(s)

    def base(self, s):
        x = mp.exp(-s)
        return self.orad * x**4 + self.om * x**3 + (1 - self.om - self.orad) * x**2


def grid(lo, hi, n):
    return [lo + (hi - lo) * mp.mpf(i) / n for i in range(n + 1)]


def dip(u, lo, hi):
    """Where E² is least between lo and hi (in ln a), to a few digits: for placing subdivisions."""
    s = min(grid(lo, hi, 300), key=u.e2)
    h = (hi - lo) / 300
    for _ in range(40):
        s = min((s - h, s, s + h), key=u.e2)
        h /= 2
    return min(max(s, lo), hi)


def integral(f, u, lo, hi):
    """Subdivided geometrically towards the dip, where 1/E may peak."""
    c = dip(u, lo, hi)
    pts = {lo, hi, c}
    for k in range(24):
        for sign in (-1, 1):
            p = c + sign * mp.mpf(2) ** (2 - k)
            if lo < p < hi:
                pts.add(p)
    return mp.quad(f, sorted(pts))


def distances(u, z):
    y = mp.log(1 + mp.mpf(z))
    dc = integral(lambda s: mp.exp(-s) / mp.sqrt(u.e2(s)), u, -y, mp.mpf(0))
    k = mp.sqrt(abs(u.ok))
    dm = dc
    if u.ok > 0:
        dm = mp.sinh(k * dc) / k
    elif u.ok < 0:
        dm = mp.sin(k * dc) / k
        if k * dc > mp.pi:
            dm = ""
    look = integral(lambda s: 1 / mp.sqrt(u.e2(s)), u, -y, mp.mpf(0))
    return dc, dm, look


def age(u, s):
    t = integral(lambda s: 1 / mp.sqrt(u.e2(s)), u, s - 6, s)
    return t + mp.quad(lambda s: 1 / mp.sqrt(u.e2(s)), [s - 6 - 6 * k for k in range(12, -1, -1)])


def turnaround(u):
    """Scale factor and time since the big bang of the first zero of E² ahead, or None."""
    prev = mp.mpf(0)
    for s in grid(mp.mpf(0), mp.mpf(6), 3000)[1:]:
        if u.e2(s) < 0:
            lo, hi = prev, s
            for _ in range(140):
                mid = (lo + hi) / 2
                lo, hi = (mid, hi) if u.e2(mid) > 0 else (lo, mid)
            st = lo
            with mp.workdps(60):
                rate = lambda v: 2 * v / mp.sqrt(abs(u.e2(st - v * v)))
                end = mp.sqrt(st)
                pts = [0] + [end * mp.mpf(2) ** -k for k in range(16, -1, -1)]
                ahead = mp.quad(rate, pts)
            return mp.exp(st), age(u, mp.mpf(0)) + ahead
        prev = s
    return None


def rip(u):
    if u.ol <= 0 or not (u.wa > 0 or u.wa == 0 and u.w0 < -1):
        return None
    f = lambda s: 1 / mp.sqrt(u.e2(s))
    if u.wa > 0:
        end = mp.log(1 + 60 / u.wa)
        return mp.quad(f, grid(mp.mpf(0), end, 60))
    k = mp.mpf(3) / 2 * abs(1 + u.w0)
    return mp.quad(f, grid(mp.mpf(0), mp.mpf(60), 120)) + f(mp.mpf(60)) / k


def show(v):
    return "" if v is None or v == "" else mp.nstr(v, 17)


def emit(p, z):
    u = Universe(*p)
    dc, dm, look = distances(u, z)
    t = age(u, -mp.log(1 + mp.mpf(z)))
    turn = turnaround(u)
    at, tt = turn or (None, None)
    end = None if turn else rip(u)
    print(",".join([repr(float(v)) for v in (*p, z)] + [show(v) for v in (dc, dm, look, t, at, tt, end)]))


def equation(kind):
    w0 = rng.uniform(-3, 1) if kind else -1.0
    wa = rng.uniform(-3, 2) if kind == 2 else 0.0
    return w0, wa


def redshift():
    return float("%.6g" % 10 ** rng.uniform(-3, mp.log(1100, 10)))


def big_bang(u):
    if u.ol < 0 and u.w0 + u.wa > -0.01:
        return False
    return min(u.e2(s) for s in grid(mp.mpf(-12), mp.mpf(0), 600)) > 1e-3


print("# mpmath", mp.__version__, "at 40 digits, by precise.py, seed 20240608")
print("# DC, DM in c/H0; lookback, age at z, turnaround since the big bang, rip from today in 1/H0")
print("Om,OL,Or,w0,wa,z,DC,DM,lookback,age,turn_a,turn_t,rip")
done = 0
while done < 90:
    om, ol = rng.uniform(0.01, 1.5), rng.uniform(-0.5, 1.8)
    orad = rng.choice([0.0, 8.5e-5])
    p = (om, ol, orad, *equation(done % 3))
    if big_bang(Universe(*p)):
        emit(p, redshift())
        done += 1
done = 0
while done < 60:
    om = rng.uniform(0.02, 1.0)
    orad = rng.choice([0.0, 8.5e-5])
    w0, wa = equation(done % 3)
    v = Universe(om, 0, orad, w0, wa)
    best = min((v.base(s) / (mp.exp(-2 * s) - v.dark(s)), s) for s in grid(mp.mpf(-6), mp.mpf(-0.01), 600)
               if mp.exp(-2 * s) > v.dark(s)) if w0 < -0.4 and w0 + wa < -0.4 else None
    if best is None or best[0] > 2.5 or not -3 < best[1] < -0.1:
        continue
    s, h = best[1], mp.mpf("0.01")
    edge = lambda s: v.base(s) / (mp.exp(-2 * s) - v.dark(s))
    for _ in range(70):
        s = min((s - h, s, s + h), key=edge)
        h /= 2
    p = (om, float(edge(s) - mp.mpf(10) ** -rng.randint(2, 6)), orad, w0, wa)
    emit(p, rng.choice([1100.0, redshift(), float("%.6g" % (mp.exp(-s) - 1))]))
    done += 1
