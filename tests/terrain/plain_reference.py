"""The definition of fill, direction and area, written slowly and plainly, for tests to compare with."""

import heapq

import numpy as np
import numpy.typing as npt

STEPS = ((0, 1), (1, 1), (1, 0), (1, -1), (0, -1), (-1, -1), (-1, 0), (-1, 1))  # E SE S SW W NW N NE
FLAT_STEPS = (0, 2, 4, 6, 1, 3, 5, 7)  # E S W N SE SW NW NE

Cell = tuple[int, int]


class Plain:
    """Fill, direct and accumulate one small raster."""

    def __init__(self, z: npt.NDArray[np.float32], sinks: npt.NDArray[np.bool_], width: float, height: float) -> None:
        self.z = z + np.float32(0)
        self.z[~np.isfinite(self.z)] = np.nan
        self.sinks = sinks
        self.inverse = [np.float32(1.0 / np.hypot(step[1] * width, step[0] * height)) for step in STEPS]
        self.filled = self.fill()
        self.direction = self.directions()

    def cells(self) -> list[Cell]:
        rows, cols = self.z.shape
        return [(r, c) for r in range(rows) for c in range(cols) if not np.isnan(self.z[r, c])]

    def neighbour(self, cell: Cell, step: int) -> Cell | None:
        """Return the valid neighbour in a direction, or None where there is a void."""
        row, col = cell[0] + STEPS[step][0], cell[1] + STEPS[step][1]
        rows, cols = self.z.shape
        if not (0 <= row < rows and 0 <= col < cols) or np.isnan(self.z[row, col]):
            return None
        return (row, col)

    def neighbours(self, cell: Cell) -> list[Cell]:
        found = (self.neighbour(cell, step) for step in range(8))
        return [one for one in found if one is not None]

    def is_outlet(self, cell: Cell) -> bool:
        return len(self.neighbours(cell)) < 8

    def fill(self) -> npt.NDArray[np.float32]:
        filled = np.full_like(self.z, np.nan)
        heap: list[tuple[float, Cell]] = []
        for cell in self.cells():
            if self.is_outlet(cell) or self.sinks[cell]:
                filled[cell] = self.z[cell]
                heapq.heappush(heap, (float(filled[cell]), cell))
        while heap:
            level, cell = heapq.heappop(heap)
            for other in self.neighbours(cell):
                if np.isnan(filled[other]):
                    filled[other] = max(self.z[other], np.float32(level))
                    heapq.heappush(heap, (float(filled[other]), other))
        return filled

    def directions(self) -> npt.NDArray[np.uint8]:
        direction = np.full(self.z.shape, 255, dtype=np.uint8)
        flats = set()
        for cell in self.cells():
            direction[cell] = self.steepest(cell)
            if direction[cell] == 0:
                flats.add(cell)
        toward = self.steps(flats, lambda c, n: self.filled[n] == self.filled[c] and n not in flats)
        away = self.steps(flats, lambda c, n: self.filled[n] > self.filled[c])
        for cell in flats:
            best, code = np.inf, 0
            for step in FLAT_STEPS:
                other = self.neighbour(cell, step)
                if other is None or self.filled[other] != self.filled[cell]:
                    continue
                value = 2.0 * toward[other] - away.get(other, 0) if other in flats else -np.inf
                if code == 0 or value < best:
                    best, code = value, step + 1
            direction[cell] = code
        return direction

    def steepest(self, cell: Cell) -> int:
        if self.sinks[cell]:
            return 10
        best, code = np.float32(0), 0
        for step in range(8):
            other = self.neighbour(cell, step)
            if other is None:
                continue
            fall = np.float32((self.filled[cell] - self.filled[other]) * self.inverse[step])
            if fall > best:
                best, code = fall, step + 1
        if code == 0 and self.is_outlet(cell):
            return 9
        return code

    def steps(self, flats: set[Cell], is_seed) -> dict[Cell, int]:  # type: ignore[no-untyped-def]
        front = [c for c in flats if any(is_seed(c, n) for n in self.neighbours(c))]
        found = dict.fromkeys(front, 1)
        while front:
            ahead = []
            for cell in front:
                for other in self.neighbours(cell):
                    if other in flats and other not in found:
                        found[other] = found[cell] + 1
                        ahead.append(other)
            front = ahead
        return found

    def area(self, weight: float) -> npt.NDArray[np.float64]:
        """Walk down from every cell, adding its weight to all cells below."""
        total = np.where(np.isnan(self.z), np.nan, 0.0)
        for start in self.cells():
            cell = start
            for _ in range(self.z.size + 1):
                total[cell] += weight
                code = int(self.direction[cell])
                if code > 8:
                    break
                cell = (cell[0] + STEPS[code - 1][0], cell[1] + STEPS[code - 1][1])
            else:
                msg = f"a cycle through {start}"
                raise AssertionError(msg)
        return total

    def multiple_flow(self, own: float, width: float, height: float) -> npt.NDArray[np.float64]:
        """Share each cell's water by fall, distance and contour length, from the highest cells down."""
        size = np.sqrt(width * height)
        distance = [float(np.hypot(step[1] * width, step[0] * height)) for step in STEPS]
        contour = [(0.5 if 0 in step else 0.354) * size for step in STEPS]
        total = np.where(np.isnan(self.z), np.nan, own)
        done: set[Cell] = set()
        givers = {cell: self.gives(cell) for cell in self.cells()}
        waiting = {cell: sum(cell in to.values() for to in givers.values()) for cell in self.cells()}
        while len(done) < len(waiting):
            for cell in [one for one, count in waiting.items() if count == 0 and one not in done]:
                done.add(cell)
                weight = {step: 1.0 for step in givers[cell]}
                if len(weight) > 1 or self.falls(cell):
                    weight = {
                        step: float(self.filled[cell] - self.filled[to]) / distance[step] * contour[step]
                        for step, to in givers[cell].items()
                    }
                for step, to in givers[cell].items():
                    total[to] += total[cell] * weight[step] / sum(weight.values())
                    waiting[to] -= 1
        return total

    def falls(self, cell: Cell) -> bool:
        return any(self.filled[other] < self.filled[cell] for other in self.neighbours(cell))

    def gives(self, cell: Cell) -> dict[int, Cell]:
        """Return the receivers of a cell by direction: all lower neighbours, else the one its direction names."""
        code = int(self.direction[cell])
        if code > 8:
            return {}
        around = {step: other for step in range(8) if (other := self.neighbour(cell, step)) is not None}
        if self.falls(cell):
            return {step: other for step, other in around.items() if self.filled[other] < self.filled[cell]}
        return {code - 1: around[code - 1]}
