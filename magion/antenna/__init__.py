"""The antenna: element patterns over ground, feed network, response to each hand."""
