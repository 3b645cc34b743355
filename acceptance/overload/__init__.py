"""How an output behaves beyond its rated load: steps, onset, bursts, returns. Nothing is held to a limit here."""
