"""carboy: vets the mixing and treatment of laboratory chemical waste before a cap is opened."""

__version__ = "0.1.0"
