"""
Flicker of backlights and lamps: measured, judged, and predicted for a camera.

The public names load on first use, so that importing the package stays light.
"""

from __future__ import annotations

import importlib
from typing import Any

__version__ = "0.1.0"

_HOMES = {
    "Camera": "flicker.camera",
    "Capture": "flicker.trace",
    "FlickerError": "flicker.errors",
    "InputError": "flicker.errors",
    "Light": "flicker.light",
    "Measure": "flicker.results",
    "NotMeasurable": "flicker.errors",
    "Report": "flicker.reports",
    "Trace": "flicker.trace",
    "UnreadableFileError": "flicker.errors",
    "check": "flicker.analysis",
    "measure": "flicker.analysis",
    "predict_bands": "flicker.camera",
    "pwm_light": "flicker.light",
    "read": "flicker.analysis",
    "same_light": "flicker.analysis",
}

__all__ = [*_HOMES, "__version__"]


def __getattr__(name: str) -> Any:
    if name in _HOMES:
        return getattr(importlib.import_module(_HOMES[name]), name)
    raise AttributeError(f"module 'flicker' has no attribute '{name}'")


def __dir__() -> list[str]:
    return sorted(__all__)
