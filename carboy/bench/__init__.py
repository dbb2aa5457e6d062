"""Walks a plan step by step: what the portions hold, and how the vessels change."""
