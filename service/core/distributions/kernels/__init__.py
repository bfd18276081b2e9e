"""Numerical kernels of the families: each takes and gives float64 that broadcast, tails as logarithms."""
