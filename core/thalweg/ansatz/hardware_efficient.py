"""Hardware-efficient layered circuit: rotations on every qubit, then entangling gates, repeated."""

from __future__ import annotations

from typing import ClassVar, Literal

from thalweg.options import Options, option


class HardwareEfficient(Options):
    """Settings of the layered circuit (Kandala et al. 2017)."""

    title: ClassVar[str] = "Hardware-efficient layers"
    about: ClassVar[str] = "Short circuits; need not keep particle number or spin, and gradients vanish for deep ones (McClean et al. 2018)."

    key: Literal["hardware-efficient"] = "hardware-efficient"
    depth: int = option(3, "Depth", "Number of entangling layers.", ge=1, le=200)
    rotations: Literal["ry", "ry-rz"] = option("ry", "Rotations", "Rotation gates on every qubit in each layer.")
    entangler: Literal["line", "ring", "all-pairs"] = option("line", "Entangler", "Which pairs of qubits the controlled-Z gates of a layer join.")
    start: Literal["zero", "small-random", "uniform-random"] = option(
        "small-random", "Start", "Zero angles, normal angles of width 0.1, or uniform angles over the whole circle."
    )
