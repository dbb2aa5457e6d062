"""From what happened to what it means: magnitudes, limits, severity, moment."""
