"""Simulated boards: the shipped firmware, run by a MicroPython interpreter, on a simulated circuit and
source.

`launcher` starts one; `board_side/` is what runs inside the interpreter; `serve` offers one to other
programs.
"""
