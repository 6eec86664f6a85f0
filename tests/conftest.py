"""Puts this folder on the path of the tests below it, for `checks`."""
