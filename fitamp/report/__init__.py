"""Results as JSON, as tables for a terminal, and as files written whole or not at all."""
