"""Loops over vectors of eight doubles, written as LLVM instructions because no compiler finds them in plain loops.

Every routine takes a tuple of one or two float64 arrays. All arrays get the same orthogonal operation. With two arrays (a state and
its adjoint) the routine also returns inner products <second|B first>, from the values before the operation, where B is the generator
of the rotation; with one array it returns zeros. Indices count doubles; strides are powers of two, at least 8.
"""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

from llvmlite import ir
from numba import types
from numba.core import cgutils
from numba.extending import intrinsic

LANES = 8
_INT = ir.IntType(64)
_DOUBLE = ir.DoubleType()
_VECTOR = ir.VectorType(_DOUBLE, LANES)
_MASK = ir.VectorType(ir.IntType(32), LANES)
_FUSE = ("contract",)  # lets a product and a sum become one instruction where the machine has it
_THREE = types.UniTuple(types.float64, 3)


class _Vectors:
    """The few vector instructions that the routines need."""

    def __init__(self, context: Any, builder: Any) -> None:
        self.context, self.builder = context, builder

    def pointers(self, kind: Any, arrays: Any) -> list[Any]:
        """Data pointers of a tuple of arrays."""
        parts = [self.builder.extract_value(arrays, i) for i in range(len(kind))]
        return [self.pointer(kind[i], part) for i, part in enumerate(parts)]

    def pointer(self, kind: Any, array: Any) -> Any:
        return self.context.make_array(kind)(self.context, self.builder, array).data

    def load(self, pointer: Any, index: Any) -> Any:
        value = self.builder.load(self._address(pointer, index))
        value.align = 8
        return value

    def load_twice(self, pointer: Any, index: Any) -> Any:
        """Four doubles, each in two lanes."""
        half = ir.VectorType(_DOUBLE, LANES // 2)
        value = self.builder.load(self.builder.bitcast(self.builder.gep(pointer, [index]), half.as_pointer()))
        value.align = 8
        return self.builder.shuffle_vector(value, ir.Constant(half, ir.Undefined), ir.Constant(_MASK, [lane >> 1 for lane in range(LANES)]))

    def store(self, value: Any, pointer: Any, index: Any) -> None:
        self.builder.store(value, self._address(pointer, index)).align = 8

    def splat(self, scalar: Any) -> Any:
        lane = self.builder.insert_element(ir.Constant(_VECTOR, ir.Undefined), scalar, ir.Constant(ir.IntType(32), 0))
        return self.shuffle(lane, [0] * LANES)

    def shuffle(self, vector: Any, lanes: list[int]) -> Any:
        return self.builder.shuffle_vector(vector, ir.Constant(_VECTOR, ir.Undefined), ir.Constant(_MASK, lanes))

    def exchange(self, vector: Any, mask: int) -> Any:
        """Lane l takes the value of lane l ^ mask."""
        return self.shuffle(vector, [lane ^ mask for lane in range(LANES)]) if mask else vector

    def times(self, a: Any, b: Any) -> Any:
        return self.builder.fmul(a, b, flags=_FUSE)

    def plus(self, a: Any, b: Any) -> Any:
        return self.builder.fadd(a, b, flags=_FUSE)

    def minus(self, a: Any, b: Any) -> Any:
        return self.builder.fsub(a, b, flags=_FUSE)

    def constant(self, values: list[float]) -> Any:
        return ir.Constant(_VECTOR, values)

    def sum(self, vector: Any) -> Any:
        total = ir.Constant(_DOUBLE, 0.0)
        for lane in range(LANES):
            total = self.builder.fadd(total, self.builder.extract_element(vector, ir.Constant(ir.IntType(32), lane)))
        return total

    def accumulator(self) -> Any:
        return cgutils.alloca_once_value(self.builder, self.constant([0.0] * LANES))

    def add_to(self, accumulator: Any, a: Any, b: Any, *, negative: bool = False) -> None:
        step = self.minus if negative else self.plus
        self.builder.store(step(self.builder.load(accumulator), self.times(a, b)), accumulator)

    def open_bit(self, index: Any, stride: Any) -> Any:
        """Moves the bits from `stride` upwards one place up and leaves a zero there."""
        low = self.builder.and_(index, self.builder.sub(stride, integer(1)))
        return self.builder.add(self.builder.shl(self.builder.sub(index, low), integer(1)), low)

    def loop(self, first: Any, last: Any) -> Any:
        return cgutils.for_range(self.builder, last, start=first, intp=_INT)

    def each_lane(self, lane: Any, condition: Any) -> Iterator[int]:
        """Code for each value of the lane bits, entered at run time where `condition` holds; shuffles need them as constants."""
        for value in range(LANES):
            chosen = self.builder.and_(condition, self.builder.icmp_signed("==", lane, integer(value)))
            with self.builder.if_then(chosen):
                yield value

    def tuple(self, kind: Any, values: list[Any]) -> Any:
        return self.context.make_tuple(self.builder, kind, values)

    def _address(self, pointer: Any, index: Any) -> Any:
        return self.builder.bitcast(self.builder.gep(pointer, [index]), _VECTOR.as_pointer())


def integer(value: int) -> Any:
    return ir.Constant(_INT, value)


@intrinsic
def mix_three(typingctx: Any, arrays: Any, size: Any, strides: Any, entries: Any) -> Any:
    """Three real 2 x 2 matrices, row by row in the 12 entries, on the pairs at three different strides."""

    def codegen(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
        v = _Vectors(context, builder)
        pointers = v.pointers(signature.args[0], arguments[0])
        steps = [builder.extract_value(arguments[2], k) for k in range(3)]
        matrix = [v.splat(builder.extract_value(arguments[3], k)) for k in range(12)]
        sums = [v.accumulator() for _ in steps]
        with v.loop(integer(0), builder.lshr(arguments[1], integer(6))) as loop:
            start = builder.shl(loop.index, integer(3))
            for step in steps:
                start = v.open_bit(start, step)
            places = [start]
            for step in steps:
                places += [builder.add(place, step) for place in places]
            cubes = [[v.load(pointer, place) for place in places] for pointer in pointers]
            for k in range(3):
                for low in (m for m in range(8) if not m >> k & 1):
                    _mix_pair(v, cubes, low, low | 1 << k, matrix[4 * k : 4 * k + 4], sums[k])
            for pointer, cube in zip(pointers, cubes, strict=True):
                for place, value in zip(places, cube, strict=True):
                    v.store(value, pointer, place)
        return v.tuple(_THREE, [v.sum(builder.load(s)) for s in sums])

    return _THREE(arrays, types.int64, types.UniTuple(types.int64, 3), types.UniTuple(types.float64, 12)), codegen


@intrinsic
def mix_one(typingctx: Any, arrays: Any, size: Any, stride: Any, entries: Any) -> Any:
    """One real 2 x 2 matrix, row by row in the 4 entries, on the pairs at one stride."""

    def codegen(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
        v = _Vectors(context, builder)
        pointers = v.pointers(signature.args[0], arguments[0])
        matrix = [v.splat(builder.extract_value(arguments[3], k)) for k in range(4)]
        total = v.accumulator()
        with v.loop(integer(0), builder.lshr(arguments[1], integer(4))) as loop:
            low = v.open_bit(builder.shl(loop.index, integer(3)), arguments[2])
            places = [low, builder.add(low, arguments[2])]
            pairs = [[v.load(pointer, place) for place in places] for pointer in pointers]
            _mix_pair(v, pairs, 0, 1, matrix, total)
            for pointer, pair in zip(pointers, pairs, strict=True):
                for place, value in zip(places, pair, strict=True):
                    v.store(value, pointer, place)
        return v.sum(builder.load(total))

    return types.float64(arrays, types.int64, types.int64, types.UniTuple(types.float64, 4)), codegen


def _mix_pair(v: _Vectors, groups: list[list[Any]], low: int, high: int, matrix: list[Any], total: Any) -> None:
    """(lower, upper) <- matrix (lower, upper) in every group; total += <second|(-upper, lower) of first>."""
    if len(groups) == 2:
        v.add_to(total, groups[1][high], groups[0][low])
        v.add_to(total, groups[1][low], groups[0][high], negative=True)
    a, b, c, d = matrix
    for group in groups:
        lower, upper = group[low], group[high]
        group[low] = v.plus(v.times(a, lower), v.times(b, upper))
        group[high] = v.plus(v.times(c, lower), v.times(d, upper))


@intrinsic
def mix_lanes(typingctx: Any, arrays: Any, size: Any, entries: Any, first: Any) -> Any:
    """As `mix_three` for strides 1, 2 and 4, which lie inside a vector; strides below the literal 2^first are left alone."""
    if not isinstance(first, types.IntegerLiteral):
        return None
    lanes = range(first.literal_value, 3)

    def codegen(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
        v = _Vectors(context, builder)
        pointers = v.pointers(signature.args[0], arguments[0])
        entry = [builder.extract_value(arguments[2], k) for k in range(12)]
        own = {k: _by_lane(v, k, entry[4 * k], entry[4 * k + 3]) for k in lanes}
        other = {k: _by_lane(v, k, entry[4 * k + 1], entry[4 * k + 2]) for k in lanes}
        sums = [v.accumulator() for _ in range(3)]
        with v.loop(integer(0), builder.lshr(arguments[1], integer(3))) as loop:
            place = builder.shl(loop.index, integer(3))
            values = [v.load(pointer, place) for pointer in pointers]
            for k in lanes:
                partners = [v.exchange(value, 1 << k) for value in values]
                if len(values) == 2:
                    v.add_to(sums[k], values[1], partners[0])
                values = [v.plus(v.times(own[k], value), v.times(other[k], partner)) for value, partner in zip(values, partners, strict=True)]
            for pointer, value in zip(pointers, values, strict=True):
                v.store(value, pointer, place)
        signed = [v.times(builder.load(s), v.constant([1.0 if lane >> k & 1 else -1.0 for lane in range(LANES)])) for k, s in enumerate(sums)]
        return v.tuple(_THREE, [v.sum(s) for s in signed])

    return _THREE(arrays, types.int64, types.UniTuple(types.float64, 12), first), codegen


def _by_lane(v: _Vectors, k: int, low: Any, high: Any) -> Any:
    """A vector with `low` in the lanes whose bit k is 0 and `high` in the others."""
    vector = ir.Constant(_VECTOR, ir.Undefined)
    for lane in range(LANES):
        vector = v.builder.insert_element(vector, high if lane >> k & 1 else low, ir.Constant(ir.IntType(32), lane))
    return vector


@intrinsic
def turn(typingctx: Any, arrays: Any, first: Any, last: Any, masks: Any, angle: Any, pattern: Any) -> Any:
    """exp(theta/2 B) with B f = sum_i (-1)^popcount(i & z) f[i ^ x] e_i, B^2 = -1.

    masks = (x, z, highest bit of x, lane bits of x): the first three without their lane bits and counted in vectors; angle = (cos, sin)
    of theta/2; the pattern holds (-1)^popcount(l & z) for each lane l. Vector pairs first:last are done, or vectors where x is 0.
    """

    def codegen(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
        v = _Vectors(context, builder)
        pointers = v.pointers(signature.args[0], arguments[0])
        x, z, top, lane = (builder.extract_value(arguments[3], k) for k in range(4))
        cosine, sine = (v.splat(builder.extract_value(arguments[4], k)) for k in range(2))
        signs = v.load(v.pointer(signature.args[5], arguments[5]), integer(0))
        total = v.accumulator()
        inside = builder.icmp_signed("==", x, integer(0))
        for paired in (False, True):
            for exchanged in v.each_lane(lane, builder.not_(inside) if paired else inside):
                with v.loop(arguments[1], arguments[2]) as loop:
                    low = v.open_bit(loop.index, top) if paired else loop.index
                    vectors = [low, builder.xor(low, x)] if paired else [low]
                    factors = [v.times(signs, v.splat(_sign(builder, builder.and_(place, z)))) for place in vectors]
                    places = [builder.shl(place, integer(3)) for place in vectors]
                    _turn_places(v, pointers, places, factors, exchanged, (cosine, sine), total)
        return v.sum(builder.load(total))

    four, two = types.UniTuple(types.int64, 4), types.UniTuple(types.float64, 2)
    return types.float64(arrays, types.int64, types.int64, four, two, pattern), codegen


def _turn_places(v: _Vectors, pointers: list[Any], places: list[Any], factors: list[Any], lane: int, angle: tuple[Any, Any], total: Any) -> None:
    """The rotation on one vector, or on two that are each other's partners, in every array."""
    groups = [[v.load(pointer, place) for place in places] for pointer in pointers]
    turned = [[v.times(f, v.exchange(partner, lane)) for f, partner in zip(factors, reversed(group), strict=True)] for group in groups]
    if len(groups) == 2:
        for left, right in zip(groups[1], turned[0], strict=True):
            v.add_to(total, left, right)
    for pointer, group, image in zip(pointers, groups, turned, strict=True):
        for place, own, other in zip(places, group, image, strict=True):
            v.store(v.plus(v.times(angle[0], own), v.times(angle[1], other)), pointer, place)


def _sign(builder: Any, mask: Any) -> Any:
    """(-1)^popcount(mask) as a double."""
    odd = builder.and_(builder.ctpop(mask), integer(1))
    return builder.select(builder.trunc(odd, ir.IntType(1)), ir.Constant(_DOUBLE, -1.0), ir.Constant(_DOUBLE, 1.0))


@intrinsic
def multiply_phases(typingctx: Any, arrays: Any, size: Any, table: Any, phase: Any, moments: Any, plain: Any) -> Any:
    """Complex amplitudes (interleaved parts) times table[j] times one phase (re, im), which the literal `plain` 1 leaves out.

    With two arrays, moments[j] <- Im(conj(second) first) of each amplitude, before the multiplication. The size is a multiple of 16.
    """
    if not isinstance(plain, types.IntegerLiteral):
        return None

    def codegen(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
        v = _Vectors(context, builder)
        pointers = v.pointers(signature.args[0], arguments[0])
        factors = v.pointer(signature.args[2], arguments[2])
        output = v.pointer(signature.args[4], arguments[4])
        phase = [v.splat(builder.extract_value(arguments[3], k)) for k in range(2)]
        with v.loop(integer(0), builder.lshr(arguments[1], integer(4))) as loop:
            half = builder.shl(loop.index, integer(3))
            places = [builder.shl(half, integer(1)), builder.add(builder.shl(half, integer(1)), integer(LANES))]
            groups = [[v.load(pointer, place) for place in places] for pointer in pointers]
            if len(groups) == 2:
                v.store(_imaginary(v, groups), output, half)
            for n, place in enumerate(places):
                factor = v.load(factors, place)
                factor = factor if plain.literal_value else _complex_product(v, factor, phase[0], phase[1])
                real, imaginary = v.shuffle(factor, [0, 0, 2, 2, 4, 4, 6, 6]), v.shuffle(factor, [1, 1, 3, 3, 5, 5, 7, 7])
                for pointer, group in zip(pointers, groups, strict=True):
                    v.store(_complex_product(v, group[n], real, imaginary), pointer, place)
        return context.get_dummy_value()

    return types.void(arrays, types.int64, table, types.UniTuple(types.float64, 2), moments, plain), codegen


def _complex_product(v: _Vectors, value: Any, real: Any, imaginary: Any) -> Any:
    """Interleaved complex values times factors whose parts are given for each lane."""
    turned = v.times(v.exchange(value, 1), v.constant([-1.0, 1.0] * (LANES // 2)))
    return v.plus(v.times(value, real), v.times(turned, imaginary))


def _imaginary(v: _Vectors, groups: list[list[Any]]) -> Any:
    """Im(conj(second) first) of eight amplitudes that lie in two vectors."""
    products = [v.times(second, v.exchange(first, 1)) for first, second in zip(*groups, strict=True)]
    parts = [v.builder.shuffle_vector(*products, ir.Constant(_MASK, [2 * lane + odd for lane in range(LANES)])) for odd in (0, 1)]
    return v.minus(*parts)


@intrinsic
def copy_vectors(typingctx: Any, source: Any, source_start: Any, target: Any, target_start: Any, count: Any) -> Any:
    """target[target_start:] <- source[source_start:], `count` doubles, a multiple of 8."""

    def codegen(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
        v = _Vectors(context, builder)
        origin, goal = v.pointer(signature.args[0], arguments[0]), v.pointer(signature.args[2], arguments[2])
        with v.loop(integer(0), builder.lshr(arguments[4], integer(3))) as loop:
            step = builder.shl(loop.index, integer(3))
            v.store(v.load(origin, builder.add(arguments[1], step)), goal, builder.add(arguments[3], step))
        return context.get_dummy_value()

    return types.void(source, types.int64, target, types.int64, types.int64), codegen


@intrinsic
def row_product(typingctx: Any, left: Any, source: Any, row: Any, place: Any, mask: Any, factor: Any, summing: Any, unit: Any) -> Any:
    """With p[f] = factor * row[f >> unit] * source[b + (f ^ x)]: adds p[f] to left[a + f], or returns sum_f left[a + f] p[f].

    place = (a, b, number of positions f); mask = (x counted in vectors, lane bits of x). The literal `summing` 1 asks for the sum; with
    0 the result is 0. Complex amplitudes have the literal `unit` 1; there lane bit 0 stands for a factor -i.
    """
    if not isinstance(summing, types.IntegerLiteral) or not isinstance(unit, types.IntegerLiteral):
        return None
    is_sum, is_complex = bool(summing.literal_value), bool(unit.literal_value)

    def codegen(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
        v = _Vectors(context, builder)
        target, origin, weights = (v.pointer(signature.args[k], arguments[k]) for k in range(3))
        own_start, other_start, size = (builder.extract_value(arguments[3], k) for k in range(3))
        x, lane = (builder.extract_value(arguments[4], k) for k in range(2))
        plain, total = v.splat(arguments[5]), v.accumulator()
        turned = v.times(plain, v.constant([1.0, -1.0] * (LANES // 2)))
        for exchanged in v.each_lane(lane, ir.Constant(ir.IntType(1), 1)):
            with v.loop(integer(0), builder.lshr(size, integer(3))) as loop:
                step = builder.shl(loop.index, integer(3))
                weight = v.load_twice(weights, builder.lshr(step, integer(1))) if is_complex else v.load(weights, step)
                weight = v.times(weight, turned if is_complex and exchanged & 1 else plain)
                partner = builder.add(other_start, builder.shl(builder.xor(loop.index, x), integer(3)))
                product = v.times(weight, v.exchange(v.load(origin, partner), exchanged))
                own = builder.add(own_start, step)
                if is_sum:
                    v.add_to(total, v.load(target, own), product)
                else:
                    v.store(v.plus(v.load(target, own), product), target, own)
        return v.sum(builder.load(total))

    three, two = types.UniTuple(types.int64, 3), types.UniTuple(types.int64, 2)
    return types.float64(left, source, row, three, two, types.float64, summing, unit), codegen


@intrinsic
def dot_vectors(typingctx: Any, left: Any, right: Any, start: Any, count: Any) -> Any:
    """sum_f left[f] right[f] for f from `start`, `count` doubles, a multiple of 8."""

    def codegen(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
        v = _Vectors(context, builder)
        first, second = (v.pointer(signature.args[k], arguments[k]) for k in range(2))
        total = v.accumulator()
        with v.loop(integer(0), builder.lshr(arguments[3], integer(3))) as loop:
            place = builder.add(arguments[2], builder.shl(loop.index, integer(3)))
            v.add_to(total, v.load(first, place), v.load(second, place))
        return v.sum(builder.load(total))

    return types.float64(left, right, types.int64, types.int64), codegen
