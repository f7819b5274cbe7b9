"""Rays of both waves: equations, batch integrator, homing on the receiver."""
