"""Log files in, a `BenchLog` out."""
