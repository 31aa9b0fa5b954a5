"""Reference values for tests/published_values.rs: least squares with HC0 to HC3 on open data.

Data: 442 patients with ten baseline measurements and the progression of diabetes (Efron, Hastie,
Johnstone & Tibshirani 2004), as carried by scikit-learn (BSD-3-Clause), original units.
Run by hand:  python3 tests/reference/make_diabetes_sandwich.py > tests/reference/diabetes_sandwich.json
Made with statsmodels 0.15.0, scikit-learn 1.9.1, NumPy 2.4.6.
"""

import json

import numpy as np
import statsmodels.api as sm
from sklearn.datasets import load_diabetes

source = load_diabetes(scaled=False)
fit = sm.OLS(source.target, sm.add_constant(source.data)).fit()
print(
    json.dumps(
        {
            "names": ["intercept", *source.feature_names],
            "coefficients": fit.params.tolist(),
            "model": fit.bse.tolist(),
            "HC0": fit.HC0_se.tolist(),
            "HC1": fit.HC1_se.tolist(),
            "HC2": fit.HC2_se.tolist(),
            "HC3": fit.HC3_se.tolist(),
            "residual_sd": float(np.sqrt(fit.scale)),
        },
        indent=1,
    )
)
