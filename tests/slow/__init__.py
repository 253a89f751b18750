"""Slow, independent versions of the engine: enumeration, a pair walk, a simulation."""
