"""Likelihood of spectra and retention indices under each hypothesis."""
