"""Reading a table through its address, so that a scalar function in a loop counts no references; bits of doubles.

An array passed to a compiled function that branches costs two atomic updates of its reference count a call, six times
the arithmetic of a panel. The caller holds the array; only `load` at indices the table's own header names is used.
"""

from __future__ import annotations

import struct
from typing import Any

from fbexpand.kernels.jit import JIT_DISABLED

if JIT_DISABLED:

    def address(array: Any) -> Any:
        """Return what `load` reads from: the array itself where nothing is compiled."""
        return array

    def load(where: Any, index: Any) -> float:
        """Return element `index`."""
        return float(where[int(index)])

    def to_bits(x: float) -> int:
        """Return the 64 bits of a double as an integer."""
        return int(struct.unpack("<q", struct.pack("<d", x))[0])

    def from_bits(bits: int) -> float:
        """Return the double with these 64 bits."""
        return float(struct.unpack("<d", struct.pack("<q", bits))[0])

else:
    from llvmlite import ir
    from numba.core import cgutils, types
    from numba.extending import intrinsic

    @intrinsic  # type: ignore[untyped-decorator, unused-ignore]
    def address(typingctx: Any, array: Any) -> Any:
        """Return the address of a C-contiguous float64 array's first element."""

        def codegen(context: Any, builder: Any, signature: Any, args: Any) -> Any:
            value = context.make_array(signature.args[0])(context, builder, args[0])
            return builder.ptrtoint(value.data, cgutils.intp_t)

        return types.intp(array), codegen

    @intrinsic  # type: ignore[untyped-decorator, unused-ignore]
    def load(typingctx: Any, where: Any, index: Any) -> Any:
        """Return the double at `where` + 8 * `index`."""

        def codegen(context: Any, builder: Any, signature: Any, args: Any) -> Any:
            pointer = builder.inttoptr(args[0], ir.DoubleType().as_pointer())
            return builder.load(builder.gep(pointer, [args[1]]))

        return types.float64(types.intp, types.intp), codegen

    @intrinsic  # type: ignore[untyped-decorator, unused-ignore]
    def to_bits(typingctx: Any, x: Any) -> Any:
        """Return the 64 bits of a double as an integer."""

        def codegen(context: Any, builder: Any, signature: Any, args: Any) -> Any:
            return builder.bitcast(args[0], ir.IntType(64))

        return types.int64(types.float64), codegen

    @intrinsic  # type: ignore[untyped-decorator, unused-ignore]
    def from_bits(typingctx: Any, bits: Any) -> Any:
        """Return the double with these 64 bits."""

        def codegen(context: Any, builder: Any, signature: Any, args: Any) -> Any:
            return builder.bitcast(args[0], ir.DoubleType())

        return types.float64(types.int64), codegen
