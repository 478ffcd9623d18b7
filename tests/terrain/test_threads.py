"""The number of threads changes no bit of any result."""

import threading
import time
from concurrent.futures import ThreadPoolExecutor

import numpy as np
import pytest

from sitescreen.grid import Field, Grid
from sitescreen.terrain import threads
from sitescreen.terrain.buildable import chance_buildable
from sitescreen.terrain.drainage import catchment_cells, drainage
from sitescreen.terrain.hollows import hollows
from sitescreen.terrain.horizon import horizon_profile, horizon_tangent, upwind_tangent
from sitescreen.terrain.position import rise_m
from sitescreen.terrain.sky_view import sky_view
from sitescreen.terrain.slope import gradient, slope_and_aspect


def everything(f: Field) -> dict[str, np.ndarray]:
    """Every terrain quantity of one field."""
    drained = drainage(f)
    found = hollows(f)
    profile = horizon_profile(f, np.arange(100.0, 900.0, 50.0), -np.arange(100.0, 900.0, 50.0), np.arange(0, 360, 10.0))
    return {
        "gradient": gradient(f).north.values,
        "slope": slope_and_aspect(f).slope_deg.values,
        "aspect": slope_and_aspect(f).aspect_deg.values,
        "rise": rise_m(f, 200.0).values,
        "buildable": chance_buildable(f, 15.0, 2.5, 90.0).values,
        "horizon": np.array([horizon_tangent(f, a) for a in (0.0, 33.0, 77.0, 200.0)]),
        "upwind": np.array([upwind_tangent(f, a, 200.0).values for a in (10.0, 100.0)]),
        "sky_view": sky_view(f, 8).values,
        "direction": drained.direction,
        "catchment": catchment_cells(drained),
        "depth": found.depth_m.values,
        "pools": np.array([found.pools.sill_m, found.pools.volume_m3, found.pools.catchment_cells]),
        "profile": profile.angle_deg,
    }


def test_one_thread_or_several_give_the_same_bits(monkeypatch: pytest.MonkeyPatch) -> None:
    """1, 2 and 5 threads; a hole and whole-metre heights included."""
    values = np.round(np.cumsum(np.random.default_rng(1).normal(0, 5, (47, 61)), axis=0))
    values[20:23, 30] = np.nan
    f = Field(values, Grid("EPSG:32637", 0.0, 0.0, 30.0, 47, 61), "m", "test ground")
    results = []
    for count in (1, 2, 5):
        monkeypatch.setattr(threads, "thread_count", lambda count=count: count)
        results.append(everything(f))
    for name, first in results[0].items():
        for other in results[1:]:
            np.testing.assert_array_equal(first, other[name], err_msg=name)


@pytest.mark.parametrize("count", [1, 2, 7, 100])
@pytest.mark.parametrize("bands", [1, 8])
def test_bands_cover_every_item_once(count: int, bands: int) -> None:
    """Whatever the number of items, none is left out and none is done twice."""
    done = np.zeros(count, dtype=int)

    def kernel(out: np.ndarray, start: int, stop: int) -> None:
        out[start:stop] += 1

    threads.in_bands(kernel, count, done, bands_a_thread=bands)
    assert (done == 1).all()


def test_an_error_in_a_band_comes_out() -> None:
    """It is not lost in a thread."""

    def kernel(start: int, stop: int) -> None:
        raise ValueError(f"{start}")

    with pytest.raises(ValueError, match="0"):
        threads.in_bands(kernel, 10)


def test_threads_of_a_pool_work_alone(monkeypatch: pytest.MonkeyPatch) -> None:
    """A pool that has a thread a processor at work starts no more of them: one thread does every band."""
    monkeypatch.setattr(threads, "thread_count", lambda: 4)
    names: set[int] = set()

    def who(start: int, stop: int) -> None:
        names.add(threading.get_ident())
        time.sleep(0.01)  # so that no one thread of several could do them all

    with ThreadPoolExecutor(1, initializer=threads.work_alone) as pool:
        pool.submit(threads.in_bands, who, 100).result()
    assert len(names) == 1
