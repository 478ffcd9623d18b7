"""What a long run says while it works."""

import time
from collections.abc import Iterator
from contextlib import contextmanager


class Progress:
    """Counts the stages of a run and their seconds; silent unless a subclass shows them.

    Stages themselves never see it: only :mod:`sitescreen.screening` does, so that computing has no side effects.
    """

    def __init__(self) -> None:
        self.seconds: dict[str, float] = {}

    @contextmanager
    def step(self, text: str) -> Iterator[None]:
        """Time one stage; repeated stages of one name add up."""
        self.started(text)
        begun = time.perf_counter()
        try:
            yield
        finally:
            self.seconds[text] = self.seconds.get(text, 0.0) + time.perf_counter() - begun
            self.ended(text)

    def started(self, text: str) -> None:
        """Show that a stage begins."""

    def goes_on(self, text: str) -> None:
        """Show how far the present stage is."""

    def ended(self, text: str) -> None:
        """Show that a stage has ended."""
