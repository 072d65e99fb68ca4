"""The answers of a checker, as exceptions; reaching the end without one is "verified"."""


class Answer(Exception):
    """A certificate was not accepted: the kind of answer, the obligation that failed, and a few words."""

    status = 2
    word = "inconclusive"

    def __init__(self, obligation, why=""):
        super().__init__(obligation, why)
        self.obligation = obligation
        self.why = why

    def __str__(self):
        return f"{self.word} {self.obligation}" + (f": {self.why}" if self.why else "")


class Refuted(Answer):
    """Something is exactly false."""

    status = 1
    word = "refuted"


class Inconclusive(Answer):
    """Enclosures at this precision do not decide."""


class Limit(Answer):
    """A limit is exceeded."""

    word = "limit"


class Malformed(Answer):
    """The texts are not of the formats, or do not belong together."""

    status = 3
    word = "malformed"


class NotCovered(Answer):
    """The statement uses a part of the format that this checker has no rule for."""

    status = 4
    word = "not covered"


def ensure(condition, obligation, why=""):
    """Refutes unless an exact condition holds."""
    if not condition:
        raise Refuted(obligation, why)


def decide(condition, obligation, why=""):
    """Is inconclusive unless a condition on enclosures holds."""
    if not condition:
        raise Inconclusive(obligation, why)
