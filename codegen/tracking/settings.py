"""Numbers that the steps share, whoever takes them: the generated C, or numpy when starts are prepared."""

DAMPING = 0.14  # of the residual; measured: 0.05 to 0.2 need the same number of starts
LARGEST_MOVE = 2.0  # rad, or slide units, of one joint in one step
SEARCH_STEPS = 16  # of one start; measured: 12 loses a third of the starts, 20 costs more than it finds
NEAR = 1e-2  # residual from which on a start may finish
