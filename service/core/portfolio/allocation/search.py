"""Along the frontier to the mix where a criterion changes sign."""

import math

import numpy as np

from service.core.arrays import Numbers
from service.core.portfolio.allocation.frontier import Frontier, Piece
from service.core.portfolio.allocation.objectives import Line, Objective

MOST_PIECES = 400
CLOSE = 1e-13
HALVINGS = 200
END = math.inf
"""The optimum is the end of the frontier, where the mean is greatest."""


class Search:
    """One objective on one frontier."""

    def __init__(self, frontier: Frontier, objective: Objective) -> None:
        self.frontier, self.objective = frontier, objective

    def optimum(self, lowest: float, guess: float, greatest_mean: float | None = None) -> tuple[float, float]:
        """Give lam of the optimum above `lowest` and a lam at which its mix was found; END for the end of the frontier.

        `greatest_mean`: stop where it is reached, so that equal means stay shared. Pieces are taken whole: the bracket
        shrinks by one piece or more each turn. Raises RuntimeError if 400 pieces do not suffice.
        """
        low, high, lam = lowest, math.inf, guess
        for _ in range(MOST_PIECES):
            piece = self.frontier.solve(lam)
            line = Line.of(piece, self.frontier.means, self.frontier.risk)
            if greatest_mean is not None and self._at_the_end(piece, line, lam, greatest_mean):
                return END, lam
            left, right = max(piece.lowest, low), piece.highest
            at_left = self.objective.criterion(left, line)
            if at_left <= 0 <= self._at_right(line, left, right, greatest_mean is not None):
                found = self._on_piece(line, left, right)
                return found, found
            low, high = (low, min(high, left)) if at_left > 0 else (max(low, right), high)
            if high <= low * (1 + CLOSE):
                return (low if math.isinf(high) else high), lam
            lam = self._next(line, lam, low, high)
        raise RuntimeError("the optimum was not bracketed")

    def _at_the_end(self, piece: Piece, line: Line, lam: float, greatest_mean: float) -> bool:
        """Tell whether the frontier ends before the criterion rises through 0."""
        at_top = float(self.frontier.means @ self.frontier.weights) >= greatest_mean - CLOSE * (1 + abs(greatest_mean))
        if at_top and self.objective.criterion(lam, line) <= 0:
            return True
        return math.isinf(piece.highest) and self.objective.criterion(max(piece.lowest, lam), line) < 0

    def _at_right(self, line: Line, left: float, right: float, may_end: bool) -> float:
        if not math.isinf(right):
            return self.objective.criterion(right, line)
        return self.objective.criterion(left, line) if may_end else math.inf

    def _on_piece(self, line: Line, left: float, right: float) -> float:
        """Solve the quadratic of the piece; where rounding leaves no root inside, halve."""
        inside = [
            root for root in self.objective.roots(line) if left * (1 - 1e-9) - 1e-300 <= root <= right * (1 + 1e-9)
        ]
        if inside:
            return min(inside, key=lambda root: abs(self.objective.criterion(root, line)))
        low, high = left, min(right, 1e30 * max(left, 1e-30))
        for _ in range(HALVINGS):
            middle = (low + high) / 2
            low, high = (middle, high) if self.objective.criterion(middle, line) < 0 else (low, middle)
        return high

    def _next(self, line: Line, lam: float, low: float, high: float) -> float:
        """Give the next lam to look at: the objective's own fixed point, or a middle of the bracket."""
        guess = self.objective.next_guess(line.mean(lam), line.variance(lam))
        if guess is not None and low < guess < high:
            return guess
        if math.isinf(high):
            return max(4 * low, 2 * lam)
        middle = math.sqrt(max(low, 1e-16 * high) * high)
        return middle if low < middle < high else (low + high) / 2

    def polished(self, lam: float, ended: bool) -> tuple[Numbers, float] | None:
        """Take the ridge out of the mix on the same set of free weights: its centre moves from 0 to the mix itself."""
        frontier = self.frontier
        piece = frontier.recentred()
        if piece is None:
            return None
        if not ended:
            roots = self.objective.roots(Line.of(piece, frontier.means, frontier.covariance))
            near = [root for root in roots if abs(root - lam) <= 1e-3 * lam]
            lam = min(near, key=lambda root: abs(root - lam), default=lam)
        mix = piece.weights(lam)
        outside = (mix < frontier.least - CLOSE) | (mix > frontier.most + CLOSE)
        if outside.any() or not np.isfinite(mix).all():
            return None
        return np.clip(mix, frontier.least, frontier.most), lam
