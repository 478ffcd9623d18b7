"""Seconds and memory of the cold-air layer over one 1° tile at 90 m, a whole night, both edge runs.

Run from the repository: ``python benchmarks/cold_layer.py [cells on a side]``. The ground is invented: hills of several
sizes, a plain and a sea. The aim is 20 s for 1,201 cells on two processors.
"""

import resource
import sys
import time

import numpy as np
from scipy.ndimage import gaussian_filter

from sitescreen.climate.cold_layer import cold_layer
from sitescreen.grid import Field, Grid
from sitescreen.settings import load_defaults
from sitescreen.terrain.threads import thread_count


def hills(cells: int) -> Field:
    """Relief of some hundred metres over 2 to 40 km."""
    random = np.random.default_rng(4)
    height = 900.0 + np.linspace(-900.0, 900.0, cells)[None] * np.ones((cells, 1))
    for width, size_m in ((8, 40.0), (30, 120.0), (120, 250.0)):
        waves = gaussian_filter(random.standard_normal((cells, cells)), width, mode="wrap")
        height += size_m * waves / waves.std()
    return Field(np.maximum(height, 0.0), Grid("EPSG:32641", 0.0, cells * 90.0, 90.0, cells, cells), "m", "hills")


def main(cells: int) -> None:
    """Compile on a small piece, then time the whole."""
    settings = load_defaults().cold_layer
    small = hills(30)
    cold_layer(small, small.values <= 0.0, None, settings)
    ground = hills(cells)
    begun, busy = time.perf_counter(), time.process_time()
    layer = cold_layer(ground, ground.values <= 0.0, None, settings)
    wall, cpu = time.perf_counter() - begun, time.process_time() - busy
    peak_mb = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024.0
    run = layer.runs[0]
    print(f"{cells} × {cells} cells, {run.steps} steps of {run.step_s:.2f} s, {thread_count()} processors")
    print(f"{wall:.1f} s on the clock, {cpu:.1f} s of processor time, {peak_mb:.0f} MB at most")
    print(f"{cpu * 1e9 / (2 * run.steps * cells**2):.2f} ns for a cell and step")
    print(f"air missing: {max(one.balance.error for one in layer.runs):.1e} of what was supplied and passed the edges")


if __name__ == "__main__":
    main(int(sys.argv[1]) if len(sys.argv) > 1 else 1201)
