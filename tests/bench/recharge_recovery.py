"""How often the stated intervals of period and damping hold those of a linear recharge oscillator that is known.

``python tests/bench/recharge_recovery.py [--trials 500] [--years 40] [--seed 1] [--step 6]``

Each trial is a record of dz/dt = A z + noise, integrated exactly in steps of a tenth of a month, seen once a month or
as monthly means, with a season that is taken off as in any record. Printed for each oscillator: the share of 95 %
intervals that hold the true period and the true e-folding time; the median estimate over the truth; the same for the
e-folding time as least squares gave it; the share of fits that do not oscillate.
"""

from __future__ import annotations

import argparse
from dataclasses import dataclass

import numpy as np
import xarray as xr
from measure import show
from scipy.integrate import quad_vec
from scipy.linalg import expm

from profiles.precursor.recharge import STEP, recharge_oscillator, simulate

PARTS = 10  # steps of the integration in a month
START = np.datetime64("2031-01", "M")


@dataclass(frozen=True)
class Case:
    """An oscillator and how it is seen.

    ``lean`` is how much more the index is damped than the volume, as a share of the mean damping; ``drive`` the noise
    on (index, volume); ``noise`` the error of a month's value over the standard deviation of the series.
    """

    name: str
    period: float = 39.0
    decay: float = 20.0
    lean: float = 0.7
    drive: tuple[float, float] = (1.0, 1.0)
    means: bool = False
    noise: float = 0.0

    def rates(self) -> np.ndarray:
        """Return A, per month: eigenvalues -1/decay +- 2 pi i/period."""
        damping, frequency = 1.0 / self.decay, 2.0 * np.pi / self.period
        turn = np.hypot(frequency, self.lean * damping)
        return np.array([[-(1.0 + self.lean) * damping, turn], [-turn, -(1.0 - self.lean) * damping]])

    def records(self, months: int, trials: int, random: np.random.Generator) -> np.ndarray:
        """Return monthly states, (trial, variable, month), of unit variance."""
        rates, drive = self.rates() / PARTS, np.diag(np.square(self.drive))
        noise = quad_vec(lambda s: expm(rates * s) @ drive @ expm(rates.T * s), 0.0, 1.0)[0]
        fine = simulate(expm(rates), noise, months * PARTS, trials, random).reshape(trials, 2, months, PARTS)
        seen = fine.mean(axis=-1) if self.means else fine[..., 0]
        seen = seen / seen.std(axis=(0, 2), keepdims=True)
        return seen + self.noise * random.standard_normal(seen.shape)


CASES = (
    Case("period 39, e-folding 20 months"),
    Case("the same, no lean", lean=0.0),
    Case("the same, noise on the index alone", drive=(1.0, 0.0)),
    Case("the same, noise on the volume alone", drive=(0.0, 1.0)),
    Case("the same, monthly means", means=True),
    Case("the same, errors of 0.1 sd", noise=0.1),
    Case("the same, errors of 0.2 sd", noise=0.2),
    Case("period 41, e-folding 24 months", 41.0, 24.0),
    Case("period 30, e-folding 12 months", 30.0, 12.0),
    Case("period 60, e-folding 40 months", 60.0, 40.0),
    Case("period 60, e-folding 10 months", 60.0, 10.0),
)


def trial(state: np.ndarray, step: int, seed: int) -> xr.Dataset:
    """Fit a record that has a season."""
    months = START + np.arange(state.shape[1])
    time = months.astype("datetime64[ns]")
    season = 2.0 * np.cos(2.0 * np.pi * (np.arange(time.size) % 12) / 12.0)
    index, volume = (xr.DataArray(one + season, dims="time", coords={"time": time}) for one in state)
    return recharge_oscillator(index.rename("index"), volume.rename("volume"), step=step, replicates=200, seed=seed)


def row(case: Case, options: argparse.Namespace) -> list[object]:
    """Return what is printed of a case."""
    records = case.records(12 * options.years, options.trials, np.random.default_rng(options.seed))
    fits = [trial(state, options.step, number) for number, state in enumerate(records)]
    column = {name: np.array([float(fit[name]) for fit in fits]) for name in fits[0] if fits[0][name].ndim == 0}
    held = [
        np.mean((column[f"{name}_low"] <= true) & (true <= column[f"{name}_high"]))
        for name, true in (("period", case.period), ("decay_time", case.decay))
    ]
    medians = [
        np.median(column["period"]) / case.period,
        np.median(column["decay_time"]) / case.decay,
        np.median(column["decay_time_uncorrected"]) / case.decay,
    ]
    return [case.name, *held, *medians, np.mean(np.isinf(column["period"]))]


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    for name, default in (("trials", 500), ("years", 40), ("seed", 1), ("step", STEP)):
        parser.add_argument(f"--{name}", type=int, default=default)
    options = parser.parse_args()
    show(
        f"{options.trials} trials of {options.years} years, fitted over {options.step} months at a time",
        ("oscillator", "period held", "e-folding held", "period/true", "e-folding/true", "uncorrected", "no period"),
        (row(case, options) for case in CASES),
    )


if __name__ == "__main__":
    main()
