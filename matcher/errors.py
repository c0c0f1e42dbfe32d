"""The one error that this package raises for what a user can mend."""


class MatcherError(Exception):
    """One line: what is wrong with the input, and how to mend it."""
