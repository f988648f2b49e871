"""Reports: sentences and JSON from snags, retimings and runs."""
