"""The one complaint about a condition: where, what was found, what was expected."""


class ConditionError(ValueError):
    """A condition that cannot be used. `column` counts from 1 within the condition's text."""

    def __init__(self, message: str, column: int, *, found: str = "", expected: str = "", nearest: str = "") -> None:
        self.message = message
        self.column = column
        self.found = found
        self.expected = expected
        self.nearest = nearest
        super().__init__(f"column {column}: {message}")
