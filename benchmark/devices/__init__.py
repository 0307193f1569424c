"""Device models (layer 4): inputs -> ``Switch`` records. The registry loads a model on first use."""

from __future__ import annotations

import importlib

from benchmark.devices.model import DeviceModel

__all__ = ["MODEL_NAMES", "model"]

_MODULES = {
    "given": "benchmark.devices.given",
    "virtual-source": "benchmark.devices.virtual_source",
    "stress-gated": "benchmark.devices.stress_gated",
    "steep-swing": "benchmark.devices.steep_swing",
    "table": "benchmark.devices.table",
    "stage-table": "benchmark.devices.stage_table",
}

MODEL_NAMES: tuple[str, ...] = tuple(_MODULES)


def model(name: str) -> DeviceModel:
    """Return the registered model; ``KeyError`` for an unknown name (the file layer reports it by file and line)."""
    return importlib.import_module(_MODULES[name]).MODEL  # type: ignore[no-any-return]
