"""The Bayesian engine: evidence, walks, thresholds, networks, display histories, playing rules.

It knows nothing of case files, rule forms or sheets and imports nothing of them.
"""
