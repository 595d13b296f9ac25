"""Plant -> results: pure functions on immutable data, numbers only, no text for people."""
