"""Numbers of several orbits at once, as values of a kernel that stay in the processor's registers.

A vector holds ``WIDTH`` doubles and is no array: it is taken from a row of one and put back when the work is done.
Arithmetic, comparisons, ``fused``, ``where``, ``abs`` and ``copysign`` do to each of its numbers what they do to a
plain one, bit for bit, so that the same function serves both; a plain number beside a vector stands for as many equal
ones.  Left to itself, the compiler decides which loops over arrays become vector instructions, and keeps their running
sums in memory; vectors leave it no choice.
"""

from __future__ import annotations

import math
import operator
from collections.abc import Callable
from typing import Any, cast

import numpy as np
import numpy.typing as npt
from llvmlite import ir
from llvmlite.binding import get_host_cpu_features
from numba.core import cgutils, config, types
from numba.extending import intrinsic, lower_builtin, models, register_model, type_callable

Floats = npt.NDArray[np.float64]
Build = Callable[..., Any]


def _numbers_in_a_register() -> int:
    """How many doubles the widest registers hold that kernels are compiled for."""
    chosen = config.CPU_FEATURES  # type: ignore[attr-defined]
    wide = get_host_cpu_features().get("avx512f", False) if chosen is None else "+avx512f" in chosen
    return 8 if wide else 4


WIDTH = 2 * _numbers_in_a_register()
"""Numbers in a vector: two registers, so that one is worked on while the other one waits.  It decides no result."""
ALIGNMENT = 8  # bytes, that of any double: where a row is aligned better nothing is lost

VECTOR = ir.VectorType(ir.DoubleType(), WIDTH)
MASK = ir.VectorType(ir.IntType(1), WIDTH)


class VectorType(types.Type):
    """Numba's type of a vector; to the type checker it is a float, as it does what a float does."""

    def __init__(self) -> None:
        super().__init__("vector")


class MaskType(types.Type):
    """Numba's type of what a comparison of vectors gives: a yes or no for each number."""

    def __init__(self) -> None:
        super().__init__("mask")


@register_model(VectorType)
class VectorModel(models.PrimitiveModel):
    """How the compiler keeps a vector."""

    def __init__(self, manager: Any, kind: Any) -> None:
        super().__init__(manager, kind, VECTOR)  # type: ignore[no-untyped-call]


@register_model(MaskType)
class MaskModel(models.PrimitiveModel):
    """How the compiler keeps a mask."""

    def __init__(self, manager: Any, kind: Any) -> None:
        super().__init__(manager, kind, MASK)  # type: ignore[no-untyped-call]


vector = VectorType()
mask = MaskType()


def _spread(builder: Any, value: Any) -> Any:
    """Vector of equal numbers from a plain one; what is a vector or a mask stays as it is."""
    if value.type in (VECTOR, MASK):
        return value
    nothing = ir.Constant(VECTOR, ir.Undefined)
    first = ir.IntType(32)(0)
    places = ir.Constant(ir.VectorType(ir.IntType(32), WIDTH), [first] * WIDTH)
    return builder.shuffle_vector(builder.insert_element(nothing, value, first), nothing, places)


def _call(builder: Any, name: str, *values: Any) -> Any:
    """Call a function of the compiler's on vectors."""
    kind = ir.FunctionType(VECTOR, [VECTOR] * len(values))
    name = f"llvm.{name}.v{WIDTH}f64"
    function = cgutils.get_or_insert_function(builder.module, kind, name)  # type: ignore[no-untyped-call]
    return builder.call(function, values)


def _teach(operation: Any, operands: tuple[Any, ...], result: Any, build: Build) -> None:
    """Teach numba an operation of Python's; ``build`` gets the builder and the operands."""

    def type_of(context: Any) -> Build:
        if len(operands) == 1:
            return lambda a: result if (a,) == operands else None
        return lambda a, b: result if (a, b) == operands else None

    def lower(context: Any, builder: Any, signature: Any, values: Any) -> Any:
        return build(builder, *(_spread(builder, value) for value in values))

    type_callable(operation)(type_of)
    lower_builtin(operation, *operands)(lower)  # type: ignore[no-untyped-call]


def _teach_all() -> None:
    """Teach numba the arithmetic and the comparisons that kernels need."""
    number = types.float64
    for operation, instruction in (
        (operator.add, "fadd"),
        (operator.iadd, "fadd"),
        (operator.sub, "fsub"),
        (operator.mul, "fmul"),
        (operator.imul, "fmul"),
        (operator.truediv, "fdiv"),
    ):
        for operands in ((vector, vector), (vector, number), (number, vector)):
            _teach(operation, operands, vector, lambda builder, a, b, name=instruction: getattr(builder, name)(a, b))
    for operation, sign in ((operator.lt, "<"), (operator.gt, ">"), (operator.eq, "==")):
        for operands in ((vector, vector), (vector, number)):
            _teach(operation, operands, mask, lambda builder, a, b, sign=sign: builder.fcmp_ordered(sign, a, b))
    _teach(operator.and_, (mask, mask), mask, lambda builder, a, b: builder.and_(a, b))
    _teach(operator.or_, (mask, mask), mask, lambda builder, a, b: builder.or_(a, b))
    _teach(operator.neg, (vector,), vector, lambda builder, a: builder.fneg(a))
    _teach(abs, (vector,), vector, lambda builder, a: _call(builder, "fabs", a))
    _teach(math.copysign, (vector, vector), vector, lambda builder, a, b: _call(builder, "copysign", a, b))


_teach_all()


@intrinsic
def _fused(typing: Any, a: Any, b: Any, c: Any) -> tuple[Any, Build]:
    def build_vector(context: Any, builder: Any, signature: Any, values: Any) -> Any:
        return _call(builder, "fma", *(_spread(builder, value) for value in values))

    def build(context: Any, builder: Any, signature: Any, values: Any) -> Any:
        return builder.fma(*values)

    if vector in (a, b, c):
        return vector(a, b, c), build_vector
    return types.float64(types.float64, types.float64, types.float64), build


fused: Callable[[float, float, float], float] = cast(Any, _fused)
"""a b + c, rounded once: one instruction on processors since about 2013, and the same bits, slowly, on others."""


@intrinsic
def _where(typing: Any, condition: Any, yes: Any, no: Any) -> tuple[Any, Build]:
    def build_vector(context: Any, builder: Any, signature: Any, values: Any) -> Any:
        return builder.select(*(_spread(builder, value) for value in values))

    def build(context: Any, builder: Any, signature: Any, values: Any) -> Any:
        return builder.select(*values)

    if condition == mask:
        return vector(condition, yes, no), build_vector
    return types.float64(types.boolean, types.float64, types.float64), build


where: Callable[[bool, float, float], float] = cast(Any, _where)
"""``yes`` where the condition holds and ``no`` elsewhere; both are computed."""


@intrinsic
def _how_many(typing: Any, condition: Any) -> tuple[Any, Build]:
    def build(context: Any, builder: Any, signature: Any, values: Any) -> Any:
        return builder.zext(builder.ctpop(builder.bitcast(values[0], ir.IntType(WIDTH))), ir.IntType(64))

    return types.int64(mask), build


how_many: Callable[[bool], int] = cast(Any, _how_many)
"""For how many of its numbers a comparison of vectors holds."""


@intrinsic
def _near_inverse_root(typing: Any, x: Any) -> tuple[Any, Build]:
    def build(context: Any, builder: Any, signature: Any, values: Any) -> Any:
        whole = ir.VectorType(ir.IntType(64), WIDTH) if x == vector else ir.IntType(64)
        one, all_of_it = (ir.Constant(whole, [n] * WIDTH if x == vector else n) for n in (1, 0x5FE6EB50C7B537A9))
        halved = builder.lshr(builder.bitcast(values[0], whole), one)
        return builder.bitcast(builder.sub(all_of_it, halved), values[0].type)

    return x(x), build


near_inverse_root: Callable[[float], float] = cast(Any, _near_inverse_root)
"""One over the square root of a positive normal number to 3.5 %, from the bits of its exponent."""


def _place(context: Any, builder: Any, kind: Any, rows: Any, row: Any, first: Any) -> Any:
    """Address of element ``first`` of a row."""
    array = context.make_array(kind)(context, builder, rows)
    length = builder.extract_value(array.shape, kind.ndim - 1)
    element = builder.gep(array.data, [builder.add(builder.mul(row, length), first)])
    return builder.bitcast(element, VECTOR.as_pointer())


@intrinsic
def _take(typing: Any, rows: Any, row: Any, first: Any) -> tuple[Any, Build]:
    def build(context: Any, builder: Any, signature: Any, values: Any) -> Any:
        return builder.load(_place(context, builder, signature.args[0], *values), align=ALIGNMENT)

    return vector(rows, types.int64, types.int64), build


take: Callable[[Floats, int, int], float] = cast(Any, _take)
"""Vector of the elements of a row from ``first`` on.

Rows are those of the last dimension of a contiguous array, numbered through; no bound is checked.
"""


@intrinsic
def _put(typing: Any, rows: Any, row: Any, first: Any, value: Any) -> tuple[Any, Build]:
    def build(context: Any, builder: Any, signature: Any, values: Any) -> Any:
        place = _place(context, builder, signature.args[0], *values[:3])
        builder.store(_spread(builder, values[3]), place, align=ALIGNMENT)
        return context.get_dummy_value()

    return types.void(rows, types.int64, types.int64, value), build


put: Callable[[Floats, int, int, float], None] = cast(Any, _put)
"""Put a vector, or a number everywhere, into the elements of a row from ``first`` on; rows as for ``take``."""
