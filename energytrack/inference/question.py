"""What is asked of a log: which modification, what shift is worth knowing about, and how sure to be."""

from __future__ import annotations

from dataclasses import dataclass

from energytrack.errors import InferenceError
from energytrack.inference import rules
from energytrack.inference.results import Rule
from energytrack.logbook.checks import LARGEST_TARGET_PERCENT
from energytrack.logbook.quantities import SMALLEST


@dataclass(frozen=True)
class Question:
    """`target` is a ratio, such as 0.03; `modification` is empty when planning. Raises InferenceError out of range."""

    modification: str
    target: float
    alpha: float
    power: float
    covariates: tuple[str, ...] = ()
    rule: Rule = "every-look"
    reversible: bool = True  # the modification can be taken off again
    wait_days: float = 0.0  # from the log's last day until driving goes on

    def __post_init__(self) -> None:
        if not SMALLEST < 100 * self.target <= LARGEST_TARGET_PERCENT:
            asked = f"{100 * self.target:g}"
            raise InferenceError(f"the target must lie above 0 and at most at 50 percent, not {asked}: try 3")
        rules.check_rule(self.rule)
        rules.drift(self.rule, self.alpha, self.power)  # refuses a confidence or power outside its range

    @property
    def drift(self) -> float:
        """Standardised true shift that is found with the stated power once the information is complete."""
        return rules.drift(self.rule, self.alpha, self.power)

    @property
    def information(self) -> float:
        """Information at which a shift of the target size is found with the stated power."""
        return (self.drift / self.target) ** 2

    @property
    def has_end(self) -> bool:
        """Complete information closes the test."""
        return self.rule != "open-ended"
