"""Answers: frozen records made from the layers below, one call each."""
