"""The exact station: SU(N), its irreps, their products and powers, class functions and Haar integrals. No floats."""
