"""Electron density and collision frequency: layers, profiles, climatology."""
