"""Reference values for tests/statistics.rs, by mpmath at 40 digits; quantiles by root finding from SciPy's as a start.

    python3 -m pip install mpmath==1.4.1 scipy==1.17.1
    python3 tests/references/statistics.py > tests/references/statistics.csv

Columns: function, up to three arguments, value.
"""

from mpmath import mp, mpf, betainc, erfc, exp, findroot, gammainc, log, loggamma, sqrt
from scipy import stats

mp.dps = 40


def normal_survival(z):
    return erfc(mpf(z) / sqrt(2)) / 2


def beta_lower(a, b, x):
    return betainc(a, b, 0, x, regularized=True)


def student_survival(t, nu):
    t, nu = mpf(t), mpf(nu)
    return beta_lower(nu / 2, mpf(1) / 2, nu / (nu + t * t)) / 2


def chi_square_survival(x, nu):
    return gammainc(mpf(nu) / 2, mpf(x) / 2, mp.inf, regularized=True)


def binomial_terms(n, p, k, step):
    """The sum of P(X = k), P(X = k + step), ... until nothing is added; p as the double that the program sees."""
    p = mpf(p)
    term = exp(loggamma(n + 1) - loggamma(k + 1) - loggamma(n - k + 1) + k * log(p) + (n - k) * log(1 - p))
    odds = p / (1 - p)
    total = mpf(0)
    while 0 <= k <= n and term > total * mpf(10) ** -35:
        total += term
        term *= odds * (n - k) / (k + 1) if step > 0 else k / (odds * (n - k + 1))
        k += step
    return total


def upper_tail(n, p, k):
    """P(X >= k), from the side on which the terms fall."""
    return binomial_terms(n, p, k, 1) if k > n * p else 1 - binomial_terms(n, p, k - 1, -1)


def lower_tail(n, p, k):
    """P(X <= k)."""
    return binomial_terms(n, p, k, -1) if k < n * p else 1 - binomial_terms(n, p, k + 1, 1)


def root(tail, q, start):
    """The x at which the logarithm of a tail is that of q, by the secant method."""
    goal = log(mpf(q))
    return findroot(lambda x: log(tail(x)) - goal, (mpf(start), mpf(start) * (1 + mpf(10) ** -8)), tol=mpf(10) ** -50)


def line(function, arguments, value):
    cells = [repr(a) for a in arguments] + [""] * (3 - len(arguments))
    print(",".join([function, *cells, mp.nstr(value, 20)]))


def main():
    print("function,a,b,c,value")
    for z in (-8.0, -1.0, 0.3, 1.0, 2.5, 4.9, 5.1, 7.5, 12.0, 25.0, 37.0):
        line("normal_survival", (z,), normal_survival(z))
    for q in (0.4, 0.1, 0.025, 1e-3, 3.7e-5, 1e-9, 1e-20, 1e-100, 1e-300):
        line("normal_upper_quantile", (q,), root(normal_survival, q, stats.norm.isf(q)))
    for nu in (1.0, 2.0, 3.0, 8.0, 40.0, 1e3, 1e6):
        for t in (0.5, 2.0, 5.0, 12.0, 30.0):
            line("student_survival", (t, nu), student_survival(t, nu))
        for q in (0.1, 0.005, 1e-4, 1e-8):
            start = stats.t.isf(q, nu)
            line("student_upper_quantile", (q, nu), root(lambda t: student_survival(t, nu), q, start))
    for nu in (1.0, 2.0, 8.0, 99.0, 1000.0):
        for x in (0.3, 1.0, 2.0, 5.0):
            line("chi_square_survival", (x * nu, nu), chi_square_survival(x * nu, nu))
        for q in (0.9, 0.1, 0.01, 1e-6, 1e-12):
            start = stats.chi2.isf(q, nu)
            line("chi_square_upper_quantile", (q, nu), root(lambda x: chi_square_survival(x, nu), q, start))
    for n, p, k in (
        (10, 0.3, 3), (100, 0.5, 80), (100, 0.01, 20), (1000, 0.25, 250), (1000, 0.25, 400), (1000000, 0.001, 1100),
        (1000000, 0.5, 505000), (1000000, 1e-7, 5), (1000000000, 0.9, 900100000), (1000000000000, 1e-9, 1200),
    ):
        line("upper_tail", (n, p, k), upper_tail(n, p, k))
        line("lower_tail", (n, p, k), lower_tail(n, p, k))
    for x, n, alpha in (
        (4, 20, 0.1), (81, 263, 0.05), (15, 148, 0.05), (1, 29, 0.05), (3, 1000000, 0.001), (499000, 1000000, 1e-4),
    ):
        # The ends solve P(X >= x) = alpha/2 and P(X <= x) = alpha/2.
        low, high = stats.beta.ppf(alpha / 2, x, n - x + 1), stats.beta.isf(alpha / 2, x + 1, n - x)
        line("clopper_pearson_low", (x, n, alpha), root(lambda p: upper_tail(n, p, x), mpf(alpha) / 2, low))
        line("clopper_pearson_high", (x, n, alpha), root(lambda p: lower_tail(n, p, x), mpf(alpha) / 2, high))


if __name__ == "__main__":
    main()
