"""One self-contained page for the design review of an arm: nothing in it is fetched from anywhere.

Its script runs the arm's own kinematics (`codegen.javascript`); what was measured comes in as plain values.
"""
