"""Inverse kinematics by Newton steps, for arms that have no closed form.

links         the chain T = K0 J1 K1 ... Jn Kn as numbers
conditioning  the same motion with small constants, for tables of nearly parallel axes
shape         what the steps need to know of an arm, and the scale of its lengths
lanes, turns  arithmetic on many starts at once, bit for bit alike on every machine; residuals of directions
batch         the steps of the generated C on lanes
search        random starts and poses, and which solutions each start finds
starts        the table of starts and its measured share of all solutions
context       all of it as strings for the templates `tracking*.c.j2`
files         the two generated files

Tried and left: starts whose first and last joint are set by the pose, and residuals divided by the distance to the
solutions found before (deflation), find no more for the same number of steps; neither does damping by other rules.
"""
