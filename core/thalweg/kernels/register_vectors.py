"""Instructions on vectors of eight doubles, and the loops over them, for the routines of `register_lanes` and `register_rows`.

They are written as LLVM instructions because compilers do not find them in plain loops over one array at changing strides.
"""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

from llvmlite import ir
from numba.core import cgutils

LANES = 8
INT = ir.IntType(64)
DOUBLE = ir.DoubleType()
VECTOR = ir.VectorType(DOUBLE, LANES)
_INDEX = ir.IntType(32)
_MASK = ir.VectorType(_INDEX, LANES)
_FUSE = ("contract",)  # lets a product and a sum become one instruction where the machine has it


def integer(value: int) -> Any:
    return ir.Constant(INT, value)


class Vectors:
    """Builds code at the builder's place."""

    def __init__(self, context: Any, builder: Any) -> None:
        self.context, self.builder = context, builder

    def pointer(self, kind: Any, array: Any) -> Any:
        """Where the data of an array lies."""
        return self.context.make_array(kind)(self.context, self.builder, array).data

    def size(self, kind: Any, array: Any) -> Any:
        """Number of elements of an array."""
        return self.context.make_array(kind)(self.context, self.builder, array).nitems

    def pointers(self, kind: Any, arrays: Any) -> list[Any]:
        """The same for a tuple of arrays."""
        return [self.pointer(kind[i], self.builder.extract_value(arrays, i)) for i in range(len(kind))]

    def item(self, pointer: Any, index: Any) -> Any:
        return self.builder.load(self.builder.gep(pointer, [index]))

    def add_item(self, pointer: Any, index: Any, value: Any) -> None:
        address = self.builder.gep(pointer, [index])
        self.builder.store(self.builder.fadd(self.builder.load(address), value), address)

    def load(self, pointer: Any, index: Any, kind: Any = VECTOR) -> Any:
        value = self.builder.load(self.builder.bitcast(self.builder.gep(pointer, [index]), kind.as_pointer()))
        value.align = 8
        return value

    def load_twice(self, pointer: Any, index: Any) -> Any:
        """Four doubles, each in two lanes."""
        half = ir.VectorType(DOUBLE, LANES // 2)
        mask = ir.Constant(_MASK, [lane >> 1 for lane in range(LANES)])
        return self.builder.shuffle_vector(self.load(pointer, index, half), ir.Constant(half, ir.Undefined), mask)

    def store(self, value: Any, pointer: Any, index: Any) -> None:
        self.builder.store(value, self.builder.bitcast(self.builder.gep(pointer, [index]), VECTOR.as_pointer())).align = 8

    def splat(self, scalar: Any) -> Any:
        return self.shuffle(self.builder.insert_element(ir.Constant(VECTOR, ir.Undefined), scalar, ir.Constant(_INDEX, 0)), [0] * LANES)

    def lanes(self, scalars: list[Any]) -> Any:
        """A vector of eight scalars."""
        vector = ir.Constant(VECTOR, ir.Undefined)
        for lane, scalar in enumerate(scalars):
            vector = self.builder.insert_element(vector, scalar, ir.Constant(_INDEX, lane))
        return vector

    def constant(self, values: list[float]) -> Any:
        return ir.Constant(VECTOR, values)

    def shuffle(self, vector: Any, lanes: list[int], second: Any = None) -> Any:
        return self.builder.shuffle_vector(vector, ir.Constant(VECTOR, ir.Undefined) if second is None else second, ir.Constant(_MASK, lanes))

    def exchange(self, vector: Any, mask: int) -> Any:
        """Lane l takes the value of lane l ^ mask."""
        return self.shuffle(vector, [lane ^ mask for lane in range(LANES)]) if mask else vector

    def times(self, a: Any, b: Any) -> Any:
        return self.builder.fmul(a, b, flags=_FUSE)

    def plus(self, a: Any, b: Any) -> Any:
        return self.builder.fadd(a, b, flags=_FUSE)

    def minus(self, a: Any, b: Any) -> Any:
        return self.builder.fsub(a, b, flags=_FUSE)

    def complex_product(self, value: Any, real: Any, imaginary: Any) -> Any:
        """Interleaved complex values times factors whose parts are given for each lane."""
        turned = self.times(self.exchange(value, 1), self.constant([-1.0, 1.0] * (LANES // 2)))
        return self.plus(self.times(value, real), self.times(turned, imaginary))

    def accumulator(self) -> Any:
        return cgutils.alloca_once_value(self.builder, self.constant([0.0] * LANES))

    def add_to(self, accumulator: Any, a: Any, b: Any, *, negative: bool = False) -> None:
        step = self.minus if negative else self.plus
        self.builder.store(step(self.builder.load(accumulator), self.times(a, b)), accumulator)

    def sum(self, accumulator: Any) -> Any:
        vector, total = self.builder.load(accumulator), ir.Constant(DOUBLE, 0.0)
        for lane in range(LANES):
            total = self.builder.fadd(total, self.builder.extract_element(vector, ir.Constant(_INDEX, lane)))
        return total

    def sign(self, mask: Any) -> Any:
        """(-1)^popcount(mask) as a double."""
        odd = self.builder.trunc(self.builder.ctpop(mask), ir.IntType(1))
        return self.builder.select(odd, ir.Constant(DOUBLE, -1.0), ir.Constant(DOUBLE, 1.0))

    def open_bit(self, index: Any, stride: Any) -> Any:
        """Moves the bits from `stride`, a power of two, upwards one place up and leaves a zero there."""
        low = self.builder.and_(index, self.builder.sub(stride, integer(1)))
        return self.builder.add(self.builder.shl(self.builder.sub(index, low), integer(1)), low)

    def loop(self, last: Any, first: Any = None) -> Any:
        return cgutils.for_range(self.builder, last, start=first, intp=INT)

    def one_or_both(self, pointers: list[Any], both: Any) -> Iterator[list[Any]]:
        """Code for the first pointer alone and for both, of which one is entered at run time."""
        with self.builder.if_else(self.builder.trunc(both, ir.IntType(1))) as (two, one):
            with two:
                yield pointers
            with one:
                yield pointers[:1]

    def each_lane(self, lane: Any, condition: Any = None) -> Iterator[int]:
        """Code for each value of three lane bits, entered at run time where `condition` holds; shuffles need them as constants."""
        for value in range(LANES):
            chosen = self.builder.icmp_signed("==", lane, integer(value))
            with self.builder.if_then(chosen if condition is None else self.builder.and_(condition, chosen)):
                yield value
