"""Makes the tables of tests/statistics/numeric.rs: log-gamma, normal, rising sums, Poisson and negative binomial.

    python make_counts.py [poisson.csv ...]     (in this folder; mpmath 1.4.1, scipy 1.17.0, fixed seed)

Everything is computed with mpmath at 45 digits and more; scipy is asked the same where it can answer,
and the script stops where the two disagree by more than scipy's own stated accuracy.
"""

import random
import sys

import mpmath
import numpy
import scipy
import scipy.special
import scipy.stats
from mpmath import mp, mpf

mp.dps = 50
rng = random.Random(7)
MADE = f"mpmath {mpmath.__version__} (45 digits or more), compared with scipy {scipy.__version__}, make_counts.py"


def write(name, what, header, rows):
    with open(name, "w", newline="\n") as out:
        out.write(f"# {what}; {MADE}\n{header}\n")
        for row in rows:
            out.write(",".join(repr(float(cell)) for cell in row) + "\n")


def agrees(mine, scipys, tolerance, what):
    mine, scipys = float(mine), float(scipys)
    if numpy.isfinite(scipys) and abs(mine) > 1e-290 and abs(mine - scipys) > tolerance * abs(mine):
        raise SystemExit(f"{what}: mpmath {mine!r}, scipy {scipys!r}")


def spread(lo, hi, count):
    return [10.0 ** rng.uniform(lo, hi) for _ in range(count)]


def ln_gamma_rows():
    near = [z + s * 10.0**-k for z in (1.0, 2.0) for s in (1, -1) for k in range(1, 16)]
    fixed = [0.5, 1.0, 1.5, 2.0, 2.5, 3.0, 11.999999, 12.0, 12.000001, 1e-300, 1e-8, 1e9, 1e12, 1e300]
    for x in fixed + near + spread(-12, 0, 100) + [rng.uniform(0.0, 14.0) for _ in range(300)] + spread(1, 15, 100):
        value = mpmath.loggamma(mpf(x))
        # scipy's gammaln is good to 1e-15 absolutely next to its zeros at 1 and 2, not relatively.
        agrees(1 + abs(value), 1 + abs(mpf(float(scipy.special.gammaln(x)))), 1e-14, f"gammaln {x!r}")
        yield x, value


def normal_rows():
    mp.dps = 60
    for x in [0.0, 1e-12, -1e-12, 1.0, -1.0, 5.0, -37.0, 8.2] + [rng.uniform(-37, 8) for _ in range(400)]:
        value = mpmath.ncdf(mpf(x)) if x > -5 else mpmath.erfc(-mpf(x) / mpmath.sqrt(2)) / 2
        agrees(value, scipy.special.ndtr(x), 1e-12, f"ndtr {x!r}")
        yield x, value


def quantile_rows():
    for p in [0.5, 0.075, 0.925, 0.025, 0.975, 2.0**-53, 1 - 2.0**-53, 1e-300] + [rng.random() for _ in range(300)] + spread(-300, 0, 100):
        start = mpf(float(scipy.special.ndtri(p)))
        f = lambda x: mpmath.log(mpmath.erfc(-x / mpmath.sqrt(2)) / 2) - mpmath.log(mpf(p))
        value = mpmath.findroot(f, (start, start + mpf(10) ** -9 * (1 + abs(start)))) if p != 0.5 else mpf(0)
        agrees(value, scipy.special.ndtri(p), 1e-12, f"ndtri {p!r}")
        yield p, value


def rising_rows():
    """sum_{j=m}^{y-1} ln(1 + a j) and its first two derivatives in a."""
    cases = []
    for a in [0.0, 1e-20, 1e-16, 1e-12, 1e-9, 1e-6, 1e-4, 1e-3, 1e-2, 0.1, 0.5, 1.0, 7.0, 100.0, 2500.0]:
        for m, y in [(0, 0), (0, 1), (0, 2), (0, 17), (0, 1024), (1, 3), (15, 16), (16, 17), (1024, 1024), (1024, 1025), (1024, 1026), (1024, 1100), (1024, 5000),
                     (1024, 10**6), (1024, 10**9), (10**9 - 1, 10**9), (0, 10**9)]:
            cases.append((m, y, a))
    for _ in range(200):
        y = int(10 ** rng.uniform(3.02, 9))
        cases.append((1024, max(y, 1025), 10.0 ** rng.uniform(-20, 3.4)))
    for m, y, a in cases:
        if y - m <= 2000:
            mp.dps = 50
            js = [mpf(j) for j in range(m, y)]
            big = mpf(a)
            yield (m, y, a, mpmath.fsum(mpmath.log1p(big * j) for j in js), mpmath.fsum(j / (1 + big * j) for j in js),
                   -mpmath.fsum((j / (1 + big * j)) ** 2 for j in js))
        elif a == 0.0:
            yield m, y, a, 0, mpf(y * (y - 1) - m * (m - 1)) / 2, -mpf((y - 1) * y * (2 * y - 1) - (m - 1) * m * (2 * m - 1)) / 6
        else:
            mp.dps = 140  # at a = 1e-20 the closed forms below cancel to a hundred digits
            big = mpf(a)
            r = 1 / big
            first = mpmath.digamma(y + r) - mpmath.digamma(m + r)
            second = mpmath.polygamma(1, m + r) - mpmath.polygamma(1, y + r)
            n = y - m
            value = mpmath.loggamma(y + r) - mpmath.loggamma(m + r) + n * mpmath.log(big)
            # sum j/(1+aj) = (n - r sum 1/(r+j)) r ; sum (j/(1+aj))^2 = r^2 (n - 2 r sum 1/(r+j) + r^2 sum 1/(r+j)^2)
            yield m, y, a, value, r * (n - r * first), -(r**2) * (n - 2 * r * first + r**2 * second)
    mp.dps = 50


def poisson_counts(mean):
    sd = mean**0.5
    for z in (-30, -10, -5, -2, -1, -0.3, 0, 0.3, 1, 2, 5, 10, 30):
        y = round(mean + z * sd)
        if 0 <= y <= 10**9:
            yield y
    for y in (0, 1, 2, 5, 15, 16, 17, 38, 39, 40, 100):
        yield y


def poisson_rows():
    means = [1e-12, 1e-6, 0.01, 0.5, 1.0, 3.7, 10.0, 15.9, 30.0, 39.0, 56.0, 100.0, 1000.0, 12345.6, 1e6, 3.3e8, 1e9, 1e12]
    seen = set()
    for mean in means:
        for y in list(poisson_counts(mean)) + ([10**9] if mean >= 3e8 else []):
            if (mean, y) in seen:
                continue
            seen.add((mean, y))
            mp.dps = 60
            m = mpf(mean)
            ln_pmf = y * mpmath.log(m) - m - mpmath.loggamma(y + 1)
            at_most, above = poisson_tails(y, m, ln_pmf)
            # Above that scipy's series ends at 2,000 terms (1.17.0: five digits left at mean 1e6, y 1005000).
            if -600 < ln_pmf and mean < 1e5:
                agrees(at_most, scipy.special.pdtr(y, mean), 1e-9, f"pdtr {y} {mean}")
                agrees(above, scipy.special.pdtrc(y, mean), 1e-9, f"pdtrc {y} {mean}")
            yield mean, y, ln_pmf, mpmath.exp(ln_pmf), at_most, above


def poisson_tails(y, m, ln_pmf):
    """The smaller tail as a sum of positive terms at 60 digits, the other as what it leaves of 1."""
    pmf = mpmath.exp(ln_pmf)
    if m < y + 1:
        term, total, k = mpf(1), mpf(0), y
        while True:
            k += 1
            term *= m / k
            total += term
            if term < total * mpf(10) ** -40:
                break
        above = pmf * total
        return 1 - above, above
    term, total, k = mpf(1), mpf(1), y
    while k > 0:
        term *= k / m
        total += term
        k -= 1
        if term < total * mpf(10) ** -40:
            break
    at_most = pmf * total
    return at_most, 1 - at_most


def nb2_rows():
    """Var = mean + c^2 mean^2; the tails by summing where the sum is short, else by the beta integral."""
    seen = set()
    for c in [0.0, 1e-8, 1e-4, 0.01, 0.1, 0.3, 0.6, 1.0, 3.0, 50.0]:
        for mean in [1e-12, 1e-3, 0.7, 5.0, 60.0, 2000.0, 1e6, 1e9, 1e12]:
            sd = (mean + c * c * mean * mean) ** 0.5
            ys = {0, 1, 3, 16, 100} | {round(mean + z * sd) for z in (-8, -3, -1, 0, 1, 3, 8)}
            if mean >= 1e9:
                ys.add(10**9)
            for y in sorted(v for v in ys if 0 <= v <= 10**9):
                if (c, mean, y) in seen:
                    continue
                seen.add((c, mean, y))
                mp.dps = 45
                m = mpf(mean)
                # The square as the program forms it, so that both speak of the same distribution.
                a = mpf(c * c)
                if a == 0:
                    ln_pmf = y * mpmath.log(m) - m - mpmath.loggamma(y + 1)
                    at_most, above = poisson_tails(y, m, ln_pmf)
                    yield c, mean, y, ln_pmf, mpmath.exp(ln_pmf), at_most, above
                    continue
                r = 1 / a
                p = 1 / (1 + a * m)
                ln_pmf = (mpmath.loggamma(y + r) - mpmath.loggamma(r) - mpmath.loggamma(y + 1) + r * mpmath.log(p)
                          + y * mpmath.log(a * m * p))
                at_most, above = nb2_tails(y, r, p, ln_pmf)
                if at_most is None:
                    at_most, above = nb2_tails_by_integral(y, r, p)
                # scipy takes p, and 1 - p has lost its digits at small means.
                if -600 < ln_pmf and c >= 0.01 and 1e-3 <= mean < 1e6:
                    agrees(at_most, scipy.stats.nbinom.cdf(y, float(r), float(p)), 1e-7, f"nbinom.cdf {y} {mean} {c}")
                    agrees(above, scipy.stats.nbinom.sf(y, float(r), float(p)), 1e-7, f"nbinom.sf {y} {mean} {c}")
                yield c, mean, y, ln_pmf, mpmath.exp(ln_pmf), at_most, above


def nb2_tails(y, r, p, ln_pmf):
    """Positive sums from y up or down; None where they would be too long for the patience of a script."""
    q = 1 - p
    pmf = mpmath.exp(ln_pmf)
    mean = r * q / p
    # Next to Poisson the beta variable sits at 1 - 1e-7 or closer, where the integral below is not meant.
    most = 500_000 if r > 1e12 else 20_000
    small = mpf(10) ** -25
    total, term, k = mpf(1), mpf(1), y
    if 10 * mpmath.sqrt(mean / p) > most and abs(y - mean) < 0.9 * mean:
        return None, None
    if y <= mean:
        for _ in range(most):
            if k == 0 or term < total * small:
                return pmf * total, 1 - pmf * total
            term *= k / ((k - 1 + r) * q)
            total += term
            k -= 1
        return None, None
    total = mpf(0)
    for _ in range(most):
        term *= (k + r) * q / (k + 1)
        total += term
        k += 1
        if term < total * small:
            return 1 - pmf * total, pmf * total
    return None, None


def nb2_tails_by_integral(y, r, p):
    """P(Y <= y) = I_p(r, y + 1) as an integral over u = ln t, cut at many widths of its peak and of its end.

    The smaller side is integrated; the script stops where mpmath's own error estimate is not small.
    """
    f = lambda u: mpmath.exp(r * u + y * mpmath.log1p(-mpmath.exp(u)) - top)
    mode = mpmath.log(r / (r + y))
    width = 1 / mpmath.sqrt(r * y / (r + y))
    top = mpf(0)
    edge = mpmath.log(p)
    floor = mpmath.log(mpf(10) ** -30 / (y + 1))  # below it (1 - t)^y is 1, and the integral is elementary
    lower = edge <= mode or edge < floor
    # The largest value of the integrand on the side taken is scaled to 1.
    top = mpmath.log(f(edge if lower else max(edge, mode)))
    cuts = [mode + 3 * j * width for j in range(-14, 15)]
    cuts += [edge + s * width * mpf("0.5") ** j * 40 for s in (-1, 1) for j in range(-4, 24)]
    scale = mpmath.exp(top - mpmath.log(mpmath.beta(r, y + 1)))
    if lower:
        points = sorted({floor, edge} | {c for c in cuts if floor < c < edge})
        rest = mpmath.exp(r * min(floor, edge) - top) / r
        total = rest + (checked_quad(f, points) if edge > floor else 0)
        return scale * total, 1 - scale * total
    ceiling = mpmath.log(mpf("0.999999"))
    points = sorted({edge, ceiling} | {c for c in cuts if edge < c < ceiling})
    above = scale * checked_quad(f, points)
    return 1 - above, above


def checked_quad(f, points):
    total, error = mpmath.quad(f, points, error=True, method="gauss-legendre", maxdegree=6)
    if error > abs(total) * mpf(10) ** -15:
        raise SystemExit(f"an integral from {points[0]} to {points[-1]} is known to {error} of {total} only")
    return total


TABLES = {
    "ln_gamma.csv": ("ln Gamma(x)", "x,value", ln_gamma_rows),
    "normal_cdf.csv": ("standard normal distribution function", "x,value", normal_rows),
    "normal_quantile.csv": ("standard normal quantile", "p,value", quantile_rows),
    "rising.csv": ("sum of ln(1 + a j) for j from m to y - 1, first and second derivative in a", "m,y,a,value,slope,curvature", rising_rows),
    "poisson.csv": ("Poisson: ln P(Y = y), P(Y = y), P(Y <= y), P(Y > y)", "mean,y,ln_pmf,pmf,at_most,above", poisson_rows),
    "negative_binomial.csv": ("negative binomial of mean and scatter c: ln P(Y = y), P(Y = y), P(Y <= y), P(Y > y)", "c,mean,y,ln_pmf,pmf,at_most,above", nb2_rows),
}
for chosen in sys.argv[1:] or TABLES:
    rng.seed(7)
    mp.dps = 50
    what, header, rows = TABLES[chosen]
    write(chosen, what, header, rows())
