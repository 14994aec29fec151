"""Analysis on the maximal torus, in floating point: the route that is independent of the algebra."""
