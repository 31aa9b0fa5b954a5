"""Reference values for tests/published_values.rs: distribution functions and quantiles.

Run by hand:  python3 tests/reference/make_distribution_values.py > tests/reference/distributions.json
Made with SciPy 1.17.1.
"""

import json

from scipy import stats

levels = [1e-10, 1e-4, 0.005, 0.025, 0.05, 0.1, 0.3, 0.6, 0.9, 0.95, 0.975, 0.995, 0.9999]
degrees = [1, 2, 3, 5, 10, 29.5, 100, 180, 998, 1e5]
print(
    json.dumps(
        {
            "normal": [[p, stats.norm.ppf(p)] for p in levels],
            "normal_cdf": [[z, stats.norm.cdf(z)] for z in (-8, -5, -2.5, -1, -0.1, 0, 0.7, 3)],
            "student": [[p, df, stats.t.ppf(p, df)] for p in levels for df in degrees],
            "f": [
                [p, a, b, stats.f.ppf(p, a, b)]
                for p in (0.05, 0.5, 0.9, 0.95, 0.99)
                for a in (1, 3, 10)
                for b in (4, 20, 120)
            ],
            "clopper_pearson": [
                [x, n, stats.beta.ppf(0.025, x, n - x + 1) if x else 0.0,
                 stats.beta.ppf(0.975, x + 1, n - x) if x < n else 1.0]
                for x, n in ((0, 20), (1, 29), (81, 263), (15, 148), (29, 29), (9500, 10000), (999_000, 1_000_000))
            ],
        },
        indent=1,
    )
)
