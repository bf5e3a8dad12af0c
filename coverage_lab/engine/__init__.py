"""The engine: measures methods under a design by two routes. It never asks which method or design it holds."""
