"""JSON to core objects and back."""
