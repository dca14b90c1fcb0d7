"""Starts the true firmware on a simulated board: `micropython start.py [FIRMWARE_FOLDER]`, or python3.

The first line on the standard input is one JSON object: "firmware" (folder, unless given as argument),
"image" (the board image), "plant" and "source" (the world, see plant.py and sources.py), "seed",
"board_id" (hex), and if there is one "memory" (what outlasts the process, see board.py). After it the pipe
protocol of pipe.py begins. A reset of the microcontroller runs the firmware anew in the same world. Exit
codes: 0 the host has gone, 1 the firmware has left its loop for good, 3 the first line is no good.
"""

import json
import sys

_FIRMWARE_FAILED = 1
_BAD_SETUP = 3


def read_setup(stream):
    """The first line, checked for what cannot be done without."""
    setup = json.loads(stream.readline())
    for key in ("image", "plant", "source", "seed", "board_id"):
        if key not in setup:
            raise ValueError("the first line has no " + repr(key))
    return setup


def paths(setup, arguments):
    """This folder before the firmware's: its board.py replaces the firmware's, and nothing else does."""
    here = __file__.rpartition("/")[0] or "."
    firmware = setup.get("firmware") or (arguments[1] if len(arguments) > 1 else "")
    if not firmware:
        raise ValueError("no firmware folder was given")
    return [here, firmware]


def print_into(stream):
    """A `print` that goes where the real board's does: between the frames."""

    def board_print(*values, sep=" ", end="\n", file=None):
        text = sep.join([str(value) for value in values]) + end
        if file is None:
            stream.write(text.encode())
            # Kept for whoever asks why a board has gone.
            sys.stderr.write(text)
        else:
            file.write(text)

    return board_print


def explain(error):
    """The traceback on the standard error: the standard output belongs to the pipe."""
    if hasattr(sys, "print_exception"):
        sys.print_exception(error, sys.stderr)
    else:
        import traceback

        traceback.print_exception(error)


def run_for_ever(board):
    """The firmware, again after each reset, when it starts with modules that know nothing of before."""
    kept = list(sys.modules)
    simulated = board.open_board()
    while True:
        try:
            import main as firmware

            firmware.run(simulated)
            return
        except board.Reset:
            for name in list(sys.modules):
                if name not in kept:
                    del sys.modules[name]
        simulated.start_again()


def main():
    try:
        setup = read_setup(sys.stdin.buffer)
        sys.path[:0] = paths(setup, sys.argv)
        if sys.implementation.name != "micropython":
            import cpython_stand_ins

            cpython_stand_ins.install()
        import board

        simulated = board.install(setup)
    except (KeyError, TypeError, ValueError) as error:
        sys.stderr.write("simulated board: " + type(error).__name__ + ": " + str(error) + "\n")
        sys.exit(_BAD_SETUP)
    import builtins

    builtins.print = print_into(simulated.stream)
    try:
        run_for_ever(board)
    except Exception as error:
        explain(error)
    sys.exit(_FIRMWARE_FAILED)


if __name__ == "__main__":
    main()
