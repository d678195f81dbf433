"""The kinematics in JavaScript: the generated C, translated statement by statement.

One Program and one Plan give the C; the JavaScript is that C read back as a syntax tree and printed in another
language. So nothing is derived or laid out twice, what the templates add (stages, tolerances, the tracking of arms
without a closed form) comes along, and, as JavaScript's numbers are the C's doubles and neither fuses a product with a
sum, both compute the same bits.
"""

from codegen.javascript.translate import javascript

__all__ = ["javascript"]
