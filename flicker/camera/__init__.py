"""Cameras: what they record of a light, and what to dial in."""

from flicker.camera.bands import Prediction, predict_bands
from flicker.camera.sensor import Camera

__all__ = ["Camera", "Prediction", "predict_bands"]
