"""Spin-1/2 models on any lattice."""

from __future__ import annotations

from typing import ClassVar, Literal

import numpy as np

from thalweg.errors import StudyError
from thalweg.operators.pauli import PauliExpansion
from thalweg.options import option
from thalweg.systems.lattice_graph import LatticeGraph
from thalweg.systems.spin_model import OPERATORS_HELP, SIGN_HELP, ExchangeModel, Operators, Sign, need_bonds, number, signed_sum
from thalweg.systems.spin_terms import SpinTerms


class Ising(ExchangeModel):
    title: ClassVar[str] = "Ising"
    about: ClassVar[str] = "Ising couplings with a transverse and a longitudinal field (Pfeuty 1970 for the chain)."
    usual_reference: ClassVar[str] = "plus"
    also_called: ClassVar[dict[str, str]] = {"field": "transverse", "h": "transverse"}

    key: Literal["ising"] = "ising"
    j: float = option(1.0, "J", "Coupling of neighbours along z.", unit="J")
    transverse: float = option(1.0, "Transverse field h", "Field along x: the term -h sum X.", unit="J")
    longitudinal: float = option(0.0, "Longitudinal field g", "Field along z: the term -g sum Z.", unit="J")
    operators: Operators = option("sigma.sigma", "Operators", OPERATORS_HELP)
    sign: Sign = option("-", "Sign of J", SIGN_HELP)

    def on_graph(self, graph: LatticeGraph) -> PauliExpansion:
        need_bonds(graph)
        terms = SpinTerms(graph.n_sites)
        for bond in graph.first_bonds:
            terms.pair("Z", bond.first, bond.second, self.bond_factor * self.j * bond.weight)
        self.add_field(terms, "X", self.transverse)
        self.add_field(terms, "Z", self.longitudinal)
        return terms.expansion()

    def convention(self) -> str:
        fields = f" - h sum_i {self.symbol('x')}_i - g sum_i {self.symbol('z')}_i"
        values = f"J = {number(self.j)}, h = {number(self.transverse)}, g = {number(self.longitudinal)}"
        return f"{signed_sum(self.sign, 'J', self.product('z'))}{fields}; {values}; {self.meaning()}"

    def main_coupling(self) -> float:
        return self.j


class XY(ExchangeModel):
    title: ClassVar[str] = "XY"
    about: ClassVar[str] = "Couplings in the plane, with anisotropy and a field along z (Lieb, Schultz, Mattis 1961)."

    key: Literal["xy"] = "xy"
    j: float = option(1.0, "J", "Coupling of neighbours in the plane.", unit="J")
    anisotropy: float = option(0.0, "Anisotropy gamma", "0 is the isotropic (XX) model, 1 couples x alone.", ge=-1, le=1)
    field: float = option(0.0, "Field h", "Field along z: the term -h sum S^z.", unit="J")

    def on_graph(self, graph: LatticeGraph) -> PauliExpansion:
        need_bonds(graph)
        terms = SpinTerms(graph.n_sites)
        for bond in graph.first_bonds:
            c = self.bond_factor * self.j * bond.weight
            terms.exchange(bond.first, bond.second, c * (1 + self.anisotropy), c * (1 - self.anisotropy), 0.0)
        self.add_field(terms, "Z", self.field)
        return terms.expansion()

    def convention(self) -> str:
        body = f"[(1 + gamma) {self.product('x')} + (1 - gamma) {self.product('y')}]"
        values = f"J = {number(self.j)}, gamma = {number(self.anisotropy)}, h = {number(self.field)}"
        return f"{signed_sum(self.sign, 'J', body)} - h sum_i {self.symbol('z')}_i; {values}; {self.meaning()}"

    def main_coupling(self) -> float:
        return self.j


class XXZ(ExchangeModel):
    title: ClassVar[str] = "XXZ"
    about: ClassVar[str] = "Heisenberg couplings with an anisotropy along z; conserves S_z."

    key: Literal["xxz"] = "xxz"
    j: float = option(1.0, "J", "Coupling of neighbours in the plane.", unit="J")
    delta: float = option(1.0, "Anisotropy Delta", "Coupling along z relative to the plane.")
    field: float = option(0.0, "Field h", "Field along z: the term -h sum S^z.", unit="J")

    def on_graph(self, graph: LatticeGraph) -> PauliExpansion:
        need_bonds(graph)
        terms = SpinTerms(graph.n_sites)
        for bond in graph.first_bonds:
            c = self.bond_factor * self.j * bond.weight
            terms.exchange(bond.first, bond.second, c, c, c * self.delta)
        self.add_field(terms, "Z", self.field)
        return terms.expansion()

    def convention(self) -> str:
        body = f"[{self.product('x')} + {self.product('y')} + Delta {self.product('z')}]"
        values = f"J = {number(self.j)}, Delta = {number(self.delta)}, h = {number(self.field)}"
        return f"{signed_sum(self.sign, 'J', body)} - h sum_i {self.symbol('z')}_i; {values}; {self.meaning()}"

    def main_coupling(self) -> float:
        return self.j


class Heisenberg(ExchangeModel):
    title: ClassVar[str] = "Heisenberg"
    about: ClassVar[str] = "Isotropic exchange of neighbours; conserves the total spin."

    key: Literal["heisenberg"] = "heisenberg"
    j: float = option(1.0, "J", "Coupling of neighbours.", unit="J")
    field: float = option(0.0, "Field h", "Field along z: the term -h sum S^z.", unit="J")

    def on_graph(self, graph: LatticeGraph) -> PauliExpansion:
        need_bonds(graph)
        terms = SpinTerms(graph.n_sites)
        for bond in graph.first_bonds:
            c = self.bond_factor * self.j * bond.weight
            terms.exchange(bond.first, bond.second, c, c, c)
        self.add_field(terms, "Z", self.field)
        return terms.expansion()

    def convention(self) -> str:
        values = f"J = {number(self.j)}, h = {number(self.field)}"
        return f"{signed_sum(self.sign, 'J', self.product())} - h sum_i {self.symbol('z')}_i; {values}; {self.meaning()}"

    def main_coupling(self) -> float:
        return self.j


class J1J2(ExchangeModel):
    title: ClassVar[str] = "J1-J2"
    about: ClassVar[str] = "Isotropic exchange of nearest and second neighbours, which compete (Majumdar and Ghosh 1969 for the chain)."
    uses_second: ClassVar[bool] = True

    key: Literal["j1-j2"] = "j1-j2"
    j1: float = option(1.0, "J1", "Coupling of nearest neighbours.", unit="J1")
    j2: float = option(0.5, "J2", "Coupling of second neighbours.", unit="J1")
    field: float = option(0.0, "Field h", "Field along z: the term -h sum S^z.", unit="J1")
    unit_name: ClassVar[str] = "J1"

    def on_graph(self, graph: LatticeGraph) -> PauliExpansion:
        need_bonds(graph)
        if self.j2 and not graph.second_bonds:
            raise StudyError(
                "J2 has no bonds", f"{graph.name} has no bond of class `second`", "Choose another lattice, or list bonds of class `second`", "lattice"
            )
        terms = SpinTerms(graph.n_sites)
        for coupling, bonds in ((self.j1, graph.first_bonds), (self.j2, graph.second_bonds)):
            for bond in bonds:
                c = self.bond_factor * coupling * bond.weight
                terms.exchange(bond.first, bond.second, c, c, c)
        self.add_field(terms, "Z", self.field)
        return terms.expansion()

    def convention(self) -> str:
        sign = "" if self.sign == "+" else "-"
        body = f"H = {sign}J1 sum_<ij> {self.product()} {self.sign} J2 sum_<<ij>> {self.product()} - h sum_i {self.symbol('z')}_i"
        values = f"J1 = {number(self.j1)}, J2 = {number(self.j2)}, h = {number(self.field)}"
        return f"{body}; {values}; {self.meaning()}"

    def main_coupling(self) -> float:
        return self.j1


class Kitaev(ExchangeModel):
    title: ClassVar[str] = "Kitaev"
    about: ClassVar[str] = "Each bond couples the one axis of its class x, y or z (Kitaev 2006); a Heisenberg term may be added."
    usual_reference: ClassVar[str] = "up"

    key: Literal["kitaev"] = "kitaev"
    jx: float = option(1.0, "Jx", "Coupling on bonds of class x.", unit="J")
    jy: float = option(1.0, "Jy", "Coupling on bonds of class y.", unit="J")
    jz: float = option(1.0, "Jz", "Coupling on bonds of class z.", unit="J")
    heisenberg: float = option(0.0, "Heisenberg J", "Isotropic coupling added on every bond.", unit="J")
    field: float = option(0.0, "Field h", "Field along (1,1,1): the term -h sum (X + Y + Z) / sqrt 3.", unit="J")
    operators: Operators = option("sigma.sigma", "Operators", OPERATORS_HELP)
    sign: Sign = option("-", "Sign of J", SIGN_HELP)

    def on_graph(self, graph: LatticeGraph) -> PauliExpansion:
        need_bonds(graph)
        strength = {"x": self.jx, "y": self.jy, "z": self.jz}
        strangers = {b.kind for b in graph.first_bonds} - set(strength)
        if strangers:
            raise StudyError(
                "The Kitaev model does not fit this lattice",
                f"{graph.name} has bonds of class {', '.join(sorted(strangers))}",
                "Choose the honeycomb lattice, or a bond list with classes x, y and z",
                "lattice",
            )
        terms = SpinTerms(graph.n_sites)
        for bond in graph.first_bonds:
            c = self.bond_factor * bond.weight
            terms.pair(bond.kind.upper(), bond.first, bond.second, c * strength[bond.kind])
            terms.exchange(bond.first, bond.second, *(c * self.heisenberg,) * 3)
        for axis in "XYZ":
            self.add_field(terms, axis, self.field / np.sqrt(3.0))
        return terms.expansion()

    def convention(self) -> str:
        sign = "" if self.sign == "+" else "-"
        body = (
            f"H = {sign}sum_<ij> [J_a {self.symbol('a')}_i {self.symbol('a')}_j + J {self.product()}] - h sum_i ({self.symbol()}_i.(1,1,1)) / sqrt 3"
        )
        values = f"a = class of the bond, J_x = {number(self.jx)}, J_y = {number(self.jy)}, J_z = {number(self.jz)}"
        return f"{body}; {values}, J = {number(self.heisenberg)}, h = {number(self.field)}; {self.meaning()}"

    def main_coupling(self) -> float:
        return self.jz


class RandomCouplings(ExchangeModel):
    title: ClassVar[str] = "Random couplings and fields"
    about: ClassVar[str] = "Couplings and fields drawn with a seed: spin glasses (Edwards and Anderson 1975), random-field chains."

    key: Literal["random"] = "random"
    interaction: Literal["zz", "xx+yy", "heisenberg"] = option("heisenberg", "Interaction", "What a bond couples.")
    distribution: Literal["uniform", "normal", "two-valued"] = option(
        "uniform", "Distribution", "`uniform` on mean +- spread, `normal` with the spread as standard deviation, or mean +- spread at even odds."
    )
    j: float = option(1.0, "J", "Mean coupling.", unit="J")
    j_spread: float = option(0.5, "Spread of J", "Spread of the couplings.", unit="J", ge=0)
    field: float = option(0.0, "Field h", "Mean field: the term -h sum S^axis.", unit="J")
    field_spread: float = option(0.0, "Spread of h", "Spread of the fields.", unit="J", ge=0)
    field_axis: Literal["x", "z"] = option("z", "Field axis", "Direction of the fields.")
    seed: int = option(1, "Seed", "Seed of the draw: couplings in the order of the bonds, then fields in the order of the sites.", ge=0, le=2**31 - 1)

    def on_graph(self, graph: LatticeGraph) -> PauliExpansion:
        need_bonds(graph)
        rng = np.random.default_rng(self.seed)
        terms = SpinTerms(graph.n_sites)
        in_plane, along = {"zz": (0.0, 1.0), "xx+yy": (1.0, 0.0), "heisenberg": (1.0, 1.0)}[self.interaction]
        for bond, j in zip(graph.first_bonds, self._draw(rng, self.j, self.j_spread, len(graph.first_bonds)), strict=True):
            c = self.bond_factor * float(j) * bond.weight
            terms.exchange(bond.first, bond.second, c * in_plane, c * in_plane, c * along)
        for site, h in enumerate(self._draw(rng, self.field, self.field_spread, graph.n_sites)):
            terms.site(self.field_axis.upper(), site, -float(h) * self.site_factor)
        return terms.expansion()

    def _draw(self, rng: np.random.Generator, mean: float, spread: float, count: int) -> np.ndarray:
        if self.distribution == "uniform":
            return mean + spread * rng.uniform(-1.0, 1.0, count)
        if self.distribution == "normal":
            return rng.normal(mean, spread, count)
        return mean + spread * rng.choice([-1.0, 1.0], count)

    def convention(self) -> str:
        body = {"zz": self.product("z"), "xx+yy": f"({self.product('x')} + {self.product('y')})", "heisenberg": self.product()}[self.interaction]
        sign = "" if self.sign == "+" else "-"
        values = f"J = {number(self.j)} +- {number(self.j_spread)}, h = {number(self.field)} +- {number(self.field_spread)}"
        formula = f"H = {sign}sum_<ij> J_ij {body} - sum_i h_i {self.symbol(self.field_axis)}_i"
        return f"{formula}; {self.distribution}, {values}, seed {self.seed}; {self.meaning()}"

    def main_coupling(self) -> float:
        return self.j
