"""Loops over cells of plots, compiled: arrays in, arrays out; the callers check."""
