# SPDX-License-Identifier: Apache-2.0
"""The scan's statistics against numpy and scipy on the same record.

  scan_against_numpy.py RILLSTRAND TESTS_FOLDER
"""
import csv
import pathlib
import sys
import tempfile

import numpy as np

sys.path.insert(0, str(pathlib.Path(sys.argv[2]) / "commands"))
import campaign_folder as good  # noqa: E402

failures = []
with tempfile.TemporaryDirectory() as place:
    folder = good.make(place, '[record]\nfiles = ["record.csv"]\n')
    chance = np.random.default_rng(12)
    n_time, n_place = 700, 9
    seconds = 1940803200 + 300 * np.arange(n_time)
    wave = 12 + np.cos(2 * np.pi * (seconds[:, None] / 3600 - 15) / 24) * np.linspace(0.2, 4, n_place)
    values = np.round(wave + chance.normal(0, 0.1, (n_time, n_place)), 2)
    values[chance.random((n_time, n_place)) < 0.03] = np.nan
    stamps = np.datetime_as_string(seconds.astype("datetime64[s]"))
    with open(folder / "record.csv", "w") as file:
        file.write("time," + ",".join(str(0.5 * j) for j in range(n_place)) + "\n")
        for stamp, row in zip(stamps, values):
            file.write(stamp + "Z," + ",".join("" if np.isnan(v) else f"{v:.2f}" for v in row) + "\n")
    done = good.run(sys.argv[1], "-q", "assess", folder / "campaign.toml")
    assert done.returncode == 0, done.stderr
    rows = list(csv.DictReader((folder / "out/tables/channels.csv").open()))

omega = 2 * np.pi / 86400
for j, row in enumerate(rows):
    good_rows = np.isfinite(values[:, j])
    v, t = values[good_rows, j], seconds[good_rows]
    x = np.column_stack([np.ones(len(t)), (t - t.mean()) / 86400, np.cos(omega * t), np.sin(omega * t),
                         np.cos(2 * omega * t), np.sin(2 * omega * t)])
    fit = np.linalg.lstsq(x, v, rcond=None)[0]
    day = t // 86400
    ranges = [np.ptp(v[day == d]) for d in np.unique(day) if (day == d).sum() >= 0.75 * 288]
    expected = {"mean_c": v.mean(), "sd_c": v.std(ddof=1), "min_c": v.min(), "max_c": v.max(),
                "p05_c": np.quantile(v, 0.05), "p50_c": np.quantile(v, 0.5), "p95_c": np.quantile(v, 0.95),
                "daily_range_c": np.mean(ranges), "diurnal_amplitude_c": np.hypot(fit[2], fit[3]),
                "diurnal_phase_h": np.arctan2(fit[3], fit[2]) * 12 / np.pi % 24}
    for name, value in expected.items():
        printed = 10.0 ** -len(row[name].split(".")[1])  # the last digit of the table
        if abs(float(row[name]) - value) > 0.51 * printed + 2e-6:
            failures.append(f"channel {j}: {name} is {row[name]}, numpy says {value:.6f}")
print("\n".join(failures) if failures else "the scan agrees with numpy")
sys.exit(1 if failures else 0)
