"""Gates on the amplitudes of a tile, as loops over vectors of eight doubles.

Every gate takes a pair of float64 arrays, a state and its adjoint state, of `size` positions. With `both` 0 it acts on the state alone.
With `both` 1 it acts on both alike, and adds <adjoint|B state>, from the values before, to gradient[g] for each rotation g, where B is the
generator: rotation g is exp(angle/2 B). `op` is one row of operations as `kernels.register` describes them; entries[g] is the real 2 x 2
matrix of gate g, row by row, for rotations (cos, -sin, sin, cos) of angle/2.
"""

from __future__ import annotations

from typing import Any

from llvmlite import ir
from numba import types
from numba.extending import intrinsic

from thalweg.kernels.register_vectors import DOUBLE, LANES, Vectors, integer


@intrinsic
def mix_three(typingctx: Any, states: Any, both: Any, size: Any, op: Any, entries: Any, gradient: Any) -> Any:
    """Three real 2 x 2 matrices on three position bits >= 3, ascending."""

    def codegen(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
        v = Vectors(context, builder)
        gates, matrices, slopes = _gates(v, signature, arguments, 3)
        row = v.pointer(signature.args[3], arguments[3])
        strides = [builder.shl(integer(1), v.item(row, integer(4 + k))) for k in range(3)]
        for pointers in v.one_or_both(v.pointers(signature.args[0], arguments[0]), arguments[1]):
            sums = [v.accumulator() for _ in gates]
            with v.loop(builder.lshr(arguments[2], integer(6))) as loop:
                start = builder.shl(loop.index, integer(3))
                for stride in strides:
                    start = v.open_bit(start, stride)
                places = [start]
                for stride in strides:
                    places += [builder.add(place, stride) for place in places]
                cubes = [[v.load(pointer, place) for place in places] for pointer in pointers]
                for k in range(3):
                    for low in (m for m in range(8) if not m >> k & 1):
                        _mix_pair(v, cubes, low, low | 1 << k, matrices[k], sums[k])
                _store_all(v, pointers, places, cubes)
            _add_slopes(v, pointers, slopes, gates, [v.sum(s) for s in sums])
        return context.get_dummy_value()

    return types.void(states, types.int64, types.int64, op, entries, gradient), codegen


@intrinsic
def mix_one(typingctx: Any, states: Any, both: Any, size: Any, op: Any, entries: Any, gradient: Any) -> Any:
    """One real 2 x 2 matrix on one position bit >= 3."""

    def codegen(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
        v = Vectors(context, builder)
        gates, matrices, slopes = _gates(v, signature, arguments, 1)
        stride = builder.shl(integer(1), v.item(v.pointer(signature.args[3], arguments[3]), integer(2)))
        for pointers in v.one_or_both(v.pointers(signature.args[0], arguments[0]), arguments[1]):
            total = v.accumulator()
            with v.loop(builder.lshr(arguments[2], integer(4))) as loop:
                low = v.open_bit(builder.shl(loop.index, integer(3)), stride)
                places = [low, builder.add(low, stride)]
                pairs = [[v.load(pointer, place) for place in places] for pointer in pointers]
                _mix_pair(v, pairs, 0, 1, matrices[0], total)
                _store_all(v, pointers, places, pairs)
            _add_slopes(v, pointers, slopes, gates, [v.sum(total)])
        return context.get_dummy_value()

    return types.void(states, types.int64, types.int64, op, entries, gradient), codegen


@intrinsic
def mix_lanes(typingctx: Any, states: Any, both: Any, size: Any, op: Any, entries: Any, gradient: Any) -> Any:
    """Three real 2 x 2 matrices on the position bits 0, 1 and 2, which lie inside a vector; on 1 and 2 alone where bit 0 is idle."""

    def codegen(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
        v = Vectors(context, builder)
        gates, scalars, slopes = _gates(v, signature, arguments, 3, vectors=False)
        own = [v.lanes([scalars[k][3 if lane >> k & 1 else 0] for lane in range(LANES)]) for k in range(3)]
        other = [v.lanes([scalars[k][2 if lane >> k & 1 else 1] for lane in range(LANES)]) for k in range(3)]
        idle = v.item(v.pointer(signature.args[3], arguments[3]), integer(4))
        for pointers in v.one_or_both(v.pointers(signature.args[0], arguments[0]), arguments[1]):
            sums = [v.accumulator() for _ in gates]
            for first in (0, 1):
                with builder.if_then(builder.icmp_signed("==", idle, integer(first))), v.loop(builder.lshr(arguments[2], integer(3))) as loop:
                    place = builder.shl(loop.index, integer(3))
                    values = [v.load(pointer, place) for pointer in pointers]
                    for k in range(first, 3):
                        values = _mix_within(v, values, k, own[k], other[k], sums[k])
                    for pointer, value in zip(pointers, values, strict=True):
                        v.store(value, pointer, place)
            _add_slopes(v, pointers, slopes, gates, [v.sum(s) for s in sums])
        return context.get_dummy_value()

    return types.void(states, types.int64, types.int64, op, entries, gradient), codegen


@intrinsic
def turn(typingctx: Any, states: Any, both: Any, parts: Any, base: Any, op: Any, entries: Any, gradient: Any) -> Any:
    """The rotation with B f = kappa (-1)^popcount(base & fixed) sum_i (-1)^popcount(i & z) f[i ^ x] e_i, on parts = (first, last).

    The parts are pairs of vectors, or single vectors where x lies within the lanes (x < 8).
    """

    def codegen(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
        v = Vectors(context, builder)
        first, last = (builder.extract_value(arguments[2], k) for k in range(2))
        row = v.pointer(signature.args[4], arguments[4])
        gate, x, z, fixed, kappa = (v.item(row, integer(k)) for k in range(1, 6))
        whole = builder.fmul(builder.sitofp(kappa, DOUBLE), v.sign(builder.and_(arguments[3], fixed)))
        entry = builder.shl(gate, integer(2))
        table, slopes = v.pointer(signature.args[5], arguments[5]), v.pointer(signature.args[6], arguments[6])
        cosine, sine = v.splat(v.item(table, entry)), v.splat(v.item(table, builder.add(entry, integer(2))))
        signs = v.times(v.splat(whole), v.lanes([v.sign(builder.and_(z, integer(lane))) for lane in range(LANES)]))
        x_vector, z_vector = (builder.lshr(mask, integer(3)) for mask in (x, z))
        top = builder.lshr(integer(-(2**63)), builder.ctlz(builder.or_(x_vector, integer(1)), ir.Constant(ir.IntType(1), 0)))
        inside = builder.icmp_signed("==", x_vector, integer(0))
        by_side = [signs, v.times(signs, v.splat(v.sign(builder.and_(x_vector, z_vector))))]
        for pointers in v.one_or_both(v.pointers(signature.args[0], arguments[0]), arguments[1]):
            total = v.accumulator()
            for paired in (False, True):
                for lane in v.each_lane(builder.and_(x, integer(LANES - 1)), builder.not_(inside) if paired else inside):
                    with v.loop(last, first) as loop:
                        low = v.open_bit(loop.index, top) if paired else loop.index
                        vectors = [low, builder.xor(low, x_vector)] if paired else [low]
                        here = v.splat(v.sign(builder.and_(low, z_vector)))
                        factors = [v.times(here, side) for side in by_side[: len(vectors)]]
                        places = [builder.shl(place, integer(3)) for place in vectors]
                        _turn_places(v, pointers, places, factors, lane, cosine, sine, total)
            _add_slopes(v, pointers, slopes, [gate], [v.sum(total)])
        return context.get_dummy_value()

    return types.void(states, types.int64, types.UniTuple(types.int64, 2), types.int64, op, entries, gradient), codegen


@intrinsic
def multiply_phases(typingctx: Any, states: Any, both: Any, size: Any, unit: Any, table: Any, phase: Any, moments: Any) -> Any:
    """Amplitudes times the interleaved complex table[j] and one phase (re, im). Real amplitudes (`unit` 0) take the real parts.

    With both states complex, moments[j] <- Im(conj(adjoint) state) of each amplitude, before. The size is a multiple of 16 for `unit` 1.
    """

    def codegen(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
        v = Vectors(context, builder)
        factors, output = v.pointer(signature.args[4], arguments[4]), v.pointer(signature.args[6], arguments[6])
        real, imaginary = (v.splat(builder.extract_value(arguments[5], k)) for k in range(2))
        for pointers in v.one_or_both(v.pointers(signature.args[0], arguments[0]), arguments[1]):
            with builder.if_else(builder.icmp_signed("==", arguments[3], integer(0))) as (plain, interleaved):
                with plain, v.loop(builder.lshr(arguments[2], integer(3))) as loop:
                    place = builder.shl(loop.index, integer(3))
                    double = builder.shl(place, integer(1))
                    pair = [v.load(factors, builder.add(double, integer(shift))) for shift in (0, LANES)]
                    factor = v.times(v.shuffle(pair[0], list(range(0, 2 * LANES, 2)), pair[1]), real)
                    for pointer in pointers:
                        v.store(v.times(v.load(pointer, place), factor), pointer, place)
                with interleaved, v.loop(builder.lshr(arguments[2], integer(4))) as loop:
                    half = builder.shl(loop.index, integer(3))
                    _multiply_complex(v, pointers, half, factors, (real, imaginary), output)
        return context.get_dummy_value()

    return types.void(states, types.int64, types.int64, types.int64, table, types.UniTuple(types.float64, 2), moments), codegen


@intrinsic
def copy_vectors(typingctx: Any, source: Any, source_start: Any, target: Any, target_start: Any, count: Any) -> Any:
    """target[target_start:] <- source[source_start:], `count` doubles, a multiple of 8."""

    def codegen(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
        v = Vectors(context, builder)
        origin, goal = v.pointer(signature.args[0], arguments[0]), v.pointer(signature.args[2], arguments[2])
        with v.loop(builder.lshr(arguments[4], integer(3))) as loop:
            step = builder.shl(loop.index, integer(3))
            v.store(v.load(origin, builder.add(arguments[1], step)), goal, builder.add(arguments[3], step))
        return context.get_dummy_value()

    return types.void(source, types.int64, target, types.int64, types.int64), codegen


def _gates(v: Vectors, signature: Any, arguments: Any, count: int, *, vectors: bool = True) -> tuple[list[Any], list[list[Any]], Any]:
    """Gate numbers, their matrices (as vectors or scalars), and where the gradient lies."""
    row, table, slopes = (v.pointer(signature.args[k], arguments[k]) for k in (3, 4, 5))
    gates = [v.item(row, integer(1 + k)) for k in range(count)]
    matrices = []
    for gate in gates:
        start = v.builder.shl(gate, integer(2))
        scalars = [v.item(table, v.builder.add(start, integer(k))) for k in range(4)]
        matrices.append([v.splat(scalar) for scalar in scalars] if vectors else scalars)
    return gates, matrices, slopes


def _mix_pair(v: Vectors, groups: list[list[Any]], low: int, high: int, matrix: list[Any], total: Any) -> None:
    """(lower, upper) <- matrix (lower, upper) in every group; total += <second|(-upper, lower) of first>."""
    if len(groups) == 2:
        v.add_to(total, groups[1][high], groups[0][low])
        v.add_to(total, groups[1][low], groups[0][high], negative=True)
    a, b, c, d = matrix
    for group in groups:
        lower, upper = group[low], group[high]
        group[low] = v.plus(v.times(a, lower), v.times(b, upper))
        group[high] = v.plus(v.times(c, lower), v.times(d, upper))


def _mix_within(v: Vectors, values: list[Any], k: int, own: Any, other: Any, total: Any) -> list[Any]:
    """The same on lane bit k of one vector of every array."""
    partners = [v.exchange(value, 1 << k) for value in values]
    if len(values) == 2:
        side = v.constant([1.0 if lane >> k & 1 else -1.0 for lane in range(LANES)])
        v.add_to(total, values[1], v.times(side, partners[0]))
    return [v.plus(v.times(own, a), v.times(other, b)) for a, b in zip(values, partners, strict=True)]


def _turn_places(v: Vectors, pointers: list[Any], places: list[Any], factors: list[Any], lane: int, cosine: Any, sine: Any, total: Any) -> None:
    """The rotation on one vector, or on two that are each other's partners, in every array."""
    groups = [[v.load(pointer, place) for place in places] for pointer in pointers]
    turned = [[v.times(f, v.exchange(partner, lane)) for f, partner in zip(factors, reversed(group), strict=True)] for group in groups]
    if len(groups) == 2:
        for left, right in zip(groups[1], turned[0], strict=True):
            v.add_to(total, left, right)
    mixed = [
        [v.plus(v.times(cosine, own), v.times(sine, image)) for own, image in zip(group, images, strict=True)]
        for group, images in zip(groups, turned, strict=True)
    ]
    _store_all(v, pointers, places, mixed)


def _multiply_complex(v: Vectors, pointers: list[Any], half: Any, factors: Any, phase: tuple[Any, Any], output: Any) -> None:
    """Eight complex amplitudes of every array, two vectors each."""
    start = v.builder.shl(half, integer(1))
    places = [start, v.builder.add(start, integer(LANES))]
    groups = [[v.load(pointer, place) for place in places] for pointer in pointers]
    if len(groups) == 2:
        products = [v.times(second, v.exchange(first, 1)) for first, second in zip(*groups, strict=True)]
        even, odd = (v.shuffle(products[0], list(range(odd, 2 * LANES, 2)), products[1]) for odd in (0, 1))
        v.store(v.minus(even, odd), output, half)
    for n, place in enumerate(places):
        factor = v.complex_product(v.load(factors, place), *phase)
        parts = [v.shuffle(factor, [lane & ~1 | odd for lane in range(LANES)]) for odd in (0, 1)]
        for pointer, group in zip(pointers, groups, strict=True):
            v.store(v.complex_product(group[n], *parts), pointer, place)


def _store_all(v: Vectors, pointers: list[Any], places: list[Any], groups: list[list[Any]]) -> None:
    for pointer, group in zip(pointers, groups, strict=True):
        for place, value in zip(places, group, strict=True):
            v.store(value, pointer, place)


def _add_slopes(v: Vectors, pointers: list[Any], slopes: Any, gates: list[Any], totals: list[Any]) -> None:
    if len(pointers) == 2:
        for gate, total in zip(gates, totals, strict=True):
            v.add_item(slopes, gate, total)
