"""Stage 5: what a chain should show: its ions and its retention index."""
