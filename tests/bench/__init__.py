"""Benchmarks: plain scripts that print times, ratios and memory; nothing here is a timed test."""
