"""Inverse kinematics by Newton steps, for arms that have no closed form.

links         the chain T = K0 J1 K1 ... Jn Kn as numbers
conditioning  the same motion with small constants, for tables of nearly parallel axes
shape         what the steps need to know of an arm, and the scale of its lengths
lanes, turns  arithmetic on many starts at once, bit for bit alike on every machine; residuals of directions
batch         the steps of the generated C on lanes
search        random starts and poses, and which solutions each start finds
starts        the table of starts and its measured share of all solutions
beside        starts on both sides of a solution near which another one may lie
placing       a sweep: where the other joints stand for a value of the swept joint, on lanes
walking       the places of a sweep from which the steps are to start
trial         random poses, searched densely, to measure sweeps by
sweeping      the joint that an arm is swept by, how finely, and its measured share of all solutions
prepared      which of the two an arm gets
placing_text  the plan of a sweep as C
context       all of it as strings for the templates `tracking*.c.j2`; sweep_context for `tracking_sweep.c.j2`
files         the two generated files

Tried and left: starts whose first and last joint are set by the pose, and residuals divided by the distance to the
solutions found before (deflation), find no more for the same number of steps; neither does damping by other rules.
"""
