"""The benchmark job of benches/replay.rs, vectorised over trials in NumPy.

Two batches of n/2 units, p independent standard normal covariates, no intercept. Batch 2 is the
top 15 % by the outcome predicted from a least-squares fit of batch 1. On every trial the methods
of benches/replay.rs are applied to one contrast: least squares with model variance and HC0 to HC3,
ridge, first batch, last batch, batch-combined, inverse-variance and W-decorrelation.

Run by hand:  OMP_NUM_THREADS=1 python3 benches/numpy_replay.py
Needs numpy alone. One thread, so that the ratio is per core. Prints microseconds per trial for
the fastest of several numbers of trials held at once.
"""

import time

import numpy as np

FRACTION = 0.15


def replay(rng, trials, n, p):
    """Replays `trials` trials at once; returns points and standard errors, trials x methods."""
    half = n // 2
    pool = round(half / FRACTION)
    contrast = np.full(p, 1.0 / np.sqrt(p))
    beta = contrast
    x = np.empty((trials, n, p))
    x[:, :half] = rng.standard_normal((trials, half, p))
    y = np.empty((trials, n))
    y[:, :half] = x[:, :half] @ beta + rng.standard_normal((trials, half))
    x1 = x[:, :half]
    gram1 = x1.transpose(0, 2, 1) @ x1
    cross1 = (x1.transpose(0, 2, 1) @ y[:, :half, None])[..., 0]
    beta1 = np.linalg.solve(gram1, cross1[..., None])[..., 0]
    candidates = rng.standard_normal((trials, pool, p))
    scores = (candidates @ beta1[..., None])[..., 0]
    chosen = np.argpartition(scores, pool - half, axis=1)[:, pool - half:]
    x[:, half:] = np.take_along_axis(candidates, chosen[..., None], axis=1)
    y[:, half:] = x[:, half:] @ beta + rng.standard_normal((trials, half))
    x2 = x[:, half:]
    gram2 = x2.transpose(0, 2, 1) @ x2
    cross2 = (x2.transpose(0, 2, 1) @ y[:, half:, None])[..., 0]
    gram = gram1 + gram2
    cross = cross1 + cross2
    points, errors = [], []

    def fit(gram, cross, x, y):
        solution = np.linalg.solve(
            gram, np.stack([cross, np.broadcast_to(contrast, cross.shape)], axis=2)
        )
        coefficients, direction = solution[..., 0], solution[..., 1]
        residuals = y - (x @ coefficients[..., None])[..., 0]
        return coefficients, direction, residuals, direction @ contrast

    coefficients, direction, residuals, unit = fit(gram, cross, x, y)
    rss = np.einsum("ij,ij->i", residuals, residuals)
    point = coefficients @ contrast
    points.append(point)
    errors.append(np.sqrt(rss / (n - p) * unit))
    weights = (x @ direction[..., None])[..., 0]
    inverse = np.linalg.inv(gram)
    leverages = np.einsum("ijk,ijk->ij", x @ inverse, x)
    plain = (weights * residuals) ** 2
    hc0 = plain.sum(axis=1)
    for variance in (
        hc0,
        hc0 * n / (n - p),
        (plain / (1.0 - leverages)).sum(axis=1),
        (plain / (1.0 - leverages) ** 2).sum(axis=1),
    ):
        points.append(point)
        errors.append(np.sqrt(variance))
    penalised = gram + np.eye(p)
    inverse = np.linalg.inv(penalised)
    ridge = (inverse @ cross[..., None])[..., 0]
    direction = inverse @ contrast
    degrees = n - p + np.trace(inverse, axis1=1, axis2=2)
    left = y - (x @ ridge[..., None])[..., 0]
    variance = np.einsum("ij,ij->i", left, left) / degrees
    points.append(ridge @ contrast)
    errors.append(
        np.sqrt(variance * np.einsum("ij,ijk,ik->i", direction, gram, direction, optimize=True))
    )
    first = fit(gram1, cross1, x1, y[:, :half])
    last = fit(gram2, cross2, x2, y[:, half:])
    squares = []
    for coefficients, _, residuals, unit_k in (first, last):
        squares.append(np.einsum("ij,ij->i", residuals, residuals))
        points.append(coefficients @ contrast)
        errors.append(np.sqrt(squares[-1] / (half - p) * unit_k))
    within = (squares[0] + squares[1]) / (n - 2 * p)
    estimates = (first[0] @ contrast, last[0] @ contrast)
    for kappas in (
        (np.sqrt(0.5 / first[3]), np.sqrt(0.5 / last[3])),
        (1.0 / first[3], 1.0 / last[3]),
    ):
        total = kappas[0] + kappas[1]
        points.append((kappas[0] * estimates[0] + kappas[1] * estimates[1]) / total)
        scale = total if len(points) == 9 else np.sqrt(total)
        errors.append(np.sqrt(within) / scale)
    penalty = half / 2 / np.log(n)
    row_squares = np.einsum("ijk,ijk->ij", x, x)
    remainder = np.broadcast_to(contrast, (trials, p)).copy()
    weights = np.empty((trials, n))
    for i in range(n):
        row = x[:, i]
        weight = np.einsum("ij,ij->i", remainder, row) / (penalty + row_squares[:, i])
        remainder -= weight[:, None] * row
        weights[:, i] = weight
    residuals = y - (x @ np.linalg.solve(gram, cross[..., None]))[..., 0]
    points.append(point + np.einsum("ij,ij->i", weights, residuals))
    errors.append(np.sqrt(rss / (n - p) * np.einsum("ij,ij->i", weights, weights)))
    return np.array(points).T, np.array(errors).T


def main():
    print(f"NumPy {np.__version__}")
    for n, p in ((500, 10), (1000, 50), (500, 100)):
        truth = 1.0
        best = np.inf
        for trials in (1, 8, 32, 128):
            if trials * n * p > 2e7:
                continue
            rng = np.random.default_rng(1)
            replay(rng, trials, n, p)
            times = []
            for _ in range(max(3, 256 // trials)):
                start = time.perf_counter()
                points, errors = replay(rng, trials, n, p)
                times.append((time.perf_counter() - start) / trials)
            best = min(best, float(np.median(times)))
        covered = np.abs(points[:, 8] - truth) < 1.96 * errors[:, 8]
        print(
            f"n={n} p={p}: {1e6 * best:.0f} microseconds per trial "
            f"(batch-combined covered {covered.mean():.2f} in the last {trials} trials)"
        )


if __name__ == "__main__":
    main()
