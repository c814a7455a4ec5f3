"""The optimiser against enumeration; its verifier on its own."""
