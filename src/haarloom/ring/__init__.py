"""The ring station: basis, ring model, symbolic transfer matrix, derivations."""
