"""One tree of errors; each message names the thing, the value and the way out."""


class SitingError(Exception):
    """Root of the tree: catching this catches all of ours and nothing else."""


class InputError(SitingError):
    """An input file or value cannot be used as it is."""


class GridError(SitingError):
    """Two layers do not lie on the same grid, or a grid is impossible."""


class ConfigError(SitingError):
    """A setting is unknown, missing or out of its range."""


class CapacityError(SitingError):
    """Too little memory or disk for the work asked for."""


class OutputError(SitingError):
    """A result cannot be written."""


LONGEST_CLAUSE = 160


def one_line(error: BaseException) -> str:
    """Return what a library says in one short line: the last clause, for the first ones may repeat all that it was given."""
    lines = [line.strip() for line in str(error).splitlines() if line.strip()]
    text = lines[-1] if lines else type(error).__name__
    return text if len(text) <= LONGEST_CLAUSE else text.rpartition(": ")[2][-LONGEST_CLAUSE:]
