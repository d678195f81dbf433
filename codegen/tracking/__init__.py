"""Inverse kinematics by Newton steps, for arms that have no closed form.

links         the chain T = K0 J1 K1 ... Jn Kn as numbers
conditioning  the same motion with small constants, for tables of nearly parallel axes
task_rows     what the task of the arm asks of a pose, as residuals
batch         the steps of the generated C, on many starts at once and bit for bit alike on every machine
starts        the table of starts and its measured share of all solutions
context       all of it as strings for the template
"""
