"""How a unit warms up and cools down: curves, soaks, settling, windings. Nothing is held against a limit here."""
