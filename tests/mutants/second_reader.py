"""The second reader: one wind value from a NetCDF file by netCDF4, cftime and numpy alone; none of underwind's code or rules.

Reads questions (JSON, one a line) from standard input and writes answers. It runs in a process of its own: it may crash.
"""
import json
import sys
import warnings

import cftime
import netCDF4 as nc
import numpy as np

warnings.simplefilter("ignore")
FACTOR = {"knots": 1852 / 3600, "km/h": 1 / 3.6, "km h-1": 1 / 3.6, "cm/s": 0.01}


def axis_kind(d, name):
    v = d.variables.get(name)
    text = (getattr(v, "standard_name", "") if v is not None else "") or name
    text = str(text).lower()
    units = str(getattr(v, "units", "")) if v is not None else ""
    if " since " in units.lower() or text in ("time", "timestep", "t", "valid_time"): return "time"
    if text.startswith("lat") or text == "coadsy": return "lat"
    if text.startswith("lon") or text == "coadsx": return "lon"
    return None


def brackets(axis, x, period=None):
    """Places and weights of the neighbours of x."""
    axis = np.asarray(axis, float)
    if period:
        axis = x + (axis - x + period / 2) % period - period / 2
    order = np.argsort(axis, kind="stable")
    a = axis[order]
    near = np.argmin(abs(a - x))
    if abs(a[near] - x) < 1e-6: return [(int(order[near]), 1.0)]
    k = np.searchsorted(a, x)
    if k == 0 or k == len(a): raise ValueError("outside")
    w = (x - a[k - 1]) / (a[k] - a[k - 1])
    return [(int(order[k - 1]), 1 - w), (int(order[k]), w)]


def answer(q):
    with nc.Dataset(q["path"]) as d:
        v = d[q["variable"]]
        at = {}
        for place, name in enumerate(v.dimensions):
            kind = axis_kind(d, name)
            if kind is None:
                if len(d.dimensions[name]) != 1: raise ValueError("dimension " + name)
                at[place] = [(0, 1.0)]
                continue
            c = d[name][:]
            c = np.ma.filled(np.ma.asarray(c, dtype="f8"), np.nan)
            if kind == "time":
                units, calendar = d[name].units, str(getattr(d[name], "calendar", "standard"))
                x = cftime.date2num(cftime.datetime(*q["time"], calendar=calendar), units, calendar)
                at[place] = brackets(c, x)
            else:
                at[place] = brackets(c, q["lat"], None) if kind == "lat" else brackets(c, q["lon"], 360.0)
        total = 0.0
        def go(place, index, weight):
            nonlocal total
            if place == len(v.dimensions):
                x = v[tuple(index)]
                total += weight * (np.nan if np.ma.is_masked(x) else float(x))
                return
            for k, w in at[place]:
                go(place + 1, index + [k], weight * w)
        go(0, [], 1.0)
        total *= FACTOR.get(str(getattr(v, "units", "")).lower(), 1.0)
        return None if np.isnan(total) else total


for line in sys.stdin:
    try:
        print(json.dumps({"value": answer(json.loads(line))}), flush=True)
    except Exception as error:  # whatever the library says: it has no value
        print(json.dumps({"refused": repr(error)[:200]}), flush=True)
