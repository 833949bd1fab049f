"""Tables and bond figures of a state on its lattice, the trial state beside the exact one."""

from __future__ import annotations

from collections.abc import Sequence

from thalweg.errors import StudyError
from thalweg.study.result import StudyResult
from thalweg.systems import LatticeModel
from thalweg.systems.lattice_graph import SECOND, LatticeGraph
from thalweg_app.presenters import wording
from thalweg_app.presenters.tables import Table

#: What can be listed of a state on its lattice.
LISTS = {"weights": "Leading weights", "correlations": "Spin correlations", "structure": "Structure factor", "sites": "Sites"}


def graph_of(result: StudyResult) -> LatticeGraph | None:
    """The lattice that the result is of."""
    system = result.spec.system
    if not isinstance(system, LatticeModel):
        return None
    try:
        return system.graph()
    except StudyError:
        return None


def coupled_kinds(system: LatticeModel, graph: LatticeGraph) -> tuple[str, ...]:
    """Classes of bonds that the model couples."""
    uses_second = getattr(system.model, "uses_second", False)
    return tuple(kind for kind in graph.bonds_per_class() if uses_second or kind != SECOND)


def lists_of(result: StudyResult | None) -> list[str]:
    """Keys of LISTS that hold something."""
    sites = None if result is None else result.sites
    if sites is None:
        return ["weights"]
    spins = ["correlations", "structure"] if sites.spin_correlations else []
    return ["weights", *spins, "sites"]


def sites_table_of(result: StudyResult, key: str) -> Table:
    """The table named by a key of LISTS other than `weights`."""
    return {"correlations": _correlations, "structure": _structure, "sites": _sites}[key](result)


def bond_correlations(result: StudyResult) -> dict[tuple[int, int], float]:
    """<S_i.S_j> of the trial state on every bond that the model couples."""
    graph, sites = graph_of(result), result.sites
    if graph is None or sites is None or not sites.spin_correlations:
        return {}
    system = result.spec.system
    assert isinstance(system, LatticeModel)
    kinds = coupled_kinds(system, graph)
    return {(b.first, b.second): sites.spin_correlations[b.first][b.second] for b in graph.bonds if b.kind in kinds}


def site_values(result: StudyResult) -> tuple[float, ...]:
    """Magnetisation of spins, double occupancy of electrons."""
    return () if result.sites is None else result.sites.magnetisation or result.sites.double_occupancy


def _correlations(result: StudyResult) -> Table:
    graph, mine, exact = graph_of(result), result.sites, result.exact_sites
    assert mine is not None
    rows: list[tuple[str, ...]] = []
    keys: list[tuple[float | str, ...]] = []
    n = len(mine.spin_correlations)
    kinds = {} if graph is None else {(b.first, b.second): b.kind for b in graph.bonds}
    for i in range(n):
        for j in range(i + 1, n):
            names = (str(i), str(j)) if graph is None else (graph.site_name(i), graph.site_name(j))
            there = exact.spin_correlations[i][j] if exact is not None and exact.spin_correlations else None
            values = (mine.spin_correlations[i][j], there, mine.z_correlations[i][j])
            kind = kinds.get((i, j), "")
            rows.append((f"{names[0]} – {names[1]}", kind, *(_number(v) for v in values)))
            keys.append((float(i * n + j), kind, *(_key(v) for v in values)))
    header = ("Sites", "Bond", "⟨S·S⟩", "⟨S·S⟩ exact", "⟨Sᶻ Sᶻ⟩")
    return Table(header, tuple(rows), (False, False, True, True, True), tuple(keys), "Spin correlations of all pairs of sites.")


def _structure(result: StudyResult) -> Table:
    mine, exact = result.sites, result.exact_sites
    assert mine is not None
    there: Sequence[tuple[float, float, float] | None] = exact.structure_factor if exact is not None else [None] * len(mine.structure_factor)
    rows: list[tuple[str, ...]] = []
    keys: list[tuple[float | str, ...]] = []
    for (kx, ky, value), other in zip(mine.structure_factor, there, strict=True):
        known = None if other is None else other[2]
        rows.append((f"{kx:.4f}", f"{ky:.4f}", _number(value), _number(known)))
        keys.append((kx, ky, value, _key(known)))
    header = ("k_x", "k_y", "S(k)", "S(k) exact")
    return Table(header, tuple(rows), (True,) * 4, tuple(keys), "Structure factor at the momenta of the lattice, 1 / nearest distance.")


def _sites(result: StudyResult) -> Table:
    graph, mine, exact = graph_of(result), result.sites, result.exact_sites
    assert mine is not None
    spins = bool(mine.magnetisation)
    values = mine.magnetisation or mine.double_occupancy
    others = (exact.magnetisation or exact.double_occupancy) if exact is not None else ()
    title = "⟨Sᶻ⟩" if spins else "⟨n↑ n↓⟩"
    rows: list[tuple[str, ...]] = []
    keys: list[tuple[float | str, ...]] = []
    for site, value in enumerate(values):
        there = others[site] if site < len(others) else None
        name = str(site) if graph is None else graph.site_name(site)
        lattice = "" if graph is None else str(int(graph.sublattice[site]) + 1)
        rows.append((name, lattice, _number(value), _number(there)))
        keys.append((float(site), lattice, value, _key(there)))
    return Table(("Site", "Sublattice", title, f"{title} exact"), tuple(rows), (True, False, True, True), tuple(keys), "Figures of every site.")


def _number(value: float | None) -> str:
    return wording.MISSING if value is None else wording.minus(f"{value:+.5f}")


def _key(value: float | None) -> float:
    return float("inf") if value is None else value
