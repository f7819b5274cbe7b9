"""Records to text, JSON and CSV."""
