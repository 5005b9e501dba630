"""Places methyl branches on long saturated chains from GC-EI mass spectra and retention indices."""

__version__ = "0.1.0"
