"""One module a characteristic: points and a requirement in, a result that is not yet a verdict out."""
