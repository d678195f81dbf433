"""The elementary functions that the generated C carries: fitted, printed and measured for each number type."""

from codegen.elementary.context import MathsContext, maths_context

__all__ = ["MathsContext", "maths_context"]
