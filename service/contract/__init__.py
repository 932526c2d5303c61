"""Requests, results and problems: the only words the outside hears."""
