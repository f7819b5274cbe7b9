"""Files that magion reads: parsing with line numbers."""
