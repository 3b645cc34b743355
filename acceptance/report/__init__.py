"""The report: a record, drawn. Nothing that a verdict rests on is computed here."""
