"""HTTP: the only part that knows Flask and gunicorn."""
