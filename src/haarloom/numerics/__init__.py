"""From the exact transfer matrix to numbers: solvers, bounds, proofs, series, scans."""
