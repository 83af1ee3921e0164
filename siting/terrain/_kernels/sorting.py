"""Sorting without comparisons."""

import numpy as np

from siting.terrain._kernels.jit import kernel

DIGIT_BITS, DIGITS = 11, 3
"""A key of 32 bits is sorted by three digits: their counts stay in the nearest cache."""


@kernel
def ascending(height):
    """Return the places of 32-bit heights, none NaN, from the lowest up; equals stay in order (radix sort)."""
    size = height.size
    bits = height.view(np.uint32)
    keys, other_keys = np.empty(size, np.uint32), np.empty(size, np.uint32)
    order, other_order = np.empty(size, np.int32), np.empty(size, np.int32)
    start = np.zeros((DIGITS, 1 << DIGIT_BITS), np.int64)
    for place in range(size):
        # heights below zero descend with their bits, those above ascend: turned so that all ascend
        flip = np.uint32(0xFFFFFFFF) if bits[place] >> 31 else np.uint32(0x80000000)
        keys[place], order[place] = bits[place] ^ flip, place
        for digit in range(DIGITS):
            start[digit, (keys[place] >> (DIGIT_BITS * digit)) & ((1 << DIGIT_BITS) - 1)] += 1
    for digit in range(DIGITS):
        first = 0
        for value in range(1 << DIGIT_BITS):
            count = start[digit, value]
            start[digit, value] = first
            first += count
        for place in range(size):
            value = (keys[place] >> (DIGIT_BITS * digit)) & ((1 << DIGIT_BITS) - 1)
            to = start[digit, value]
            start[digit, value] = to + 1
            other_keys[to], other_order[to] = keys[place], order[place]
        keys, other_keys = other_keys, keys
        order, other_order = other_order, order
    return order
