"""Numbers only: numpy and scipy.special. Nothing here knows of HTTP, JSON, clocks, logs or the environment."""
