"""Parts of kernels are lowered once and optimized only in the entry points that contain them.

numba optimizes every function, and makes machine code of it, before it links it into its callers, which optimize it
again: a kernel of many small inlined parts would be compiled once per level of nesting.  A part is never called from
outside, so its library holds plain IR; compiling a kernel then takes about half the time.  It relies on numba's
compiler passes, which `pipeline_class` of its decorator lets users extend.
"""

from typing import Any

from numba import _dynfunc
from numba.core.codegen import JITCodeLibrary
from numba.core.compiler import CompilerBase, DefaultPassBuilder
from numba.core.compiler_machinery import LoweringPass, register_pass
from numba.core.typed_passes import AnnotateTypes, NativeLowering


class PlainLibrary(JITCodeLibrary):  # type: ignore[misc]
    """IR to link into other libraries, neither optimized as a whole nor turned into machine code."""

    def _optimize_final_module(self) -> None:
        pass

    def _finalize_final_module(self) -> None:
        self._finalize_dynamic_globals()
        self._verify_declare_only_symbols()
        self._finalized = True


@register_pass(mutates_CFG=False, analysis_only=True)
class UsePlainLibrary(LoweringPass):  # type: ignore[misc]
    """Lower into a plain library."""

    _name = "use_plain_library"

    def __init__(self) -> None:
        LoweringPass.__init__(self)

    def run_pass(self, state: Any) -> bool:
        """Called by numba."""
        state.flags = state.flags.copy()
        state.flags.no_compile = True
        state.library = PlainLibrary(state.targetctx.codegen(), state.func_id.func_qualname)
        return False


@register_pass(mutates_CFG=False, analysis_only=True)
class OfferToCallers(LoweringPass):  # type: ignore[misc]
    """Let other compiled functions call what was lowered; Python cannot."""

    _name = "offer_to_callers"

    def __init__(self) -> None:
        LoweringPass.__init__(self)

    def run_pass(self, state: Any) -> bool:
        """Called by numba."""
        described, lowered = state.cr.fndesc, state.cr
        nothing = _dynfunc.make_function(
            described.lookup_module(), described.qualname, "", 0, lowered.env, (state.library,)
        )
        state.cr = lowered._replace(cfunc=nothing)
        state.targetctx.insert_user_function(nothing, described, [state.library])
        return False


class PartCompiler(CompilerBase):  # type: ignore[misc]
    """The pipeline of parts."""

    def define_pipelines(self) -> list[Any]:
        """Called by numba."""
        passes = DefaultPassBuilder.define_nopython_pipeline(self.state)
        passes.add_pass_after(UsePlainLibrary, AnnotateTypes)
        passes.add_pass_after(OfferToCallers, NativeLowering)
        passes.finalize()
        return [passes]
