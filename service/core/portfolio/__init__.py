"""Figures of portfolios against a floor: shortfalls, rankings, dominance, confidence."""
