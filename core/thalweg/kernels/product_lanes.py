"""Vector instructions for H applied to a sector: rows packed side by side into lanes, a sparse matrix on them, rows unpacked.

Number k of every packed row stands beside that of the others: buffer[k * lanes + lane], with 8, 16 or 32 lanes.
"""

from __future__ import annotations

from typing import Any

from llvmlite import ir
from numba import types
from numba.core import cgutils
from numba.extending import intrinsic

_HALF = 8
_INT = ir.IntType(64)
_SHORT = ir.IntType(32)
_DOUBLE = ir.DoubleType()
_VECTOR = ir.VectorType(_DOUBLE, _HALF)
_FUSE = ("contract",)


def _integer(value: int) -> Any:
    return ir.Constant(_INT, value)


def _pointer(context: Any, builder: Any, kind: Any, array: Any) -> Any:
    return context.make_array(kind)(context, builder, array).data


def _load(builder: Any, pointer: Any, index: Any) -> Any:
    value = builder.load(builder.bitcast(builder.gep(pointer, [index]), _VECTOR.as_pointer()))
    value.align = 8
    return value


def _store(builder: Any, value: Any, pointer: Any, index: Any) -> None:
    builder.store(value, builder.bitcast(builder.gep(pointer, [index]), _VECTOR.as_pointer())).align = 8


def _splat(builder: Any, scalar: Any) -> Any:
    undefined = ir.Constant(_VECTOR, ir.Undefined)
    lane = builder.insert_element(undefined, scalar, ir.Constant(_SHORT, 0))
    return builder.shuffle_vector(lane, undefined, ir.Constant(ir.VectorType(_SHORT, _HALF), [0] * _HALF))


def _transposed(builder: Any, rows: list[Any]) -> list[Any]:
    """The eight columns of an 8 x 8 matrix given by rows: three rounds of exchanges at distance 1, 2 and 4."""
    kind = ir.VectorType(_SHORT, _HALF)
    for bit in (1, 2, 4):
        low = ir.Constant(kind, [lane if not lane & bit else _HALF + (lane ^ bit) for lane in range(_HALF)])
        high = ir.Constant(kind, [lane | bit if not lane & bit else _HALF + lane for lane in range(_HALF)])
        mixed = list(rows)
        for r in range(_HALF):
            if not r & bit:
                mixed[r] = builder.shuffle_vector(rows[r], rows[r | bit], low)
                mixed[r | bit] = builder.shuffle_vector(rows[r], rows[r | bit], high)
        rows = mixed
    return rows


@intrinsic
def pack_tile(typing_context: Any, vector: Any, starts: Any, signs: Any, first: Any, column: Any, lanes: Any, buffer: Any) -> Any:
    """buffer[(column + k) * lanes + first + l] = signs[first + l] vector[starts[first + l] + column + k] for k and l below 8."""

    def emit(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
        data, start, sign = (_pointer(context, builder, signature.args[n], arguments[n]) for n in range(3))
        target = _pointer(context, builder, signature.args[6], arguments[6])
        rows = []
        for lane in range(_HALF):
            at = builder.add(arguments[3], _integer(lane))
            row = builder.add(builder.load(builder.gep(start, [at])), arguments[4])
            weight = _splat(builder, builder.load(builder.gep(sign, [at])))
            rows.append(builder.fmul(_load(builder, data, row), weight))
        for k, values in enumerate(_transposed(builder, rows)):
            place = builder.mul(builder.add(arguments[4], _integer(k)), arguments[5])
            _store(builder, values, target, builder.add(place, arguments[3]))
        return context.get_dummy_value()

    return types.void(vector, starts, signs, types.int64, types.int64, types.int64, buffer), emit


@intrinsic
def unpack_tile(typing_context: Any, buffer: Any, starts: Any, first: Any, column: Any, lanes: Any, count: Any, out: Any) -> Any:
    """out[starts[first + l] + column + k] += buffer[(column + k) * lanes + first + l] for k below 8 and l below `count`, at most 8."""

    def emit(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
        source, start = (_pointer(context, builder, signature.args[n], arguments[n]) for n in range(2))
        target = _pointer(context, builder, signature.args[6], arguments[6])
        columns = []
        for k in range(_HALF):
            place = builder.mul(builder.add(arguments[3], _integer(k)), arguments[4])
            columns.append(_load(builder, source, builder.add(place, arguments[2])))
        for lane, values in enumerate(_transposed(builder, columns)):
            with builder.if_then(builder.icmp_signed("<", _integer(lane), arguments[5]), likely=True):
                at = builder.load(builder.gep(start, [builder.add(arguments[2], _integer(lane))]))
                row = builder.add(at, arguments[3])
                _store(builder, builder.fadd(_load(builder, target, row), values), target, row)
        return context.get_dummy_value()

    return types.void(buffer, starts, types.int64, types.int64, types.int64, types.int64, out), emit


def _multiplier(lanes: int) -> Any:
    @intrinsic
    def multiply(typing_context: Any, first: Any, count: Any, places: Any, values: Any, source: Any, target: Any, row: Any) -> Any:
        """target[row, l] = sum of values[n] source[places[n], l] over `count` elements n from `first`, for every lane l."""

        def emit(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
            place, value, data, out = (_pointer(context, builder, signature.args[n], arguments[n]) for n in range(2, 6))
            sums = [cgutils.alloca_once_value(builder, ir.Constant(_VECTOR, [0.0] * _HALF)) for _ in range(lanes // _HALF)]
            for total in sums:
                builder.store(ir.Constant(_VECTOR, [0.0] * _HALF), total)
            last = builder.add(arguments[0], arguments[1])
            with cgutils.for_range(builder, last, start=arguments[0], intp=_INT) as loop:
                weight = _splat(builder, builder.load(builder.gep(value, [loop.index])))
                at = builder.mul(builder.zext(builder.load(builder.gep(place, [loop.index])), _INT), _integer(lanes))
                for part, total in enumerate(sums):
                    lane = _load(builder, data, builder.add(at, _integer(part * _HALF)))
                    builder.store(builder.fadd(builder.load(total), builder.fmul(weight, lane, flags=_FUSE), flags=_FUSE), total)
            for part, total in enumerate(sums):
                _store(builder, builder.load(total), out, builder.add(builder.mul(arguments[6], _integer(lanes)), _integer(part * _HALF)))
            return context.get_dummy_value()

        return types.void(types.int64, types.int64, places, values, source, target, types.int64), emit

    return multiply


multiply_8, multiply_16, multiply_32 = (_multiplier(lanes) for lanes in (8, 16, 32))
