"""Aqueous chemistry in numbers: equilibrium, activity, gases."""
