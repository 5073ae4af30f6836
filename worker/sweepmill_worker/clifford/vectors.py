"""Fixed-width integer vectors inside numba kernels.

Plain loops over a few words are not vectorized reliably, so kernels hold columns in LLVM vectors.  A vector of 64-bit
words gets its width from the *type* of a `lanes` argument, a tuple of that many zeros: one source then compiles, and
is cached on disk, once per width.  Vectors of 32 shorts hold windows of rows; a 32-bit word turns into a vector of 32
truth values that selects among them.
"""

import operator
from collections.abc import Callable
from typing import Any

import numpy as np
from llvmlite import ir  # type: ignore[import-untyped]
from numba.core import cgutils, types
from numba.extending import intrinsic, lower_builtin, models, register_model, type_callable

from sweepmill_worker.jit import part

GROUP = 32
"""Rows in one vector of shorts."""

Value = Any
"""A vector, as a value in kernel code: its type exists for numba only."""

_Decorator = Callable[[Callable[..., Any]], Any]
_intrinsic: _Decorator = intrinsic
_type_callable: Callable[..., _Decorator] = type_callable
_lower_builtin: Callable[..., _Decorator] = lower_builtin


class Vector(types.Type):
    """numba type of an LLVM vector of `count` integers of `bits` bits."""

    def __init__(self, bits: int, count: int) -> None:
        self.bits, self.count = bits, count
        super().__init__(name=f"Vector({bits} x {count})")


@register_model(Vector)
class VectorModel(models.PrimitiveModel):  # type: ignore[misc]
    """Vectors live in registers under their own LLVM type."""

    def __init__(self, manager: Any, vector: Vector) -> None:
        super().__init__(manager, vector, _llvm(vector))


def _llvm(vector: Vector) -> ir.VectorType:
    return ir.VectorType(ir.IntType(vector.bits), vector.count)


SHORTS = Vector(16, GROUP)
TRUTHS = Vector(1, GROUP)


def _operator(symbol: Any, emit: Callable[..., Any], truth: bool = False) -> None:
    @_type_callable(symbol)
    def typing(context: Any) -> Callable[[Any, Any], Any]:
        def typer(left: Any, right: Any) -> Any:
            if isinstance(left, Vector) and left == right:
                return Vector(1, left.count) if truth else left
            return None

        return typer

    @_lower_builtin(symbol, Vector, Vector)
    def lower(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
        return emit(builder, *arguments)


_operator(operator.and_, lambda builder, a, b: builder.and_(a, b))
_operator(operator.or_, lambda builder, a, b: builder.or_(a, b))
_operator(operator.xor, lambda builder, a, b: builder.xor(a, b))
_operator(operator.add, lambda builder, a, b: builder.add(a, b))
_operator(operator.sub, lambda builder, a, b: builder.sub(a, b))
_operator(operator.lt, lambda builder, a, b: builder.icmp_signed("<", a, b), truth=True)
_operator(operator.eq, lambda builder, a, b: builder.icmp_signed("==", a, b), truth=True)


def _pointer(context: Any, builder: Any, array_type: Any, array: Any, offset: Any, vector: Vector) -> Any:
    data = context.make_array(array_type)(context, builder, array).data
    return builder.bitcast(builder.gep(data, [offset]), _llvm(vector).as_pointer())


def _splat(builder: Any, scalar: Any, vector: Vector) -> Any:
    if scalar.type.width > vector.bits:
        scalar = builder.trunc(scalar, ir.IntType(vector.bits))
    single = builder.insert_element(ir.Constant(_llvm(vector), ir.Undefined), scalar, ir.IntType(32)(0))
    zeros = ir.Constant(ir.VectorType(ir.IntType(32), vector.count), None)
    return builder.shuffle_vector(single, single, zeros)


def _load_at(vector: Vector, array: Any, offset: Any, *rest: Any) -> tuple[Any, Callable[..., Any]]:
    def codegen(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
        pointer = _pointer(context, builder, array, arguments[0], arguments[1], vector)
        loaded = builder.load(pointer)
        loaded.align = vector.bits * vector.count // 8
        return loaded

    return vector(array, offset, *rest), codegen


@_intrinsic
def load(typing: Any, array: Any, offset: Any, lanes: Any) -> Any:
    """Words array[offset : offset + len(lanes)] as a vector; array data aligned to the vector's size."""
    return _load_at(Vector(64, lanes.count), array, offset, lanes)


@_intrinsic
def load_shorts(typing: Any, array: Any, offset: Any) -> Any:
    """Shorts array[offset : offset + 32] as a vector; aligned."""
    return _load_at(SHORTS, array, offset)


@_intrinsic
def below(typing: Any, halves: Any, offset: Any, bound: Any) -> Any:
    """32 unsigned words of an array, any alignment: which are at most `bound`?  As the bits of a word."""
    vector = Vector(32, GROUP)

    def codegen(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
        loaded = builder.load(_pointer(context, builder, halves, arguments[0], arguments[1], vector))
        loaded.align = 4
        truth = builder.icmp_unsigned("<=", loaded, _splat(builder, arguments[2], vector))
        return builder.bitcast(truth, ir.IntType(GROUP))

    return types.uint32(halves, offset, bound), codegen


@_intrinsic
def store(typing: Any, array: Any, offset: Any, value: Any) -> Any:
    """Write a vector of words or shorts to array[offset : ...]; aligned."""

    def codegen(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
        pointer = _pointer(context, builder, array, arguments[0], arguments[1], value)
        builder.store(arguments[2], pointer, align=value.bits * value.count // 8)
        return context.get_dummy_value()

    return types.void(array, offset, value), codegen


@_intrinsic
def splat(typing: Any, scalar: Any, lanes: Any) -> Any:
    """A 64-bit word in every lane."""
    vector = Vector(64, lanes.count)

    def codegen(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
        return _splat(builder, arguments[0], vector)

    return vector(scalar, lanes), codegen


@_intrinsic
def splat_half(typing: Any, half: Any, lanes: Any) -> Any:
    """A 32-bit word in both halves of every lane."""
    vector, halves = Vector(64, lanes.count), Vector(32, 2 * lanes.count)

    def codegen(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
        return builder.bitcast(_splat(builder, arguments[0], halves), _llvm(vector))

    return vector(half, lanes), codegen


@_intrinsic
def splat_short(typing: Any, scalar: Any) -> Any:
    """A short in each of 32 lanes."""

    def codegen(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
        return _splat(builder, arguments[0], SHORTS)

    return SHORTS(scalar), codegen


@_intrinsic
def one_hot(typing: Any, index: Any, lanes: Any) -> Any:
    """The vector with bit `index` set; all zero if the index lies outside."""
    vector = Vector(64, lanes.count)

    def codegen(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
        word = builder.ashr(arguments[0], index_type(6))
        bit = builder.shl(index_type(1), builder.and_(arguments[0], index_type(63)))
        numbers = ir.Constant(_llvm(vector), list(range(vector.count)))
        here = builder.icmp_signed("==", numbers, _splat(builder, word, vector))
        return builder.select(here, _splat(builder, bit, vector), ir.Constant(_llvm(vector), None))

    index_type = ir.IntType(64)
    return vector(index, lanes), codegen


@_intrinsic
def nonzero(typing: Any, value: Any) -> Any:
    """Truth per lane: is it different from zero?"""

    def codegen(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
        return builder.icmp_signed("!=", arguments[0], ir.Constant(_llvm(value), None))

    return Vector(1, value.count)(value), codegen


@_intrinsic
def any_bit(typing: Any, value: Any) -> Any:
    """Is any bit of the vector set?"""

    def codegen(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
        whole = ir.IntType(value.bits * value.count)
        set_ = builder.icmp_unsigned("!=", builder.bitcast(arguments[0], whole), whole(0))
        return context.cast(builder, set_, types.boolean, types.boolean)

    return types.boolean(value), codegen


@_intrinsic
def filled_halves(typing: Any, value: Any) -> Any:
    """The bits of a word: which 32-bit halves of the vector are not zero?"""
    halves = Vector(32, 2 * value.count)

    def codegen(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
        split = builder.bitcast(arguments[0], _llvm(halves))
        filled = builder.icmp_unsigned("!=", split, ir.Constant(_llvm(halves), None))
        return builder.zext(builder.bitcast(filled, ir.IntType(halves.count)), ir.IntType(64))

    return types.uint64(value), codegen


@_intrinsic
def truths(typing: Any, word: Any) -> Any:
    """The bits of a 32-bit word as 32 truth values."""

    def codegen(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
        return builder.bitcast(arguments[0], _llvm(TRUTHS))

    return TRUTHS(types.uint32), codegen


@_intrinsic
def choose(typing: Any, truth: Any, yes: Any, no: Any) -> Any:
    """Per lane: yes where true, else no."""

    def codegen(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
        return builder.select(*arguments)

    return yes(truth, yes, no), codegen


def _extremum(compare: str, relation: str, left: Any, right: Any) -> tuple[Any, Callable[..., Any]]:
    def codegen(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
        return builder.select(getattr(builder, compare)(relation, *arguments), *arguments)

    return left(left, right), codegen


@_intrinsic
def lower(typing: Any, left: Any, right: Any) -> Any:
    """Signed minimum per lane."""
    return _extremum("icmp_signed", "<", left, right)


@_intrinsic
def higher(typing: Any, left: Any, right: Any) -> Any:
    """Signed maximum per lane."""
    return _extremum("icmp_signed", ">", left, right)


@_intrinsic
def lower_unsigned(typing: Any, left: Any, right: Any) -> Any:
    """Unsigned minimum per lane."""
    return _extremum("icmp_unsigned", "<", left, right)


@_intrinsic
def tagged(typing: Any, shorts: Any, tag: Any) -> Any:
    """Per lane: 16 * value + tag, for values of 12 bits and tags of 4."""

    def codegen(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
        vector = _llvm(SHORTS)
        kind = ir.FunctionType(vector, [vector, vector, vector])
        funnel = cgutils.get_or_insert_function(builder.module, kind, "llvm.fshl.v32i16")
        high = _splat(builder, builder.shl(arguments[1], ir.IntType(64)(12)), SHORTS)
        return builder.call(funnel, [arguments[0], high, ir.Constant(vector, [4] * GROUP)])

    return shorts(shorts, types.int64), codegen


@_intrinsic
def least(typing: Any, shorts: Any) -> Any:
    """The smallest of 32 unsigned shorts."""

    def codegen(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
        kind = ir.FunctionType(ir.IntType(16), [_llvm(SHORTS)])
        reduce = cgutils.get_or_insert_function(builder.module, kind, "llvm.vector.reduce.umin.v32i16")
        return builder.zext(builder.call(reduce, arguments), ir.IntType(64))

    return types.int64(shorts), codegen


@_intrinsic
def bits(typing: Any, truth: Any) -> Any:
    """32 truth values as the bits of a word: the inverse of `truths`."""

    def codegen(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
        return builder.bitcast(arguments[0], ir.IntType(GROUP))

    return types.uint32(truth), codegen


@_intrinsic
def bits_of_eight(typing: Any, truth: Any) -> Any:
    """8 truth values as the lowest bits of a word."""

    def codegen(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
        return builder.zext(builder.bitcast(arguments[0], ir.IntType(8)), ir.IntType(64))

    return types.uint64(truth), codegen


@_intrinsic
def item(typing: Any, array: Any, index: Any) -> Any:
    """array[index] for index >= 0: spares the selects by which numba serves negative indices."""

    def codegen(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
        data = context.make_array(array)(context, builder, arguments[0]).data
        return builder.load(builder.gep(data, [arguments[1]]))

    return array.dtype(array, types.int64), codegen


@_intrinsic
def half(typing: Any, words: Any, index: Any) -> Any:
    """The 32-bit half `index` of an array of 64-bit words, little end first."""

    def codegen(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
        data = context.make_array(words)(context, builder, arguments[0]).data
        halves = builder.bitcast(data, ir.IntType(32).as_pointer())
        return builder.load(builder.gep(halves, [arguments[1]]))

    return types.uint32(words, types.int64), codegen


@_intrinsic
def put_half(typing: Any, words: Any, index: Any, value: Any) -> Any:
    """Write a 32-bit half of an array of 64-bit words."""

    def codegen(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
        data = context.make_array(words)(context, builder, arguments[0]).data
        halves = builder.bitcast(data, ir.IntType(32).as_pointer())
        builder.store(arguments[2], builder.gep(halves, [arguments[1]]))
        return context.get_dummy_value()

    return types.void(words, types.int64, types.uint32), codegen


@_intrinsic
def put(typing: Any, array: Any, index: Any, value: Any) -> Any:
    """array[index] = value for index >= 0."""

    def codegen(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
        data = context.make_array(array)(context, builder, arguments[0]).data
        builder.store(arguments[2], builder.gep(data, [arguments[1]]))
        return context.get_dummy_value()

    return types.void(array, types.int64, array.dtype), codegen


@_intrinsic
def first_true(typing: Any, truth: Any) -> Any:
    """The lowest lane that is true; at least one must be."""

    def codegen(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
        bits = builder.bitcast(arguments[0], ir.IntType(truth.count))
        lane = builder.cttz(bits, ir.IntType(1)(1))
        return builder.zext(lane, ir.IntType(64))

    return types.int64(truth), codegen


@_intrinsic
def trailing_zeros(typing: Any, word: Any) -> Any:
    """Index of the lowest set bit of a non-zero 64-bit word."""

    def codegen(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
        return builder.cttz(arguments[0], ir.IntType(1)(1))

    return types.int64(types.uint64), codegen


@part
def without_lowest(word: np.uint64) -> np.uint64:
    """The word with its lowest set bit cleared."""
    return word & (word - np.uint64(1))
