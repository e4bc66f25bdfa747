"""Times what a target costs on a grid of one minute over 12 h in astroplan, a
general library for planning observations: elevation limits and nautical
twilight, no closure lists and no neighbours. Prints one line of JSON.

usage: grid.py TARGETS
"""
import json
import sys
import time
import warnings

import numpy as np

warnings.filterwarnings("ignore")

import astroplan
import astropy
import astropy.units as u
from astropy.coordinates import EarthLocation, SkyCoord
from astropy.time import Time
from astropy.utils import iers

iers.conf.auto_download = False
iers.conf.auto_max_age = None
try:
    iers.conf.iers_degraded_accuracy = "ignore"
except AttributeError:
    pass

n = int(sys.argv[1])
rng = np.random.default_rng(1)
site = astroplan.Observer(EarthLocation(lat=-31.5 * u.deg, lon=-4 * u.deg, height=2450 * u.m))
stars = SkyCoord(ra=rng.uniform(0, 360, n) * u.deg, dec=rng.uniform(-80, 30, n) * u.deg)
targets = [astroplan.FixedTarget(coord=s, name=str(i)) for i, s in enumerate(stars)]
times = Time("2031-02-13T19:00:00") + np.arange(720) * u.minute
limits = [
    astroplan.AltitudeConstraint(30 * u.deg, 89 * u.deg),
    astroplan.AtNightConstraint.twilight_nautical(),
]
start = time.perf_counter()
allowed = astroplan.is_event_observable(limits, site, targets, times)
seconds = time.perf_counter() - start
print(json.dumps({"targets": n, "seconds": seconds, "allowed": float(np.mean(allowed)), "version": astroplan.__version__, "astropy": astropy.__version__}))
