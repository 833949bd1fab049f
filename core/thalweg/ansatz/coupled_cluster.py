"""Unitary coupled cluster with singles and doubles in product (Trotter) form."""

from __future__ import annotations

from typing import ClassVar, Literal

from thalweg.options import Options, option


class UCCSD(Options):
    """Settings of the UCCSD product (source of the form: Bartlett et al. 1989; Peruzzo et al. 2014)."""

    title: ClassVar[str] = "UCCSD"
    about: ClassVar[str] = "Accurate near equilibrium; fails where several determinants share the weight, as in broken bonds (Peruzzo et al. 2014)."

    key: Literal["uccsd"] = "uccsd"
    order: Literal["doubles-first", "singles-first"] = option(
        "doubles-first", "Factor order", "Which factors act on the reference first; the energy depends on it."
    )
    spin_tied: bool = option(False, "Spin-tied amplitudes", "Give mirror-image alpha and beta excitations one shared amplitude.")
    point_group: bool = option(True, "Point group", "Keep only totally symmetric excitations.")
    start: Literal["zero", "mp2"] = option("zero", "Start", "Start from zero or from MP2 amplitudes.")
