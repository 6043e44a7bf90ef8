"""The session: the document, its ledger of steps, replay and store."""
