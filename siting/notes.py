"""What a run says besides its numbers: what was assumed, and what to beware of."""

from dataclasses import dataclass, field


@dataclass(frozen=True, slots=True)
class Assumption:
    """
    A value that the user did not give.

    `id` is stable (`section.key` for a setting, a plain name otherwise), `value` is
    text as shown, `source` says where the value comes from, `effect` what it moves.
    """

    id: str
    value: str
    unit: str
    source: str
    effect: str


@dataclass(frozen=True, slots=True)
class Warned:
    """Something that the user should know before acting: a stable code and a sentence."""

    code: str
    text: str


@dataclass(slots=True)
class Notes:
    """The notebook that a run carries through its stages; the order of entry is kept."""

    assumptions: list[Assumption] = field(default_factory=list)
    warnings: list[Warned] = field(default_factory=list)

    def assume(self, id: str, value: object, unit: str, source: str, effect: str) -> None:
        """Note an assumption once; the same id noted again replaces the first."""
        new = Assumption(id, str(value), unit, source, effect)
        for place, old in enumerate(self.assumptions):
            if old.id == id:
                self.assumptions[place] = new
                return
        self.assumptions.append(new)

    def warn(self, code: str, text: str) -> None:
        """Note a warning; the same code and text are noted once."""
        new = Warned(code, text)
        if new not in self.warnings:
            self.warnings.append(new)
