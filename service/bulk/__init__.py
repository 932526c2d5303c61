"""Many lasers at once: batches, streams of records, columns."""
