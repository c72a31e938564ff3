#!/usr/bin/python3
"""Distances and times of 360 seeded universes from astropy, the reference table of package model.

Run with Debian's python3-astropy and python3-scipy:   /usr/bin/python3 universes.py > universes.csv
Times in Gyr, distances in Mpc. Or is what astropy makes of Tcmb0 and Neff (massless neutrinos).

Two habits of astropy 5.2.1 would spoil a reference to 1e-7, so both are set aside:
- its quadratures stop at an absolute error of 1.5e-8, which is 1e-4 of an age at z = 1100: the same
  integrals are asked to a relative 1e-12 instead;
- LambdaCDM takes a closed form in elliptic integrals that disagrees with its own integral for Ode0 < 0 (by
  3% at z = 0.27): a cosmological constant is written as wCDM with w0 = -1, which integrates.

Universes that E² <= 0 cuts off, or nearly so (the quadrature would not reach its tolerance), are drawn again,
and so are closed ones seen to the antipode.
"""
import random
import warnings

import astropy
import numpy as np
import scipy.integrate
from astropy.cosmology import w0waCDM, wCDM
from astropy.cosmology.flrw import base

warnings.simplefilter("error")
rng = random.Random(20240607)


def tight(f, a, b, args=()):
    return scipy.integrate.quad(f, a, b, args=args, epsabs=0, epsrel=1e-12, limit=1000)


base.quad = tight


def draw(i):
    """One universe; the kind cycles through constant, w and w0-wa, with and without radiation."""
    h0 = rng.uniform(50, 90)
    om = rng.uniform(0.02, 1.5)
    ol = rng.uniform(-0.5, 1.8)
    if i % 5 == 0:
        ol = 1 - om
    tcmb = 2.7255 if i % 2 else 0.0
    kw = dict(H0=h0, Om0=om, Ode0=ol, Tcmb0=tcmb, Neff=3.044)
    kind = i % 3
    w0 = rng.uniform(-3, 1) if kind else -1.0
    wa = rng.uniform(-3, 2) if kind == 2 else 0.0
    if kind == 2:
        return w0waCDM(w0=w0, wa=wa, **kw), w0, wa
    return wCDM(w0=w0, **kw), w0, wa


def row(i):
    while True:
        u, w0, wa = draw(i)
        z = float("%.6g" % 10 ** rng.uniform(-3, np.log10(1100)))
        if i % 9 == 0:
            z = 1100.0
        if u.Ode0 < 0 and w0 + wa > 0:
            continue  # E² < 0 as z grows without bound
        with np.errstate(all="ignore"):
            e2 = 1 / u.inv_efunc(np.geomspace(1, 1e9, 40001) - 1) ** 2
        if not (np.isfinite(e2).all() and e2.min() > 0.02):
            continue
        try:
            dc = u.comoving_distance(z).value
            if u.Ok0 < 0 and np.sqrt(-u.Ok0) * dc / u.hubble_distance.value > 3.1:
                continue
            return [float(v) for v in (
                u.Om0, u.Ode0, u.Ogamma0 + u.Onu0, u.H0.value, w0, wa, z,
                dc, u.comoving_transverse_distance(z).value, u.luminosity_distance(z).value,
                u.lookback_time(z).value, u.age(z).value)]
        except Warning:
            continue


print("# astropy", astropy.__version__, "(Debian python3-astropy), scipy", scipy.__version__,
      "by universes.py, seed 20240607")
print("# DC, DM, DL in Mpc; lookback, age in Gyr; H0 in km/s/Mpc")
print("Om,OL,Or,H0,w0,wa,z,DC,DM,DL,lookback,age")
for i in range(360):
    print(",".join(repr(v) for v in row(i)))
