"""Wealth with flows by methods that share nothing with the service: backward in time, by simulation, by quadrature."""

from collections.abc import Callable

import numpy as np
from scipy.interpolate import CubicSpline
from scipy.special import ndtr, roots_hermitenorm

from service.core.arrays import Numbers


def backward(
    initial_value: float, flows: Numbers, log_mean: float, log_deviation: float, target: float
) -> tuple[float, float]:
    """P(success) and P(depleted): u_t(V) before the flow at t, from the horizon back, on splines in log wealth.

    u_t(V) = E u_{t+1}((V + c_t) G), 0 (of success) where V + c_t < 0. The integral over log G in panels.
    """
    nodes, weights = np.polynomial.legendre.leggauss(12)
    edges = np.linspace(-8, 8, 41)
    z = (edges[:-1, None] + np.diff(edges)[:, None] * (nodes + 1) / 2).ravel()
    w = (np.diff(edges)[:, None] * weights / 2).ravel() * np.exp(-z * z / 2) / np.sqrt(2 * np.pi)
    success = _back(initial_value, flows, log_mean, log_deviation, target, z, w, True)
    return success, _back(initial_value, flows, log_mean, log_deviation, target, z, w, False)


def _back(
    initial_value: float,
    flows: Numbers,
    mean: float,
    deviation: float,
    target: float,
    z: Numbers,
    w: Numbers,
    success: bool,
) -> float:
    failed = 0.0 if success else 1.0
    scale = max(initial_value, target, float(np.abs(flows).max()))
    # log of wealth after the flow; the last step in closed form
    grid = np.log(scale) + np.linspace(-18, 9, 6000)

    def last(y: Numbers) -> Numbers:
        return ndtr((y + mean - np.log(target)) / deviation) if success else np.zeros_like(y)

    after = last
    for flow in flows[:0:-1]:
        # wealth before the flow is exp(y + mean + deviation z) for wealth exp(y) after the flow before
        def before(v: Numbers, flow: float = flow, after: Callable[[Numbers], Numbers] = after) -> Numbers:
            left = v + flow
            return np.where(left > 0, after(np.log(np.maximum(left, 1e-300))), failed)

        if flow < 0:
            # the integrand jumps where the withdrawal is just paid: integrate on either side
            values = np.array([_split(y, flow, mean, deviation, before, failed) for y in grid[::10]])
            spline = CubicSpline(grid[::10], values)
        else:
            v = np.exp(grid[:, None] + mean + deviation * z)
            spline = CubicSpline(grid, before(v) @ w)
        low, high = grid[0], grid[-1]

        def after(y: Numbers, spline: CubicSpline = spline, low: float = low, high: float = high) -> Numbers:
            return spline(np.clip(y, low, high))

    left = initial_value + flows[0]
    return float(after(np.array([np.log(left)]))[0]) if left > 0 else failed


def _split(
    y: float, flow: float, mean: float, deviation: float, before: Callable[[Numbers], Numbers], failed: float
) -> float:
    edge = float(np.clip((np.log(-flow) - y - mean) / deviation, -8.5, 8.5))
    nodes, weights = np.polynomial.legendre.leggauss(16)
    # after the edge the integrand bends like a logarithm: panels that grow from it
    widths = np.minimum(np.geomspace(1e-7, 1.0, 24), 1.0)
    ends = np.concatenate([[edge], edge + np.cumsum(widths), edge + np.cumsum(widths)[-1] + np.arange(1, 18)])
    ends = np.minimum(ends, 8.5)
    lengths = np.diff(ends)
    z = (ends[:-1, None] + lengths[:, None] * (nodes + 1) / 2).ravel()
    w = (lengths[:, None] * weights / 2).ravel() * np.exp(-z * z / 2) / np.sqrt(2 * np.pi)
    return float(before(np.exp(y + mean + deviation * z)) @ w) + failed * float(ndtr(edge))


def simulated(
    initial_value: float, flows: Numbers, growth: Callable[[np.random.Generator, int], Numbers], target: float
) -> tuple[float, float, float]:
    """P(success), P(depleted) and E[V] from 200,000 seeded paths."""
    rng, paths = np.random.default_rng(20), 200_000
    value, alive = np.full(paths, initial_value), np.ones(paths, bool)
    for flow in flows:
        alive &= value + flow >= 0
        value = np.where(alive, np.maximum(value + flow, 0), 0) * growth(rng, paths)
        alive &= value > 0
    return float((alive & (value >= target)).mean()), float((~alive).mean()), float(value.mean())


def hermite_mean(f: Callable[[float], float], count: int = 80) -> float:
    """E f(Z), Z standard normal, by the rule of Gauss and Hermite."""
    nodes, weights = roots_hermitenorm(count)
    return float(np.array([f(float(x)) for x in nodes]) @ weights / weights.sum())
