"""Makes chains_*.csv (draws) and chains.csv (what they say) for tests/statistics/convergence.rs.

    python make_chains.py     (in this folder; numpy 2.4.6, arviz-stats 0.8.0, fixed seed)

Draws are rounded to eight digits first, so that both sides read the same numbers.
`error_of_sd` is composed here: arviz-stats 0.8.0 takes the effective draws of the draws themselves
in its `_mcse_sd`, where the published method takes those of the squared deviations; here the figure
is its formula with its own `_ess_sd`.
"""

import arviz_stats
import numpy
from arviz_stats.base import array_stats

rng = numpy.random.default_rng(5)


def autoregressive(rho, chains, draws):
    x = numpy.zeros((chains, draws))
    noise = rng.standard_normal((chains, draws))
    x[:, 0] = noise[:, 0]
    for t in range(1, draws):
        x[:, t] = rho * x[:, t - 1] + (1 - rho**2) ** 0.5 * noise[:, t]
    return x


def cases():
    yield "independent", rng.standard_normal((4, 250))
    yield "slow", autoregressive(0.9, 4, 500)
    yield "very_slow", autoregressive(0.995, 4, 1000)
    stuck = autoregressive(0.3, 4, 200)
    stuck[2] = 3.0
    yield "one_stuck", stuck
    yield "antithetic", autoregressive(-0.7, 2, 300)
    yield "odd_length", numpy.exp(autoregressive(0.5, 3, 201))
    yield "many_ties", numpy.maximum(numpy.round(autoregressive(0.4, 4, 200), 1), 0.0)
    yield "spread_apart", rng.standard_normal((4, 100)) * numpy.array([[1.0], [3.0], [1.0], [1.0]])
    yield "one_chain", autoregressive(0.6, 1, 400)
    yield "drifting", rng.standard_normal((4, 1000)) * 0.1 + numpy.linspace(0, 1, 1000)


def write():
    header = (
        "mean,sd,median,lower,upper,error_of_mean,error_of_sd,error_of_median,error_of_lower,error_of_upper,"
        "effective_draws,effective_tail_draws,split_r_hat"
    )
    made = f"arviz-stats {arviz_stats.__version__}, numpy {numpy.__version__}, make_chains.py"
    with open("chains.csv", "w", newline="\n") as summary:
        summary.write(f"# what arviz-stats says of chains_*.csv, interval 0.9; {made}\n# one line for each case, in the order of make_chains.py\n")
        summary.write("chains," + header + "\n")
        for name, draws in cases():
            x = numpy.array([[float(f"{v:.8g}") for v in chain] for chain in draws])
            with open(f"chains_{name}.csv", "w", newline="\n") as out:
                out.write(f"# {name}: {x.shape[0]} chains, one after another; {made}\nvalue\n")
                out.writelines(f"{float(v)!r}\n" for v in x.ravel())
            squares = (x - x.mean()) ** 2
            error_of_sd = ((squares**2).mean() - squares.mean() ** 2) / array_stats._ess_sd(x) / squares.mean() / 4
            figures = [
                x.mean(), x.std(ddof=1), *numpy.quantile(x, [0.5, 0.05, 0.95]),
                array_stats._mcse_mean(x), error_of_sd**0.5,
                *(array_stats._mcse_quantile(x, p) for p in (0.5, 0.05, 0.95)),
                array_stats._ess_bulk(x), array_stats._ess_tail(x, prob=(0.05, 0.95)),
                max(array_stats._rhat_z_scale(x), array_stats._rhat_folded(x)) if x.shape[0] > 1 else one_chain_r_hat(x),
            ]
            summary.write(f"{x.shape[0]}," + ",".join(repr(float(f)) for f in figures) + "\n")


def one_chain_r_hat(x):
    """arviz-stats refuses one chain, though its two halves can be compared: the same steps, from its own parts."""
    split = array_stats._split_chains(x)
    folded = abs(split - numpy.median(split))
    return max(array_stats._rhat(array_stats._z_scale(part)) for part in (split, folded))


write()
