"""`python -m acceptance` is `acceptance`."""

from acceptance.cli import main

main()
