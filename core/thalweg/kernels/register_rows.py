"""Products of a Pauli sum's rows with amplitudes, and the transform that makes such rows, as loops over vectors of eight doubles."""

from __future__ import annotations

from typing import Any

from llvmlite import ir
from numba import njit, types
from numba.extending import intrinsic

from thalweg.kernels.register_vectors import LANES, Vectors, integer


@intrinsic
def row_product(typingctx: Any, left: Any, source: Any, row: Any, place: Any, mask: Any, factor: Any, unit: Any, summing: Any) -> Any:
    """With p[f] = factor * row[f >> unit] * source[b + (f ^ x)]: adds p[f] to left[a + f], or returns sum_f left[a + f] p[f].

    place = (a, b, number of positions f); mask = x. The literal `summing` 1 asks for the sum; with 0 the result is 0. Complex
    amplitudes have `unit` 1; there bit 0 of x stands for a factor -i.
    """
    if not isinstance(summing, types.IntegerLiteral):
        return None
    is_sum = bool(summing.literal_value)

    def codegen(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
        v = Vectors(context, builder)
        pointers = [v.pointer(signature.args[k], arguments[k]) for k in range(3)]
        place = [builder.extract_value(arguments[3], k) for k in range(3)]
        plain, total = v.splat(arguments[5]), v.accumulator()
        turned = v.times(plain, v.constant([1.0, -1.0] * (LANES // 2)))
        x, lanes = builder.lshr(arguments[4], integer(3)), builder.and_(arguments[4], integer(LANES - 1))
        for is_complex in (False, True):
            for lane in v.each_lane(lanes, builder.icmp_signed("==", arguments[6], integer(int(is_complex)))):
                scale = turned if is_complex and lane & 1 else plain
                _row_loop(v, pointers, place, x, lane, scale, is_complex, total if is_sum else None)
        return v.sum(total)

    three = types.UniTuple(types.int64, 3)
    return types.float64(left, source, row, three, types.int64, types.float64, types.int64, summing), codegen


def _row_loop(v: Vectors, pointers: list[Any], place: list[Any], x: Any, lane: int, scale: Any, is_complex: bool, total: Any) -> None:
    builder = v.builder
    target, source, row = pointers
    own_start, other_start, size = place
    with v.loop(builder.lshr(size, integer(3))) as loop:
        step = builder.shl(loop.index, integer(3))
        weight = v.load_twice(row, builder.lshr(step, integer(1))) if is_complex else v.load(row, step)
        partner = builder.add(other_start, builder.shl(builder.xor(loop.index, x), integer(3)))
        product = v.times(v.times(weight, scale), v.exchange(v.load(source, partner), lane))
        own = builder.add(own_start, step)
        if total is None:
            v.store(v.plus(v.load(target, own), product), target, own)
        else:
            v.add_to(total, v.load(target, own), product)


@intrinsic
def dot_vectors(typingctx: Any, left: Any, right: Any, start: Any, count: Any) -> Any:
    """sum_f left[f] right[f] for f from `start`, `count` doubles, a multiple of 8."""

    def codegen(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
        v = Vectors(context, builder)
        first, second = (v.pointer(signature.args[k], arguments[k]) for k in range(2))
        total = v.accumulator()
        with v.loop(builder.lshr(arguments[3], integer(3))) as loop:
            place = builder.add(arguments[2], builder.shl(loop.index, integer(3)))
            v.add_to(total, v.load(first, place), v.load(second, place))
        return v.sum(total)

    return types.float64(left, right, types.int64, types.int64), codegen


@intrinsic
def _lane_sums(typingctx: Any, values: Any) -> Any:
    """The transform below over the three lane bits of every vector."""

    def codegen(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
        v = Vectors(context, builder)
        pointer = v.pointer(signature.args[0], arguments[0])
        with v.loop(builder.lshr(v.size(signature.args[0], arguments[0]), integer(3))) as loop:
            place = builder.shl(loop.index, integer(3))
            value = v.load(pointer, place)
            for k in range(3):
                side = v.constant([-1.0 if lane >> k & 1 else 1.0 for lane in range(LANES)])
                value = v.plus(v.exchange(value, 1 << k), v.times(side, value))
            v.store(value, pointer, place)
        return context.get_dummy_value()

    return types.void(values), codegen


@intrinsic
def _wide_sums(typingctx: Any, values: Any, strides: Any) -> Any:
    """The transform below over three ascending strides, at least 8; over fewer where strides are 0."""

    def codegen(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
        v = Vectors(context, builder)
        pointer, size = v.pointer(signature.args[0], arguments[0]), v.size(signature.args[0], arguments[0])
        strides = [builder.extract_value(arguments[1], k) for k in range(3)]
        for count in (1, 2, 3):
            last = builder.icmp_signed("==", strides[count], integer(0)) if count < 3 else ir.Constant(ir.IntType(1), 1)
            chosen = builder.and_(last, builder.icmp_signed("!=", strides[count - 1], integer(0)))
            with builder.if_then(chosen), v.loop(builder.lshr(size, integer(3 + count))) as loop:
                start = builder.shl(loop.index, integer(3))
                for stride in strides[:count]:
                    start = v.open_bit(start, stride)
                places = [start]
                for stride in strides[:count]:
                    places += [builder.add(place, stride) for place in places]
                cube = [v.load(pointer, place) for place in places]
                for k in range(count):
                    for low in (m for m in range(1 << count) if not m >> k & 1):
                        lower, upper = cube[low], cube[low | 1 << k]
                        cube[low], cube[low | 1 << k] = v.plus(lower, upper), v.minus(lower, upper)
                for place, value in zip(places, cube, strict=True):
                    v.store(value, pointer, place)
        return context.get_dummy_value()

    return types.void(values, types.UniTuple(types.int64, 3)), codegen


@njit(cache=True, nogil=True)
def walsh_hadamard(values):  # type: ignore[no-untyped-def]
    """values[b] <- sum_z (-1)^popcount(b & z) values[z] for 2^m doubles, m >= 3."""
    _lane_sums(values)
    stride = 8
    while stride < values.size:
        second = 2 * stride if 2 * stride < values.size else 0
        third = 4 * stride if 4 * stride < values.size else 0
        _wide_sums(values, (stride, second, third))
        stride *= 8
