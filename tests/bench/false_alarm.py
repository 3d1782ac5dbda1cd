"""How often independent series are called related, how often a planted lead is found within its interval.

``python tests/bench/false_alarm.py [--trials N] [--years N] [--seed N] [--only TEXT] [--test-alone]`` prints, for each
kind of series, the share of independent pairs that the deciding test calls significant at 5 %: its least, mean and
largest over leads of -24 to 24 months; beside it the mean of the usual formula (1 - r1 r2) / (1 + r1 r2), of no
correction at all and of the block bootstrap, and how often the whole field of leads is called significant. Then how
often the interval of the strongest lead holds the lead of 6 months that was planted.
"""

from __future__ import annotations

import argparse
import sys
from collections.abc import Callable

import numpy as np
from scipy.signal import lfilter
from scipy.special import stdtr

from profiles.precursor.field_significance import field_significance, simulated_pairs
from profiles.precursor.memory import fit_memory
from profiles.precursor.peak import peak
from profiles.precursor.shifting import shifted
from profiles.statistics import block_length, block_weights, paired_statistics, weighted_correlation

LEADS = np.arange(-24, 25)
SPARSE = np.array([-24, -12, 0, 12, 24])
PLANTED = 6
BLOCK = 500  # pairs at a time


def red(generator, draws, months, memory):
    """AR(1), x_t = memory x_(t-1) + e_t."""
    noise = generator.standard_normal((draws, months))
    noise[:, 0] /= np.sqrt(1.0 - memory**2)
    return lfilter([1.0], [1.0, -memory], noise, axis=-1)


def oscillation(generator, draws, months, period, damping, *, driven):
    """z_t = exp(-1 / damping) rotation(2 pi / period) z_(t-1) + noise, the first of two variables; months.

    ``driven``: noise on "both", on the "first" (a recharge oscillator driven by wind) or on the "second" (an AR(2)).
    """
    burn = int(10 * damping)
    decay, angle = np.exp(-1.0 / damping), 2.0 * np.pi / period
    poles = [1.0, -2.0 * decay * np.cos(angle), decay**2]
    first, second = (generator.standard_normal((draws, months + burn)) for _ in range(2))
    # The first variable by its two poles: its own noise passes 1 - decay cos(angle) B, the other's decay sin(angle) B.
    series = 0.0
    if driven in ("both", "first"):
        series = series + lfilter([1.0, -decay * np.cos(angle)], poles, first, axis=-1)
    if driven in ("both", "second"):
        series = series + lfilter([0.0, -decay * np.sin(angle)], poles, second, axis=-1)
    return series[:, burn:]


def kinds():
    """Return what makes the two series of a pair, by name."""
    made: dict[str, tuple[Callable, Callable]] = {}
    for one, other in ((0.0, 0.0), (0.5, 0.5), (0.8, 0.8), (0.9, 0.9), (0.95, 0.95), (0.97, 0.97), (0.5, 0.95)):
        made[f"AR(1) {one:g}, {other:g}"] = tuple(
            lambda g, d, m, memory=memory: red(g, d, m, memory) for memory in (one, other)
        )
    pairs = [((36, 6), (48, 6)), ((42, 12), (42, 12)), ((36, 18), (48, 18)), ((36, 24), (36, 24)), ((48, 24), (48, 24)),
             ((36, 6), (48, 24))]  # fmt: skip
    for driven in ("second", "first", "both"):
        for pair in pairs:
            name = f"oscillation, noise on {driven}, {pair[0][0]}/{pair[0][1]}, {pair[1][0]}/{pair[1][1]}"
            made[name] = tuple(
                lambda g, d, m, p=period, e=damping, n=driven: oscillation(g, d, m, p, e, driven=n)
                for period, damping in pair
            )
    for name, share in (("AR(1) 0.9, 0.9", 0.3), ("oscillation, noise on both, 42/12, 42/12", 0.3),
                        ("oscillation, noise on both, 42/12, 42/12", 0.6)):  # fmt: skip
        made[f"{name}, seasonal spread {share:g}"] = tuple(
            lambda g, d, m, maker=maker, share=share: (
                maker(g, d, m) * (1.0 + share * np.cos(2.0 * np.pi * np.arange(m) / 12.0))
            )
            for maker in made[name]
        )
    return made


def models(values):
    return fit_memory(values, np.arange(values.shape[-1]) % 12 + 1)


def paired(first, second, one, other, leads):
    """Return the statistics of series (..., time) at leads, (..., lead), as ``lead_lag`` makes them."""
    return paired_statistics(
        first[..., None, :],
        shifted(second, leads),
        one.autocorrelation[..., None, :],
        other.autocorrelation[..., None, :],
        first_scale=one.scale[..., None, :],
        second_scale=shifted(other.scale, leads),
    )


def t_test(correlation, effective):
    freedom = np.maximum(effective - 2.0, 1.0)
    return 2.0 * stdtr(freedom, -np.abs(correlation) * np.sqrt(freedom / (1.0 - correlation**2)))


def lag_one(values):
    centred = values - values.mean(axis=-1, keepdims=True)
    return (centred[:, 1:] * centred[:, :-1]).sum(axis=-1) / (centred**2).sum(axis=-1)


def tests(first, second):
    """Return the p-values of the deciding test, of the usual formula and of none, each (pair, lead)."""
    memory, other_memory = models(first), models(second)
    product = lag_one(first) * lag_one(second)
    deciding, usual, none = [], [], []
    for lead in LEADS:
        found = paired(first, second, memory, other_memory, [lead])
        correlation, count = found.correlation[:, 0], found.count[:, 0]
        deciding.append(found.p_value[:, 0])
        usual.append(t_test(correlation, count * (1.0 - product) / (1.0 + product)))
        none.append(t_test(correlation, count))
    return [np.stack(values, axis=-1) for values in (deciding, usual, none)]


def resampled_correlations(first, second, leads, generator, draws):
    """Return the correlations of the record and of its resamples, as ``lead_lag`` draws them."""
    ahead = shifted(second, leads)
    found = paired(first, second, models(first), models(second), leads)
    at = int(np.nanargmax(np.abs(found.correlation)))
    length = block_length(float(found.count[at]), float(found.effective_size[at]))
    weights = block_weights(first.size, length, draws, generator)
    return found, weighted_correlation(weights, np.broadcast_to(first[:, None], ahead.T.shape), ahead.T)


def bootstrap_alarms(first, second, generator):
    alarms = []
    for one, other in zip(first, second, strict=True):
        _, resampled = resampled_correlations(one, other, SPARSE, generator, 400)
        lower, upper = np.nanpercentile(resampled, [2.5, 97.5], axis=0)
        alarms.append((lower > 0.0) | (upper < 0.0))
    return float(np.mean(alarms))


def field_alarms(first, second, generator):
    """Return how often the strongest lead, and the number of significant leads, are significant at 5 %."""
    alarms = []
    for one, other in zip(first, second, strict=True):
        memory, other_memory = models(one), models(other)
        found = paired(one, other, memory, other_memory, LEADS)
        pair = simulated_pairs(memory.reflection, other_memory.reflection, one.size, 200, generator)
        chance = correlations(pair[0] * memory.scale, pair[1] * other_memory.scale)
        field = field_significance(found.correlation, chance, found.effective_size, 0.05)
        alarms.append((field.p_value <= 0.05, field.p_value_of_count <= 0.05))
    return np.mean(alarms, axis=0)


def correlations(first, second):
    by_lead = []
    for lead in LEADS:
        inside = slice(max(0, -lead), first.shape[-1] - max(0, lead))
        moved = slice(max(0, lead), first.shape[-1] - max(0, -lead))
        one, other = (values - values.mean(-1, keepdims=True) for values in (first[:, inside], second[:, moved]))
        by_lead.append((one * other).sum(-1) / np.sqrt((one**2).sum(-1) * (other**2).sum(-1)))
    return np.stack(by_lead, axis=-1)


def planted(generator, trials, months, memory, share):
    """Return how often the interval holds the lead planted, its mean width and the spread of the estimate."""
    inside, widths, leads = [], [], []
    for _ in range(trials):
        signal = red(generator, 1, months + PLANTED, memory)[0] * np.sqrt(1.0 - memory**2)
        noise = red(generator, 1, months + PLANTED, memory)[0] * np.sqrt(1.0 - memory**2)
        target = np.sqrt(share) * signal[:-PLANTED] + np.sqrt(1.0 - share) * noise[PLANTED:]
        found, resampled = resampled_correlations(signal[PLANTED:], target, LEADS, generator, 400)
        strongest = peak(found.correlation, resampled, LEADS, 0.95)
        inside.append(strongest.lower <= PLANTED <= strongest.upper)
        widths.append(strongest.upper - strongest.lower)
        leads.append(strongest.lead)
    return np.mean(inside), np.median(widths), np.percentile(leads, [2.5, 97.5])


def main():
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--trials", type=int, default=5000)
    parser.add_argument("--years", type=int, default=40)
    parser.add_argument("--seed", type=int, default=1)
    parser.add_argument("--only", default="", help="kinds of series whose name holds this")
    parser.add_argument("--test-alone", action="store_true", help="without bootstrap, field and planted leads")
    given = parser.parse_args()
    generator = np.random.default_rng(given.seed)
    months = 12 * given.years
    print(f"false alarms in % at nominal 5 %, {given.trials} pairs of {given.years} years, leads -24 to 24")
    print(f"{'series':62} least  mean most   usual  none  boots.  field count")
    within = []
    chosen = {name: pair for name, pair in kinds().items() if given.only in name}
    for name, (one, other) in chosen.items():
        parts = []
        while sum(len(part[0]) for part in parts) < given.trials:
            pair = one(generator, BLOCK, months), other(generator, BLOCK, months)
            parts.append(tests(*pair))
        deciding, usual, none = (np.concatenate([part[n] for part in parts])[: given.trials] for n in range(3))
        rates = (deciding < 0.05).mean(axis=0)
        within.append((rates >= 0.03).all() and (rates <= 0.07).all())
        few = max(given.trials // 10, 20)
        sample = [values[:few] for values in pair]
        others = [(usual < 0.05).mean(), (none < 0.05).mean()]
        if not given.test_alone:
            others += [bootstrap_alarms(*sample, generator), *field_alarms(*sample, generator)]
        print(
            f"{name:62} {100 * rates.min():5.1f} {100 * rates.mean():5.1f} {100 * rates.max():5.1f}  "
            + " ".join(f"{100 * value:6.1f}" for value in others),
            flush=True,
        )
    print(f"every lead between 3 and 7 %: {sum(within)} of {len(within)} kinds of series")
    if given.test_alone:
        return 0
    print(f"a lead of {PLANTED} months planted: interval holds it, its median width, 95 % of the estimates")
    for memory, share in ((0.8, 0.3), (0.9, 0.3), (0.9, 0.6), (0.95, 0.5)):
        held, width, (low, high) = planted(generator, max(given.trials // 10, 20), months, memory, share)
        print(f"  AR(1) {memory:g}, share {share:g}: {100 * held:5.1f} %  {width:4.1f} months  {low:.1f} to {high:.1f}")
    return 0


if __name__ == "__main__":
    sys.exit(main())
