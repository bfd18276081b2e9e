"""URLs about the process itself: health and the document."""
