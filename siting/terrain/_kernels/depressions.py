"""Patches of raised cells: the depressions of the ground."""

from siting.terrain._kernels.direction import STEP_COL, STEP_ROW
from siting.terrain._kernels.jit import kernel


@kernel
def label_patches(mask, label, stack):
    """Label the 8-connected patches of a mask from 1 in row order; return how many."""
    rows, cols = mask.shape
    count = 0
    for row in range(rows):
        for col in range(cols):
            if not mask[row, col] or label[row, col] != 0:
                continue
            count += 1
            label[row, col] = count
            stack[0], depth = row * cols + col, 1
            while depth > 0:
                depth -= 1
                here_row, here_col = stack[depth] // cols, stack[depth] % cols
                for code in range(1, 9):
                    to_row, to_col = here_row + STEP_ROW[code], here_col + STEP_COL[code]
                    if to_row < 0 or to_col < 0 or to_row >= rows or to_col >= cols:
                        continue
                    if mask[to_row, to_col] and label[to_row, to_col] == 0:
                        label[to_row, to_col] = count
                        stack[depth] = to_row * cols + to_col
                        depth += 1
    return count


@kernel
def measure_patches(label, filled, elevation, direction, area_by_row, area, volume, depth, bottom, spill):
    """Sum area and volume of each patch, its greatest depth, its first lowest cell, and where it would spill."""
    rows, cols = label.shape
    for row in range(rows):
        for col in range(cols):
            patch = label[row, col]
            if patch == 0:
                continue
            below = filled[row, col] - elevation[row, col]
            area[patch] += area_by_row[row]
            volume[patch] += below * area_by_row[row]
            depth[patch] = max(depth[patch], below)
            lowest = bottom[patch]
            if lowest < 0 or elevation[row, col] < elevation[lowest // cols, lowest % cols]:
                bottom[patch] = row * cols + col
            code = direction[row, col]
            if code <= 8:
                to_row, to_col = row + STEP_ROW[code], col + STEP_COL[code]
                if label[to_row, to_col] != patch and spill[patch] < 0:
                    spill[patch] = to_row * cols + to_col
