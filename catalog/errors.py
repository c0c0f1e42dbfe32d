"""The one error that this package raises for what a user can mend."""


class CatalogError(Exception):
    """One line: which file, row and field, what is wrong, and how to mend it."""
