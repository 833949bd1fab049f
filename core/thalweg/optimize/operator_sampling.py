"""Random operator sampling (Arrasmith, Cincio, Somma and Coles 2020)."""

from __future__ import annotations

from typing import ClassVar, Literal

from thalweg.optimize.icans import ICANS


class OperatorSampling(ICANS):
    """The shots of `ICANS`, each sent to a measurement set drawn with the probability sum |c| of the set over that of all.

    With sets of single terms these are the weights |c_i| of the paper. The estimate stays unbiased with fewer shots than sets.
    """

    title: ClassVar[str] = "Random operator sampling"
    about: ClassVar[str] = "iCANS with terms drawn by weight, so that very few shots suffice far from the minimum (Arrasmith et al. 2020)."
    random_terms: ClassVar[bool] = True

    key: Literal["operator-sampling"] = "operator-sampling"  # type: ignore[assignment]
