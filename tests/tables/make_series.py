"""Prints the series that src/numeric holds as constants; run to check or to extend them.

    python make_series.py erfcx      Chebyshev coefficients of numeric/normal.rs
    python make_series.py uniform    table of numeric/uniform_expansion.rs
    python make_series.py factorial  table of numeric/gamma.rs
    python make_series.py zeta       series of numeric/gamma.rs

Needs mpmath (written with 1.4.1).
"""

import sys
from fractions import Fraction

from mpmath import bernfrac, cos, erfc, exp, factorial, log, mp, mpf, nstr, pi, sqrt, zeta

mp.dps = 60


def rust(value):
    return nstr(mpf(value.numerator) / value.denominator if isinstance(value, Fraction) else value, 20, min_fixed=1, max_fixed=0)


def erfcx_chebyshev(middle=mpf("3.75"), kept=26, nodes=96):
    """(1 + 2 z) exp(z^2) erfc(z) in u = (z - middle) / (z + middle), u in [-1, 1)."""

    def scaled(z):
        if z < 60:
            return exp(z * z) * erfc(z)
        total, term = mpf(1), mpf(1)
        for k in range(1, 30):
            term *= -(2 * k - 1) / (2 * z * z)
            total += term
        return total / (z * sqrt(pi))

    def f(u):
        z = middle * (1 + u) / (1 - u)
        return (1 + 2 * z) * scaled(z)

    angles = [pi * (k + mpf(1) / 2) / nodes for k in range(nodes)]
    values = [f(cos(angle)) for angle in angles]
    return [mpf(2) / nodes * sum(v * cos(j * angle) for v, angle in zip(values, angles)) for j in range(kept)]


def uniform_coefficients(orders=10, powers=20):
    """c_k(eta) of the uniform expansion of the incomplete gamma functions (DLMF 8.12.9 to 8.12.11), as power series.

    c_0 = 1/mu - 1/eta,  c_k = (1/eta) dc_{k-1}/deta + (-1)^k g_k / mu,  eta^2 / 2 = mu - ln(1 + mu),
    g_k the Stirling coefficients of the gamma function (DLMF 5.11.3).
    """
    size = powers + 2 * orders + 4
    # mu = sum m_n eta^n from mu mu' = eta (1 + mu).
    m = [Fraction(0), Fraction(1)]
    for n in range(2, size + 2):
        # coefficient of eta^n: sum_{i=1..n} m_i (n + 1 - i) m_{n+1-i} = m_{n-1}
        rest = sum(m[i] * (n + 1 - i) * m[n + 1 - i] for i in range(2, n))
        m.append((m[n - 1] - rest) / (n + 1))
    # 1/mu = (1/eta) * sum v_n eta^n
    v = [Fraction(1)]
    for n in range(1, size + 1):
        v.append(-sum(m[i + 1] * v[n - i] for i in range(1, n + 1)))
    # g_k: the power series of exp(sum B_{2n} / (2n (2n-1)) w^(2n-1)) in w = 1/z (DLMF 5.11.1, 5.11.3).
    s = [Fraction(0)] * (orders + 1)
    for n in range(1, orders // 2 + 2):
        if 2 * n - 1 <= orders:
            top, bottom = bernfrac(2 * n)
            s[2 * n - 1] = Fraction(int(top), int(bottom) * 2 * n * (2 * n - 1))
    g = [Fraction(1)]
    for k in range(1, orders + 1):
        g.append(sum(j * s[j] * g[k - j] for j in range(1, k + 1)) / k)
    rows = []
    c = v[1:]  # 1/mu - 1/eta
    rows.append(c[:])
    for k in range(1, orders):
        sign = -1 if k % 2 else 1
        # (1/eta) c' has the pole c_1 / eta; (+/- g_k / mu) has the pole +/- g_k / eta: they cancel.
        assert c[1] + sign * g[k] == 0
        c = [(n + 2) * c[n + 2] + sign * g[k] * v[n + 1] for n in range(len(c) - 2)]
        rows.append(c[:])
    # Used at a >= 40 and |eta| <= 0.34 only: what stays below 1e-18 there is left out.
    def needed(k, row):
        return 1 + max(n for n in range(powers) if abs(row[n]) * Fraction(34, 100) ** n > Fraction(1, 10**18) * 40**k)

    return [row[: needed(k, row)] for k, row in enumerate(rows)]


def main(what):
    if what == "erfcx":
        for c in erfcx_chebyshev():
            print(f"    {rust(c)},")
    elif what == "uniform":
        for row in uniform_coefficients():
            print("    &[" + ", ".join(rust(c) for c in row) + "],")
    elif what == "factorial":
        for n in range(0, 21):
            print(f"    {rust(log(factorial(n)))},")
    elif what == "zeta":
        for k in range(2, 31):
            print(f"    {rust((zeta(k) - 1) / k)},")
    else:
        sys.exit(__doc__)


main(sys.argv[1] if len(sys.argv) > 1 else "")
