"""Stage 9: results as JSON, console text and figures."""
