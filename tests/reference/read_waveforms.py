"""Reads one capture's waveform with pyarrow and with duckdb and compares it with the CSV and with the capture's figures.

    VENV/bin/python read_waveforms.py FOLDER

FOLDER holds wave.parquet, wave.csv and capture.json as the daemon gave them. What turns codes into volts is taken from
the file's own key-value metadata, as its `about` key tells.
"""

import csv
import json
import sys
from pathlib import Path

import duckdb
import numpy as np
import pyarrow.parquet as parquet

folder = Path(sys.argv[1])
capture = json.loads((folder / "capture.json").read_text())
file = str(folder / "wave.parquet")

# pyarrow
keys = {key.decode(): value.decode() for key, value in parquet.read_metadata(file).metadata.items()}
table = parquet.read_table(file)
assert table.column_names == ["positive", "negative", "difference"], table.column_names
assert keys["pair"] == capture["pair"] and keys["run"] == capture["run"], keys
assert int(keys["number"]) == capture["number"], keys
volts = {
    leg: table[leg].to_numpy() * float(keys[f"{leg}.volts_per_code"]) + float(keys[f"{leg}.zero_v"])
    for leg in ("positive", "negative")
}
difference = table["difference"].to_numpy(zero_copy_only=False)
time = float(keys["start_s"]) + np.arange(len(table)) * float(keys["interval_s"])
assert len(table) == capture["points"], len(table)

# duckdb, a reader of its own
rows = duckdb.sql(f"select positive, negative, difference from '{file}'").fetchnumpy()
for name in ("positive", "negative"):
    assert np.array_equal(np.asarray(rows[name]), table[name].to_numpy()), name
by_duckdb = np.ma.filled(np.ma.asarray(rows["difference"], dtype=float), np.nan)
assert np.array_equal(by_duckdb, difference.astype(float), equal_nan=True)

# The CSV, with the digits that it is written with: twelve of time, ten of volts.
with open(folder / "wave.csv", newline="") as text:
    lines = list(csv.DictReader(text))
column = lambda name: np.array([float(line[name]) if line[name] else np.nan for line in lines])
assert np.allclose(column("time_s"), time, rtol=1e-11, atol=1e-20)
for leg in volts:
    assert np.allclose(column(f"{leg}_v"), volts[leg], rtol=1e-9, atol=1e-12), leg
assert np.allclose(column("difference_v"), difference, rtol=1e-9, atol=1e-12, equal_nan=True)

# The difference is P - (N(t + skew) - offset)/gain. A delay keeps sums, so over whole periods the means agree whatever
# the interpolation: 20 us are two periods of the bridge's 100 kHz. What the ends lack is left out of both.
skew, gain, offset = (float(keys[f"correction.{name}"]) for name in ("skew_s", "gain", "offset_v"))
period = round(1e-5 / float(keys["interval_s"]))
valid = np.flatnonzero(~np.isnan(difference))
first = valid[0]
assert valid[-1] - first + 1 == len(valid), "no hole"
inside = slice(first + 40, first + 40 + period)
late = np.interp(time[inside] + skew, time, volts["negative"])
plain_mean = np.mean(volts["positive"][inside] - (late - offset) / gain)
assert abs(np.mean(difference[inside]) - plain_mean) < 2e-3, (np.mean(difference[inside]), plain_mean)

figures = {figure["name"]: figure for figure in capture["figures"]}
for name, value in (("maximum", np.nanmax(difference)), ("minimum", np.nanmin(difference))):
    if name in figures:
        assert abs(figures[name]["value"] - value) < 0.5, (figures[name], value)
print(f"{len(table)} samples agree")
