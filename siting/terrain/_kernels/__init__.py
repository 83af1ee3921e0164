"""Loops over cells: arrays in, arrays out; the callers have checked everything."""
