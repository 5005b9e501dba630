"""From likelihoods to a verdict: posterior, credible set, the call or why there is none."""
