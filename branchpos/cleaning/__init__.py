"""From a spectrum as recorded to intensities on whole mass numbers."""
