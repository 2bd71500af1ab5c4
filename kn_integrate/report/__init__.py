"""How results are shown: as text, as plain JSON-ready data, as a table, with their sources and versions."""
