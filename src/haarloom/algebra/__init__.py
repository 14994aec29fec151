"""The exact station: SU(N), irreps, products and powers, class functions, Haar integrals. No floats."""
