"""How much a plan may make the service compute."""

from dataclasses import dataclass

from service.core.errors import DoesNotFit, Refusal

MOST_WORK = 1.2e9
"""Products of a weight and a mass in one question: about two seconds."""
LARGEST_BLOCK = 1.5e7
"""Weights of one step that are held at a time."""
EACH_STEP = 20_000
"""What a step costs beside its products, in products."""


@dataclass
class Work:
    """Counts products, and refuses a question before it takes too long."""

    done: float = 0.0

    def step(self) -> None:
        """Count what a step costs beside its products. Raises DoesNotFit."""
        self.add(EACH_STEP)

    def block(self, rows: int, columns: int) -> None:
        """Count a block of weights before it is made. Raises DoesNotFit, also where it would fill the memory."""
        products = 4.0 * rows * columns
        self.add(products if products <= 4 * LARGEST_BLOCK else MOST_WORK + products)

    def add(self, products: float) -> None:
        """Count what is about to be computed. Raises DoesNotFit."""
        self.done += products
        if self.done > MOST_WORK:
            detail = (
                "The plan takes too long to compute. A shorter horizon, fewer dates with cash flows, or a volatility "
                "that does not fall to nearly nothing make it smaller."
            )
            params = {"work": self.done, "limit": MOST_WORK}
            raise DoesNotFit([Refusal(("horizon_years",), "too_much_work", detail, params)])
