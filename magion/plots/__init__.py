"""Records as figures; the only layer that knows matplotlib."""
