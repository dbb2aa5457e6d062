"""Text into model: quantities, formulas, equations, portions, case files, the rule language."""
