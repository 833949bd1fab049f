"""Rotations of contiguous runs of doubles, written as LLVM vector instructions because compilers do not find them in plain loops.

A run of equal length in two rows is cut into pieces of 8, 4, 2 and 1 doubles, so that no masked or overlapping access is
needed. A piece is one integer: first place in the first row | first place in the second row << 32 | sign bit << 63. Pieces
of one width stand together, those without the sign bit first.
"""

from __future__ import annotations

from typing import Any

from llvmlite import ir
from numba import types
from numba.core import cgutils
from numba.extending import intrinsic

_INT = ir.IntType(64)
_DOUBLE = ir.DoubleType()
_FUSE = ("contract",)  # lets a product and a sum become one instruction where the machine has it
_PLACE = (1 << 31) - 1
_SIGN = -(1 << 63)
#: Doubles that the partial sums of one factor take: 2 x (8 + 4 + 2 + 1), the sums of each width side by side.
SUMS = 30


class _Lanes:
    """The vector instructions for one width."""

    def __init__(self, builder: Any, width: int) -> None:
        self.builder, self.vector = builder, ir.VectorType(_DOUBLE, width)
        self._zeros = ir.Constant(ir.VectorType(ir.IntType(32), width), [0] * width)

    def load(self, pointer: Any) -> Any:
        value = self.builder.load(self.builder.bitcast(pointer, self.vector.as_pointer()))
        value.align = 8
        return value

    def store(self, value: Any, pointer: Any) -> None:
        self.builder.store(value, self.builder.bitcast(pointer, self.vector.as_pointer())).align = 8

    def splat(self, scalar: Any) -> Any:
        undefined = ir.Constant(self.vector, ir.Undefined)
        lane = self.builder.insert_element(undefined, scalar, ir.Constant(ir.IntType(32), 0))
        return self.builder.shuffle_vector(lane, undefined, self._zeros)

    def turn(self, cosine: Any, sine: Any, first: Any, second: Any) -> tuple[Any, Any]:
        """(c u - s v, c v + s u)."""
        times, plus, minus = self.times, self._plus, self._minus
        return minus(times(cosine, first), times(sine, second)), plus(times(cosine, second), times(sine, first))

    def accumulate(self, slot: Any, a: Any, b: Any, c: Any, d: Any) -> None:
        """slot += a b - c d."""
        total = self._plus(self.builder.load(slot), self.times(a, b))
        self.builder.store(self._minus(total, self.times(c, d)), slot)

    def times(self, a: Any, b: Any) -> Any:
        return self.builder.fmul(a, b, flags=_FUSE)

    def _plus(self, a: Any, b: Any) -> Any:
        return self.builder.fadd(a, b, flags=_FUSE)

    def _minus(self, a: Any, b: Any) -> Any:
        return self.builder.fsub(a, b, flags=_FUSE)


def _pointer(context: Any, builder: Any, kind: Any, array: Any) -> Any:
    return context.make_array(kind)(context, builder, array).data


def _decode(builder: Any, piece: Any) -> tuple[Any, Any, Any]:
    """(place in the first row, place in the second, sign bit)."""
    mask = ir.Constant(_INT, _PLACE)
    second = builder.and_(builder.lshr(piece, ir.Constant(_INT, 32)), mask)
    return builder.and_(piece, mask), second, builder.and_(piece, ir.Constant(_INT, _SIGN))


def _signed(builder: Any, bits: Any, sign: Any) -> Any:
    return builder.bitcast(builder.xor(bits, sign), _DOUBLE)


def _rotator(width: int) -> Any:
    @intrinsic
    def rotate(typing_context: Any, psi: Any, pieces: Any, first: Any, last: Any, row: Any, row2: Any, cosine: Any, sine: Any) -> Any:
        """Turns pieces first..last of the rows at `row` and `row2` by the angle with this cosine and sine."""

        def emit(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
            lanes = _Lanes(builder, width)
            data = _pointer(context, builder, signature.args[0], arguments[0])
            table = _pointer(context, builder, signature.args[1], arguments[1])
            left, right = builder.gep(data, [arguments[4]]), builder.gep(data, [arguments[5]])
            c, sine_bits = lanes.splat(arguments[6]), builder.bitcast(arguments[7], _INT)
            with cgutils.for_range(builder, arguments[3], start=arguments[2], intp=_INT) as loop:
                place, place2, sign = _decode(builder, builder.load(builder.gep(table, [loop.index])))
                s = lanes.splat(_signed(builder, sine_bits, sign))
                u_at, v_at = builder.gep(left, [place]), builder.gep(right, [place2])
                u, v = lanes.turn(c, s, lanes.load(u_at), lanes.load(v_at))
                lanes.store(u, u_at)
                lanes.store(v, v_at)
            return context.get_dummy_value()

        number, place = types.float64, types.int64
        return types.void(psi, pieces, place, place, place, place, number, number), emit

    return rotate


def _sweeper(width: int) -> Any:
    @intrinsic
    def sweep(
        typing_context: Any,
        psi: Any,
        dual: Any,
        pieces: Any,
        first: Any,
        last: Any,
        row: Any,
        row2: Any,
        cosine: Any,
        sine: Any,
        sums: Any,
        slot: Any,
    ) -> Any:
        """Turns psi and dual, whatever the sign bits; adds dual2 psi - dual psi2, which the rotation keeps, to sums[slot:] lane by lane."""

        def emit(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
            lanes = _Lanes(builder, width)
            psi_at, dual_at, table = (_pointer(context, builder, signature.args[n], arguments[n]) for n in range(3))
            sums_at = _pointer(context, builder, signature.args[9], arguments[9])
            sum_at = builder.gep(sums_at, [arguments[10]])
            total = cgutils.alloca_once(builder, lanes.vector)
            builder.store(lanes.load(sum_at), total)
            c, s = lanes.splat(arguments[7]), lanes.splat(arguments[8])
            with cgutils.for_range(builder, arguments[4], start=arguments[3], intp=_INT) as loop:
                place, place2, _ = _decode(builder, builder.load(builder.gep(table, [loop.index])))
                i, j = builder.add(arguments[5], place), builder.add(arguments[6], place2)
                u_at, v_at, p_at, q_at = (builder.gep(at, [k]) for at, k in ((psi_at, i), (psi_at, j), (dual_at, i), (dual_at, j)))
                u, v, p, q = (lanes.load(at) for at in (u_at, v_at, p_at, q_at))
                lanes.accumulate(total, q, u, p, v)
                for first_at, second_at, a, b in ((u_at, v_at, u, v), (p_at, q_at, p, q)):
                    a, b = lanes.turn(c, s, a, b)
                    lanes.store(a, first_at)
                    lanes.store(b, second_at)
            lanes.store(builder.load(total), sum_at)
            return context.get_dummy_value()

        number, place = types.float64, types.int64
        return types.void(psi, dual, pieces, place, place, place, place, number, number, sums, place), emit

    return sweep


rotate_8, rotate_4, rotate_2, rotate_1 = (_rotator(width) for width in (8, 4, 2, 1))
sweep_8, sweep_4, sweep_2, sweep_1 = (_sweeper(width) for width in (8, 4, 2, 1))
