"""Laws of a return over a horizon, one file a kind."""
