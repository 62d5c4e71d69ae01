"""Measured rates and product shares that the mechanism model is calibrated on, and the anchors it is judged by."""
