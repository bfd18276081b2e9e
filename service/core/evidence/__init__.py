"""From data, and back to data: observed series, risk classes."""
