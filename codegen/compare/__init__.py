"""What a change of an arm file does to the arm, to poses, to stored branch numbers and to the C.

sides       one arm of the two: its file, its plan, its C, and how the caller runs them
joints      which joint of the one is which of the other
table       what changed in the file, in its units
interface   what of the C's interface changed, and what that means for calling code
branches    whether a branch number still names the same posture
motion      how far the tool moves at the same joint values, how joint values change for the same poses
reach       which poses are lost and gained
poses_file  poses that the user gives
code_diff   the lines of the C that matter
comparison  all of it together
report      the same for a reader, as text or Markdown; content: for a machine
"""
