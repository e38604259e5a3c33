"""Damaged copies of real and invented files through the program, and what a second reader says of each.

    python tests/mutants/mutants.py [--each N] [--seed N] [--program PATH] [--data FOLDER ...]

Every NetCDF file and table of tests/fixtures, demo-data and the data folders is copied with flipped bits, overwritten or zeroed
bytes, or cut short. For each copy the program is asked for one value (`sample`), and for every fifth also `check` on a study
that names it. Faults, each listed: a panic or a death by signal; more than 10 s of processor time or 60 s by the clock; more
than 1 GB of memory; an answer without a flag or remark that differs from the second reader's (netCDF4 and cftime for grids,
Python's csv for tables), or a plain answer where the second reader finds a missing value. Libraries used: netCDF4 1.7.5
(netcdf-c 4.10.1), cftime 1.6.6, numpy 2.4.6.
"""
import argparse
import collections
import concurrent.futures as cf
import csv
import glob
import gzip
import json
import os
import random
import re
import select
import shutil
import subprocess
import sys
import tempfile
import threading
import time

HERE = os.path.dirname(os.path.abspath(__file__))
ROOT = os.path.dirname(os.path.dirname(HERE))


def run(command):
    """Status, output, errors, seconds of processor, seconds, kB."""
    with tempfile.TemporaryFile() as out, tempfile.TemporaryFile() as err:
        start = time.time()
        child = subprocess.Popen(command, stdout=out, stderr=err, stdin=subprocess.DEVNULL)
        timer = threading.Timer(60, child.kill)
        timer.start()
        _, status, used = os.wait4(child.pid, 0)
        child.returncode = os.waitstatus_to_exitcode(status)
        timer.cancel()
        out.seek(0), err.seek(0)
        return (child.returncode, out.read().decode("utf-8", "replace"), err.read().decode("utf-8", "replace"),
                used.ru_utime + used.ru_stime, time.time() - start, used.ru_maxrss)


class Second:
    """A second reader in a process of its own, begun again when it dies."""
    def __init__(self): self.child = None
    def ask(self, question):
        if self.child is None or self.child.poll() is not None:
            self.child = subprocess.Popen([sys.executable, os.path.join(HERE, "second_reader.py")], stdin=subprocess.PIPE,
                                          stdout=subprocess.PIPE, stderr=subprocess.DEVNULL, text=True)
        try:
            self.child.stdin.write(json.dumps(question) + "\n"); self.child.stdin.flush()
            if not select.select([self.child.stdout], [], [], 30)[0]:
                self.child.kill(); self.child.wait(); return {"refused": "hangs"}
            line = self.child.stdout.readline()
            return json.loads(line) if line else {"refused": "crashes"}
        except (BrokenPipeError, json.JSONDecodeError):
            return {"refused": "crashes"}


SECOND = Second()


def grid_bases(program, files):
    """Questions that a file answers: a place between nodes and one on a node, at a step."""
    import netCDF4, cftime, numpy as np
    bases = []
    for path in files:
        try:
            with netCDF4.Dataset(path) as d:
                sys.path.insert(0, HERE)
                axes = {}
                for name in d.variables:
                    v = d[name]
                    units = str(getattr(v, "units", "")).lower()
                    if v.ndim != 1 or v.dtype.kind not in "fiu": continue
                    low = name.lower()
                    kind = "time" if " since " in units else "lat" if low.startswith("lat") or low == "coadsy" else "lon" if low.startswith("lon") or low == "coadsx" else None
                    if kind and kind not in axes and v.size: axes[kind] = (v[:], getattr(v, "units", ""), str(getattr(v, "calendar", "standard")))
                k = min(1, len(axes["time"][0]) - 1)
                when = cftime.num2date(axes["time"][0][k], axes["time"][1], axes["time"][2])
                clock = [when.year, when.month, when.day, when.hour, when.minute, when.second]
                lats, lons = np.asarray(axes["lat"][0], float), np.asarray(axes["lon"][0], float)
        except Exception:
            continue
        for between in (False, True):
            j, i = min(1, len(lats) - 1), min(1, len(lons) - 1)
            lat, lon = lats[j], (lons[i] + 180) % 360 - 180
            if between and (j == 0 or i == 0): continue
            if between: lat, lon = lat + 0.3 * (lats[0] - lat), lon + 0.4 * ((lons[0] - lons[1] + 180) % 360 - 180)
            base = dict(path=path, lat=float(lat), lon=float(lon), time=clock)
            found = ask_grid(program, base, path, None)[0]
            if not isinstance(found, dict): continue
            names = re.findall(r"(eastward wind|wind speed) \(`([^`]*)`\)", " ".join((found.get("inputs") or {}).get("variables", [])))
            if found.get("value") is None or not names: continue
            base["quantity"] = "eastward_wind" if names[0][0] == "eastward wind" else "wind_speed"
            base["variable"] = names[0][1]
            # The second reader knows no rules of coasts or circles: only questions on which it agrees beforehand are asked.
            second = SECOND.ask(base)
            if second.get("value") is None or abs(second["value"] - ask_grid(program, base, path, base["quantity"])[0]["value"]) > 1e-4: continue
            bases.append(base)
    return bases


def ask_grid(program, base, path, quantity):
    y = base["time"]
    command = [program, "sample", "wind", path, "--latitude=%r" % base["lat"], "--longitude=%r" % base["lon"], "--json",
               "--time", "%04d-%02d-%02dT%02d:%02d:%02dZ" % tuple(y)]
    if quantity: command += ["--quantity", quantity]
    return parsed(run(command))


def parsed(result):
    try: return json.loads(result[1].strip().splitlines()[-1]), result
    except Exception: return None, result


def table_bases(program, data):
    """(path, options, finder of the same number with Python's csv)."""
    bases = []
    def add(path, options, find):
        if os.path.exists(path):
            found, _ = parsed(run([program, "sample", "levels", path, "--json"] + options))
            if found and found.get("value") is not None: bases.append(dict(path=path, options=options, find=find))
    def open_text(path): return gzip.open(path, "rt", newline="") if path.endswith(".gz") else open(path, newline="")
    def long(stamp, site, band):
        def find(path):
            with open_text(path) as f:
                for row in csv.DictReader(f, strict=True):
                    if row.get("time_utc", row.get("time")) == stamp and row.get("sensor", row.get("site")) == site and float(row["band_hz"]) == band: return float(row["level_db"])
        return find
    folder = tempfile.mkdtemp()
    path = os.path.join(folder, "long.csv")
    rows = [(f"2031-03-{1 + h // 24:02}T{h % 24:02}:00:00Z", "reef", b, 70 + 7 * ((h * 31 + b) % 97) / 10) for h in range(200) for b in (63, 125, 250)]
    with open(path, "w") as f:
        f.write("time,site,band_hz,level_db\n"); f.writelines(f"{t},{s},{b},{x:.1f}\n" for t, s, b, x in rows)
    packed = os.path.join(folder, "long.csv.gz")
    with open(path, "rb") as f, gzip.open(packed, "wb") as g: g.write(f.read())
    options = ["--set", "reference=1 uPa", "--set", "kind=band_level", "--set", "bands=decidecade", "--set", "window_s=3600", "--set", "stamp=start",
               "--time", "2031-03-03T05:00:00Z", "--frequency-hz", "125"]
    for p in (path, packed): add(p, options, long("2031-03-03T05:00:00Z", "reef", 125.0))
    for d in data:
        def sound(path):
            with open(path, newline="") as f:
                for row in csv.reader(f):
                    if row and row[0].strip() == "2018-12-12T17:00:00Z": return float(row[6])
        add(os.path.join(d, "SanctSound_CI01_01_OL_1h.csv"),
            ["--set", "reference=1 uPa", "--set", "kind=band_level", "--set", "bands=octave", "--set", "window_s=3600", "--set", "stamp=start",
             "--time", "2018-12-12T17:00:00Z", "--frequency-hz", "1000"], sound)
    return bases


def damage(data, chance):
    kind = chance.choice(["flip", "flip", "flip", "bytes", "cut", "zero"])
    d = bytearray(data)
    # Half of the damage hits the first part, where headers are.
    where = lambda: chance.randrange(len(d) if chance.random() < 0.5 else min(len(d), 2048))
    if kind == "flip": d[where()] ^= 1 << chance.randrange(8)
    elif kind == "bytes":
        for _ in range(3): d[where()] = chance.randrange(256)
    elif kind == "cut": d = d[:chance.randrange(len(d))]
    else: p = where(); e = min(len(d), p + chance.randrange(1, 200)); d[p:e] = bytes(e - p)
    return kind, bytes(d)


def study(folder, number, base, path):
    name = os.path.join(folder, f"{number}.toml")
    grid = "variable" in base
    wind = f'[[wind]]\nid = "m"\nfiles = [{json.dumps(path)}]\n' if grid else ""
    levels = "" if grid else f'[[levels]]\nfiles = [{json.dumps(path)}]\nreference = "1 uPa"\nkind = "band_level"\nbands = "octave"\nwindow_s = 3600\nstamp = "start"\n'
    with open(name, "w") as f: f.write(f'[study]\nname = "x"\n[[site]]\nid = "reef"\nlatitude_deg = 45\nlongitude_deg = -31\ndepth_m = 100\n{wind}{levels}')
    return name


def main():
    parser = argparse.ArgumentParser()
    parser.add_argument("--each", type=int, default=12); parser.add_argument("--seed", type=int, default=1)
    parser.add_argument("--program", default=os.path.join(ROOT, "target/release/underwind"))
    parser.add_argument("--data", nargs="*", default=[os.path.join(ROOT, "../shared/data")])
    parser.add_argument("--threads", type=int, default=2)
    a = parser.parse_args()
    chance = random.Random(a.seed)
    files = sorted(glob.glob(os.path.join(ROOT, "tests/fixtures/grids/*.nc")) + glob.glob(os.path.join(ROOT, "tests/fixtures/layouts/*.nc"))) + [os.path.join(ROOT, "demo-data/wind.nc")]
    # The C library believes this file's record count (see F6): the second reader would take all memory.
    files = [f for f in files if "f06_" not in f]
    for d in a.data: files += sorted(glob.glob(os.path.join(d, "*.nc")))
    bases = grid_bases(a.program, files) + table_bases(a.program, a.data)
    print(len(bases), "questions on", len({b["path"] for b in bases}), "files")
    folder = tempfile.mkdtemp()
    local = threading.local()
    tally, faults = collections.Counter(), []

    def one(job):
        number, base = job
        with open(base["path"], "rb") as f: data = f.read()
        ending = ".csv.gz" if base["path"].endswith(".gz") else os.path.splitext(base["path"])[1]
        kind, damaged = damage(data, random.Random(a.seed * 1_000_003 + number))
        path = os.path.join(folder, f"{number}_{kind}_{os.path.basename(base['path'])[:40]}".replace(" ", "_"))
        if not path.endswith(ending): path += ending
        with open(path, "wb") as f: f.write(damaged)
        results = []
        grid = "variable" in base
        if grid: found, result = ask_grid(a.program, base, path, base["quantity"])
        else: found, result = parsed(run([a.program, "sample", "levels", path, "--json"] + base["options"]))
        results.append(result)
        if number % 5 == 0: results.append(run([a.program, "check", study(folder, number, base, path)]))
        said = []
        for r in results:
            if r[0] < 0 or r[0] in (1, 101) or "panicked" in r[2]: said.append(f"status {r[0]}: {r[2][-200:]}")
            if r[3] > 10 or r[4] > 60: said.append(f"{r[3]:.0f} s of processor, {r[4]:.0f} s")
            if r[5] > 1_000_000: said.append(f"{r[5]} kB")
        word = found["status"] if found else "refused"
        if found and found.get("value") is not None:
            if grid:
                if not hasattr(local, "second"): local.second = Second()
                second = local.second.ask(dict(base, path=path))
            else:
                try: second = {"value": base["find"](path)}
                except Exception as error: second = {"refused": repr(error)}
            remarks = found["flags"] or (found.get("inputs") or {}).get("notes")
            if "refused" in second: word += ", second reader refuses: " + ("crash" if "crash" in second["refused"] else "error")
            elif second["value"] is None or abs(second["value"] - found["value"]) > 1e-4 + 1e-6 * abs(found["value"]):
                if remarks: word += ", differs with a remark"
                else: word += ", DIFFERS"; said.append(f"says {found['value']}, second reader {second['value']}")
            else: word += ", equal"
            if "refused" in second and not remarks: return word, path, said, f"{base['path']} -> {found['value']}: {second['refused']}"
        if not said: os.remove(path)
        return word, path, said, None

    jobs = [(n, bases[n % len(bases)]) for n in range(a.each * len(bases))]
    alone = []
    with cf.ThreadPoolExecutor(a.threads) as pool:
        for word, path, said, only in pool.map(one, jobs):
            tally[word] += 1
            for s in said: faults.append(f"{path}: {s}")
            if only: alone.append(only)
    print(len(jobs), "damaged files:", dict(tally))
    print(len(faults), "faults"); print("\n".join(faults))
    print(len(alone), "accepted where the second reader refuses:"); print("\n".join(alone))


main()
