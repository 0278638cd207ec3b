"""What is asked of a log: which modification, what shift is worth knowing about, and how sure to be."""

from __future__ import annotations

from dataclasses import dataclass

from energytrack.errors import InferenceError
from energytrack.inference import bounds


@dataclass(frozen=True)
class Question:
    """`target` is a ratio, such as 0.03; `modification` is empty when planning. Raises InferenceError out of range."""

    modification: str
    target: float
    alpha: float
    power: float
    covariates: tuple[str, ...] = ()
    reversible: bool = True  # the modification can be taken off again

    def __post_init__(self) -> None:
        if not 0 < self.target < 1:
            raise InferenceError(f"the target must lie between 0 and 100 percent, not {100 * self.target:g}: try 3")
        bounds.drift(self.alpha, self.power)  # refuses a confidence or power outside its range

    @property
    def information(self) -> float:
        """Information at which a shift of the target size is found with the stated power."""
        return (bounds.drift(self.alpha, self.power) / self.target) ** 2
