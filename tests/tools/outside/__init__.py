"""Checks of the program's results against what others published or computed."""
